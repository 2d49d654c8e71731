"""Whatever others may call says what it does, and every number says its unit."""

from __future__ import annotations

import ast
import re
from collections.abc import Iterator
from typing import Any, NamedTuple

PHYSICAL = ("units", "smooth", "course", "air", "bike", "rider", "race", "motion")
"""Where numbers are quantities: not a solver's or a fit's scaled unknowns, nor a page's layout."""

ONE_UNIT = (
    r"(?:m|m2|km|s|h|min|m_s|m_s2|kmh|w|kw|j|kj|kg|kg_m2|kg_m3|n|pa|hpa|k|c|deg|rad|pct|g|rpm|mm)"
)
UNIT = re.compile(rf"(?:(?:^|_){ONE_UNIT}(?:_per_{ONE_UNIT})?|_?per_{ONE_UNIT})$")
SECONDS = ("seconds", "second_of_day")
WITHOUT_UNIT = ("gradient", "slope", "crr", "efficiency", "weight", "level")
SHARE = re.compile(r"(?:^|_)(?:share|factor|ratio)$")
SPOKEN = re.compile(r"\b(factor|ratio|share|efficiency|gradient|%|over that|dimensionless)\b")


class Public(NamedTuple):
    """A public function or method, with the docstrings that may speak for it."""

    where: str
    package: str
    node: ast.FunctionDef
    own: str
    docs: str


def public(modules: Any) -> Iterator[Public]:
    """Every public function, and every public method of a public class."""
    for module in modules:
        for node in module.tree.body:
            if isinstance(node, ast.ClassDef) and _open(node.name):
                where, about = f"{module.name}.{node.name}", ast.get_docstring(node) or ""
                yield from _functions(node, where, module.package, about)
        yield from _functions(module.tree, module.name, module.package, "")


def _functions(of: ast.Module | ast.ClassDef, where: str, package: str, about: str) -> Any:
    for node in of.body:
        if isinstance(node, ast.FunctionDef) and _open(node.name) and not _only_a_type(node):
            own = ast.get_docstring(node) or ""
            yield Public(f"{where}.{node.name}", package, node, own, f"{own}\n{about}")


def _open(name: str) -> bool:
    return not name.startswith("_")


def _only_a_type(node: ast.FunctionDef) -> bool:
    return any(isinstance(mark, ast.Name) and mark.id == "overload" for mark in node.decorator_list)


def _has_unit(name: str) -> bool:
    return name in SECONDS or UNIT.search(name) is not None


def _is_pure(name: str) -> bool:
    return name in WITHOUT_UNIT or SHARE.search(name) is not None


def _numeric(annotation: ast.expr | None) -> bool:
    text = "" if annotation is None else ast.unparse(annotation)
    return re.fullmatch(r"(float|Floats?|Array|None|[| ])+", text) is not None and text != "None"


def test_every_module_class_and_function_says_what_it_is(modules: Any) -> None:
    silent = [module.name for module in modules if not ast.get_docstring(module.tree)]
    silent += [
        f"{module.name}.{node.name}"
        for module in modules
        for node in ast.walk(module.tree)
        if isinstance(node, ast.ClassDef) and _open(node.name) and not ast.get_docstring(node)
    ]
    silent += [found.where for found in public(modules) if not found.own]
    assert silent == []


def test_every_quantity_has_its_unit_in_its_name_or_is_explained(modules: Any) -> None:
    bare = [
        f"{found.where}({argument.arg})"
        for found in public(modules)
        if found.package in PHYSICAL and "See `" not in found.own
        for argument in [*found.node.args.args, *found.node.args.kwonlyargs]
        if _numeric(argument.annotation)
        and not _has_unit(argument.arg)
        and not _is_pure(argument.arg)
        and not re.search(rf"(?<![a-z]){argument.arg}(?![a-z])", found.docs, re.IGNORECASE)
    ]
    assert bare == []


def test_a_published_formula_says_the_unit_of_what_it_gives(modules: Any) -> None:
    bare = [
        found.where
        for found in public(modules)
        if found.package in PHYSICAL and "Source:" in found.own and _numeric(found.node.returns)
        if not any(_has_unit(name) for name in (found.node.name, *found.node.name.split("_")))
        and not SPOKEN.search(found.node.name.replace("_", " "))
        and not SPOKEN.search(found.own)
    ]
    assert bare == []
