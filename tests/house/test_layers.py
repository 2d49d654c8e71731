"""The package reads as the data flows: imports run one way."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from typing import Any

import pytest

ORDER = (
    "units", "errors", "sources", "smooth", "course", "air", "bike", "rider", "race", "motion",
    "plan", "study", "field", "report", "cli",
)  # fmt: skip
UPWARD = {
    ("pacing.plan.plan", "pacing.report.export"): "Plan.save(folder) is how a plan is kept",
}
"""The only imports against the order, made inside a function, each with its reason."""


def imported(tree: ast.AST) -> Iterator[str]:
    """Names of the package's modules that ``tree`` imports, wherever in it that is."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names if _ours(alias.name))
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"a relative import in line {node.lineno}"
            if node.module and _ours(node.module):
                yield from (f"{node.module}.{alias.name}" for alias in node.names)


def _ours(name: str) -> bool:
    return name.split(".")[0] == "pacing"


def _rank(name: str) -> int:
    return ORDER.index(name)


def test_every_package_has_its_place_in_the_order(modules: Any) -> None:
    unplaced = {module.package for module in modules} - {*ORDER, "pacing"}
    assert unplaced == set()


def test_imports_run_only_from_later_packages_to_earlier_ones(modules: Any) -> None:
    against = []
    for module in modules:
        for name in imported(module.tree):
            target = name.split(".")[1]
            if module.package == "pacing" or target == "__version__":
                continue
            if any((module.name, name.rsplit(".", n)[0]) in UPWARD for n in (0, 1)):
                continue
            if _rank(target) > _rank(module.package):
                against.append(f"{module.name} imports {name}")
    assert against == []


@pytest.mark.parametrize("pair", UPWARD)
def test_an_excused_import_is_still_there_and_inside_a_function(
    modules: Any, pair: tuple[str, str]
) -> None:
    tree = next(module.tree for module in modules if module.name == pair[0])
    functions = [node for node in ast.walk(tree) if isinstance(node, ast.FunctionDef)]
    inside = {name.rsplit(".", 1)[0] for function in functions for name in imported(function)}
    assert pair[1] in inside
    assert pair[1] not in _when_imported(tree, {pair[1]})


def test_nobody_takes_a_name_from_the_front_door_but_the_version(modules: Any) -> None:
    taken = {
        (module.name, name)
        for module in modules
        for name in imported(module.tree)
        if name.count(".") == 1 and name.split(".")[1] not in ORDER
    }
    assert {name for _, name in taken} <= {"pacing.__version__"}, taken


def _when_imported(tree: ast.Module, names: set[str]) -> set[str]:
    """Those of ``names`` imported as soon as this module is, not in functions, not for types."""
    found = set()
    for node in tree.body:
        if isinstance(node, ast.Import | ast.ImportFrom):
            for name in imported(node):
                found.add(name if name in names else name.rsplit(".", 1)[0])
    return found


def test_no_module_needs_itself_to_be_imported_first(modules: Any) -> None:
    names = {module.name for module in modules}
    needs = {
        module.name: _when_imported(module.tree, names) - {"pacing", module.name}
        for module in modules
    }
    done: set[str] = set()
    while ready := {name for name, wanted in needs.items() if wanted <= done} - done:
        done |= ready
    assert names - done == set(), "imports in a circle"


def test_a_package_only_hands_on_what_its_modules_make(modules: Any) -> None:
    allowed = ast.Import | ast.ImportFrom | ast.Assign | ast.Expr
    for module in modules:
        if module.file.name == "__init__.py" and module.package != "pacing":
            strange = [node for node in module.tree.body if not isinstance(node, allowed)]
            assert strange == [], module.name
