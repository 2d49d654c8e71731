"""Every citation leads to a source, and every source is cited."""

from __future__ import annotations

import ast
import re
from pathlib import Path
from typing import Any

from pacing.sources import SOURCES

CITED = re.compile(r"Source:\s+(.+?)(?:\n\s*\n|\Z)", re.DOTALL)
KEY = re.compile(r"\b(?:[a-z]+-)+\d{4}\b|\bwgs84\b")


def paragraphs(tree: ast.AST) -> list[str]:
    """What stands after each ``Source:`` in the strings of a module, to the paragraph's end."""
    texts = [
        node.value
        for node in ast.walk(tree)
        if isinstance(node, ast.Constant) and isinstance(node.value, str)
    ]
    return [found for text in texts for found in CITED.findall(text)]


def test_every_citation_begins_with_a_key_of_the_table(modules: Any) -> None:
    wrong = [
        f"{module.name}: {paragraph.split()[0]}"
        for module in modules
        for paragraph in paragraphs(module.tree)
        if re.split(r"[\s,.;:()]", paragraph.strip())[0] not in SOURCES
    ]
    assert wrong == []


def test_every_key_in_a_citation_is_in_the_table(modules: Any) -> None:
    unknown = {
        f"{module.name}: {key}"
        for module in modules
        for paragraph in paragraphs(module.tree)
        for key in KEY.findall(paragraph)
        if key not in SOURCES
    }
    assert unknown == set()


def test_every_source_is_cited_or_has_a_file_of_checks(modules: Any, root: Path) -> None:
    cited = {
        key
        for module in modules
        for paragraph in paragraphs(module.tree)
        for key in SOURCES
        if re.search(rf"(?<![\w-]){re.escape(key)}(?![\w-])", paragraph)
    }
    files = {file.stem for file in (root / "tests" / "published").glob("test_*.py")}
    checked = {key for key in SOURCES if f"test_{key.replace('-', '_')}" in files}
    assert set(SOURCES) - cited - checked == set()


def test_a_key_is_the_first_author_and_the_year_or_a_standard() -> None:
    for key, source in SOURCES.items():
        if KEY.fullmatch(key) and key != "wgs84" and not key.startswith(("iso-", "cipm-")):
            author = re.sub(r"[^a-z]+", "-", source.authors.split(",")[0].lower()).strip("-")
            assert key.startswith(author.split("-")[0]), key
            assert key.endswith(str(source.year)), key


def test_every_source_says_who_when_what_and_where() -> None:
    for key, source in SOURCES.items():
        assert source.authors, key
        assert 1900 < source.year < 2100, key
        assert source.title, key
        assert source.where, key
