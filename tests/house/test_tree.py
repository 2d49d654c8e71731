"""What lies where: the agreed names at the top, tests that mirror the package, small files."""

from __future__ import annotations

import ast
import re
import sys
import tomllib
from pathlib import Path
from typing import Any

TOP = {"pyproject.toml", "README.md", "DEVELOPERS.md", "LICENSE"}
FOLDERS = {"pacing", "courses", "tests", "demo"}
BESIDE_THE_MIRROR = {
    "published", "closed_form", "laws", "slopes", "recorded", "reference", "odd_files", "speed",
    "browser", "house",
}  # fmt: skip
NO_SUBJECT = {"utils", "util", "helpers", "helper", "common", "core", "misc"}
MOST_LINES = 450
IMPORTED_AS = {"pillow": "PIL", "fonttools": "fontTools", "coolprop": "CoolProp"}


def test_the_top_holds_the_agreed_names_only(own_files: tuple[Path, ...]) -> None:
    at_top = {file.name for file in own_files if len(file.parts) == 1}
    folders = {file.parts[0] for file in own_files if len(file.parts) > 1}
    assert {name for name in at_top if not name.startswith(".")} == TOP
    assert {name for name in folders if not name.startswith(".")} == FOLDERS


def test_tests_mirror_the_package(own_files: tuple[Path, ...]) -> None:
    packages = {file.parts[1] for file in own_files if file.parts[0] == "pacing" and file.parts[2:]}
    folders = {file.parts[1] for file in own_files if file.parts[0] == "tests" and file.parts[2:]}
    assert folders - packages - BESIDE_THE_MIRROR == set()


def test_no_file_is_named_after_no_subject(own_files: tuple[Path, ...]) -> None:
    named = {part.removesuffix(".py") for file in own_files for part in file.parts}
    assert named & NO_SUBJECT == set()


def test_files_stay_small(modules: Any) -> None:
    lines = {
        module.name: len(module.file.read_text(encoding="utf-8").splitlines()) for module in modules
    }
    assert {name: n for name, n in lines.items() if n > MOST_LINES} == {}
    assert sorted(lines.values())[len(lines) // 2] <= 250


def test_functions_stay_short(modules: Any) -> None:
    lengths = [
        (node.end_lineno or node.lineno) - node.body[0].lineno + 1
        for module in modules
        for node in ast.walk(module.tree)
        if isinstance(node, ast.FunctionDef)
    ]
    assert sum(length < 40 for length in lengths) >= 0.95 * len(lengths)


def test_no_recording_and_no_big_file_is_kept(own_files: tuple[Path, ...], root: Path) -> None:
    big = [str(file) for file in own_files if (root / file).stat().st_size > 1_000_000]
    assert big == []


def test_everything_imported_is_asked_for_in_pyproject(
    own_files: tuple[Path, ...], root: Path
) -> None:
    project = tomllib.loads((root / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    needs = {"pacing": _names(project["dependencies"])}
    extras = set().union(*map(_names, project["optional-dependencies"].values()))
    needs["tests"] = needs["courses"] = needs["demo"] = needs["pacing"] | extras
    missing = [
        f"{file}: {name}"
        for file in own_files
        if file.suffix == ".py"
        for name in _imported(ast.parse((root / file).read_text(encoding="utf-8")))
        if name not in sys.stdlib_module_names
        and name not in needs[file.parts[0]] | _beside(file, own_files)
    ]
    assert missing == []


def _names(requirements: list[str]) -> set[str]:
    """What is imported of each requirement."""
    packages = {re.split(r"[^\w-]", text)[0].lower().replace("-", "_") for text in requirements}
    return {IMPORTED_AS.get(name, name) for name in packages}


def _imported(tree: ast.Module) -> set[str]:
    found: set[str] = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            found |= {alias.name.split(".")[0] for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.module and not node.level:
            found.add(node.module.split(".")[0])
    return found


def _beside(file: Path, own_files: tuple[Path, ...]) -> set[str]:
    """The package, and for tests and scripts the modules of their own."""
    if file.parts[0] == "pacing":
        return {"pacing"}
    return {"pacing"} | {
        other.stem for other in own_files if other.parts[0] in (file.parts[0], "courses")
    }
