"""Words that have no place here. They are put together from pieces, so that this file has none."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

TEXT = {".py", ".md", ".toml", ".txt", ".csv", ".gpx", ".html", ".xsd", ""}

ELSEWHERE = {
    "a folder of one machine": "/" + "(?:work|root|home|Users)/" + r"\w",
    "a scratch folder": "/" + "tmp" + r"\b",
    "where packages come from": r"\b(?:py"
    + r"pi\.org|python"
    + r"hosted|registry\.npm|deb"
    + r"ian\.org)",
    "a note beside the project": r"\b" + "sha" + r"red/(?!recorded)",
    "a piece of work by its number": r"\b(?i:iss" + r"ues?) #?\d",
    "what was said": r"\b(?i:trans" + r"cripts?)\b",
    "where it was learnt": r"\b(?i:lec" + r"tures?|seed doc" + r"ument)\b",
}
TO_READERS = {
    "energy as a vessel": r"\b(?:batt" + r"ery|stam" + r"ina|fuel ta" + r"nk)\b",
    "somebody's trade mark": r"\b(?:F" + r"TP|T" + r"SS|I" + r"F score|N" + r"P)\b",
    "training by numbers": r"\b(?i:training zo" + r"nes?|zo" + r"ne \d)\b",
    "selling": r"\b(?i:what-"
    + r"if|sav"
    + r"ings? calculator|virt"
    + r"ual (?:ride|partner)|"
    + r"revolution"
    + r"ary|cutting-ed"
    + r"ge|power"
    + r"ful)\b",
}


def texts(own_files: tuple[Path, ...], root: Path, start: tuple[str, ...] = ()) -> list[Path]:
    """Files of text, all or those that lie under one of ``start``."""
    return [
        root / file
        for file in own_files
        if file.suffix in TEXT and (not start or file.parts[0] in start)
    ]


def found(files: list[Path], pattern: str, root: Path) -> list[str]:
    """``file:line`` of every match."""
    return [
        f"{file.relative_to(root)}:{number}"
        for file in files
        for number, line in enumerate(file.read_text(encoding="utf-8").splitlines(), 1)
        if re.search(pattern, line)
    ]


@pytest.mark.parametrize("pattern", ELSEWHERE.values(), ids=ELSEWHERE)
def test_nothing_speaks_of_one_machine_or_of_how_the_work_was_given(
    own_files: tuple[Path, ...], root: Path, pattern: str
) -> None:
    assert found(texts(own_files, root), pattern, root) == []


@pytest.mark.parametrize("pattern", TO_READERS.values(), ids=TO_READERS)
def test_what_people_read_uses_the_words_of_the_trade(
    own_files: tuple[Path, ...], root: Path, pattern: str
) -> None:
    files = texts(own_files, root, ("README.md", "DEVELOPERS.md", "pacing", "demo"))
    assert found(files, pattern, root) == []


def test_all_text_is_utf_8_with_unix_line_ends_and_a_last_one(
    own_files: tuple[Path, ...], root: Path
) -> None:
    for file in texts(own_files, root):
        raw = file.read_bytes()
        raw.decode("utf-8")
        assert b"\r" not in raw, file
        assert not raw or raw.endswith(b"\n"), file
