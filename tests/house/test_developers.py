"""The guide for contributors draws what is there."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import pytest

from pacing.rider.budget import RECOVERY_LAWS


@pytest.fixture(scope="module")
def guide(root: Path) -> str:
    """DEVELOPERS.md as it is."""
    return (root / "DEVELOPERS.md").read_text(encoding="utf-8")


def test_the_drawing_names_every_package(guide: str, modules: Any) -> None:
    drawing = guide.split("    pacing/\n")[1].split("\n\n")[0]
    drawn = re.findall(r"^ {6}(\w+)/", drawing, re.MULTILINE)
    there = {module.package for module in modules if module.name.count(".") == 2}
    single = {module.package for module in modules if module.name.count(".") == 1} - there
    assert set(drawn) == there
    assert single - {"pacing"} <= set(drawing.splitlines()[0].split())


def test_every_path_it_names_is_there(guide: str, root: Path) -> None:
    for path in re.findall(r"`((?:pacing|tests|courses|demo|\.ci|\.githooks)/[\w./-]*)`", guide):
        assert (root / path).exists() or path == "demo/out", path


def test_every_file_of_published_values_is_in_its_table(guide: str, root: Path) -> None:
    files = {file.name for file in (root / "tests" / "published").glob("test_*.py")}
    assert files == set(re.findall(r"`(test_\w+\.py)`", guide.split("## Lint")[0])) & files


def test_every_folder_of_tests_is_explained(
    guide: str, own_files: tuple[Path, ...], modules: Any
) -> None:
    folders = {file.parts[1] for file in own_files if file.parts[0] == "tests" and file.parts[2:]}
    mirrored = {module.package for module in modules}
    explained = set(re.findall(r"^\| `(\w+)/` \|", guide, re.MULTILINE))
    assert folders - mirrored - explained == set()


def test_every_recovery_law_can_be_chosen_in_a_race_file(root: Path) -> None:
    table = (root / "pacing" / "race" / "defaults.toml").read_text(encoding="utf-8")
    line = next(line for line in table.splitlines() if line.startswith("recovery_law"))
    choices = line.split("choices = [")[1].split("]")[0]
    assert set(re.findall(r'"([\w-]+)"', choices)) == set(RECOVERY_LAWS)
