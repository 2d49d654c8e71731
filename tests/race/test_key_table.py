"""README and starter file list every key, and what they say of it is so."""

from __future__ import annotations

import re
import tomllib
from importlib import resources
from pathlib import Path

import pytest

from pacing.race.check import Checked
from pacing.race.complete import completed
from pacing.race.key_table import END, START, markdown, rewritten
from pacing.race.keys import NOT_YET, sections
from pacing.race.option_list import checked_options
from pacing.race.origin import Origins

README = Path(__file__).parents[2] / "README.md"
STARTER = resources.files("pacing.race").joinpath("starter", "race.toml").read_text("utf-8")
KEY_LINE = re.compile(r"^# ((?:\[|[a-z_\".0-9 ]+ = ).*)$", re.MULTILINE)


def test_the_readme_lists_every_key_as_it_is() -> None:
    text = README.read_text(encoding="utf-8")
    assert START in text
    assert END in text
    assert text == rewritten(text), "make it anew with pacing.race.key_table.write('README.md')"


def test_the_tables_name_every_key_and_every_refusal() -> None:
    text = markdown()
    for section, keys in sections().items():
        if section != "air.hours[]":
            assert all(f"| `{name}` |" in text for name in keys)
    assert all(reason in text for _, _, reason in NOT_YET)


def test_the_starter_names_every_key() -> None:
    for section, keys in sections().items():
        missing = [
            name for name in keys if not re.search(rf"^(# )?{name} = ", STARTER, re.MULTILINE)
        ]
        assert missing == [], section


def test_the_starter_gives_no_caution() -> None:
    checked = Checked(tomllib.loads(STARTER), Origins())
    completed(checked.table(), checked)
    assert checked.cautions == []


def _in_force(paragraph: str) -> str:
    return KEY_LINE.sub(r"\1", paragraph)


PARAGRAPHS = STARTER.split("\n\n")
BLOCKS = [text for text in PARAGRAPHS if re.search(r"^# \[", text, re.MULTILINE)]
SINGLE = [
    found[0]
    for text in PARAGRAPHS
    if text not in BLOCKS
    for found in KEY_LINE.finditer(text)
    if not found[1].startswith(("file", "station", "bearing_n", "risk"))
]


@pytest.mark.parametrize("line", SINGLE)
def test_a_line_of_the_starter_can_be_put_in_force(line: str) -> None:
    _try(STARTER.replace(line, _in_force(line), 1))


@pytest.mark.parametrize("block", BLOCKS)
def test_a_block_of_the_starter_can_be_put_in_force(block: str) -> None:
    text = _in_force(block)
    assert len(tomllib.loads(text)) == 1
    _try(STARTER.replace(block, text, 1))


def _try(text: str) -> None:
    checked = Checked(tomllib.loads(text), Origins())
    table = completed(checked.table(), checked)
    assert checked.cautions == []
    checked_options(checked.given, Origins(), filled=table)
