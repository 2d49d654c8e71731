"""Race files that are not TOML, not text, or not files: the exact message, quickly."""

from __future__ import annotations

import os
import time
from collections.abc import Callable
from pathlib import Path

import pytest

from pacing.errors import UnusableInputError
from pacing.race import load_race

Write = Callable[..., Path]

# What is added to a good race file of 22 lines, the line told, the message after the file.
ADDED = {
    "no value": ("x = = 2", 23, "a value that is no number, true, false, clock or text in quotes"),
    "no key": ("abc", 23, "a line that is not key = value"),
    "text without quotes": (
        "x = farmland",
        23,
        "a value that is no number, true, false, clock or text in quotes",
    ),
    "quotes that do not close": ('x = "abc', 23, "text whose quotes do not close"),
    "a backslash": (
        'x = "C:\\qourse"',
        23,
        "a \\ in double quotes; single quotes take it as it is",
    ),
    "a list that does not close": ("x = [1, 2", 23, "a list whose bracket does not close"),
    "a table twice": ("[rider]", 23, "a key or table given twice"),
    "a key twice": ("humidity_pct = 1\nhumidity_pct = 2", 24, "a key or table given twice"),
    "something after a value": (
        "humidity_pct = 60 %",
        23,
        "something after the value that does not belong to it",
    ),
    "a decimal comma": (
        "humidity_pct = 60,5",
        23,
        "something after the value that does not belong to it",
    ),
    "a header that does not close": ("[plan", 23, "a [table] whose bracket does not close"),
}

DEEP = {
    "open lists": "x = " + "[" * 100_000,
    "lists": "x = " + "[" * 5000 + "]" * 5000,
    "tables in a line": "x = " + "{a=" * 5000 + "1" + "}" * 5000,
    "a dotted key": ".".join(["a"] * 200_000) + " = 1",
    "a dotted header": "[" + ".".join(["a"] * 20_000) + "]",
}


def message_of(file: Path | str) -> str:
    began = time.perf_counter()
    with pytest.raises(UnusableInputError) as found:
        load_race(file)
    assert time.perf_counter() - began < 10.0
    text = str(found.value)
    assert len(text) < 600
    return text


@pytest.mark.parametrize("case", ADDED)
def test_what_is_not_toml_is_told_with_its_line(
    write_race: Write, small_race: str, case: str
) -> None:
    added, line, words = ADDED[case]
    file = write_race(f"{small_race}{added}\n")
    assert message_of(file) == f"{file}, line {line}: not TOML: {words}."


@pytest.mark.parametrize("case", DEEP)
def test_deep_nesting_is_refused(write_race: Write, small_race: str, case: str) -> None:
    file = write_race(f"{small_race}{DEEP[case]}\n")
    what = "tables" if "dotted" in case else "tables or lists"
    assert message_of(file) == f"{file}: {what} nested too deeply; expected at most 32 levels."


def test_a_number_of_thousands_of_digits_is_refused(write_race: Write, small_race: str) -> None:
    file = write_race(small_race.replace("72.0", "9" * 5000))
    assert message_of(file) == f"{file}: not TOML: a number with too many digits."


def test_an_empty_file_is_refused(write_race: Write) -> None:
    for text in ("", "\n  \n"):
        file = write_race(text)
        assert message_of(file) == f"{file}: the file is empty; expected a race file (TOML)."


def test_a_file_of_comments_lacks_its_first_key(write_race: Write) -> None:
    file = write_race("# nothing yet\n")
    assert message_of(file) == (
        f"{file}: course.file: missing; expected a path in quotes. Add file = … under [course]."
    )


def test_text_that_is_not_utf8_is_refused_with_its_line(write_race: Write, small_race: str) -> None:
    latin = write_race(small_race.replace("aero", "aéro").encode("latin-1"))
    assert message_of(latin) == (
        f"{latin}, line 10: not UTF-8 text (byte 0xe9). Save the file as UTF-8."
    )
    wide = write_race(small_race.encode("utf-16"))
    assert message_of(wide) == (
        f"{wide}, line 1: not UTF-8 text (byte 0xff). Save the file as UTF-8."
    )


def test_a_binary_file_is_refused(write_race: Write) -> None:
    file = write_race(b"\x00\x01\x02\x03")
    assert message_of(file) == f"{file}, line 1: not TOML: a line that is not key = value."


def test_a_file_of_megabytes_is_refused(write_race: Write, small_race: str) -> None:
    file = write_race(small_race + 'x = "' + "a" * 10_000_000 + '"\n')
    assert message_of(file) == (f"{file}: larger than 1 MB; expected a race file (TOML), a few kB.")


def test_long_words_and_many_tables_are_refused_quickly(write_race: Write, small_race: str) -> None:
    file = write_race(small_race + "a" * 900_000 + " = 1\n")
    assert "unknown key" in message_of(file)
    file = write_race(small_race + "".join(f"[a{n}]\n" for n in range(60_000)))
    assert message_of(file) == f"{file}, line 23: a0: unknown table. Did you mean air?"


def test_a_missing_file_is_named(tmp_path: Path) -> None:
    file = tmp_path / "race.toml"
    assert message_of(file) == f"{file}: no such file; expected a race file (TOML)."


def test_a_folder_is_no_race_file(tmp_path: Path) -> None:
    assert message_of(tmp_path) == f"{tmp_path}: a folder; expected a race file (TOML)."


def test_a_path_through_a_file_is_refused(write_race: Write) -> None:
    file = write_race() / "race.toml"
    assert message_of(file) == f"{file}: cannot be read (Not a directory)."


@pytest.mark.skipif(not Path("/dev/zero").exists(), reason="no such device here")
def test_a_device_without_end_is_refused() -> None:
    assert message_of("/dev/zero") == (
        "/dev/zero: larger than 1 MB; expected a race file (TOML), a few kB."
    )


@pytest.mark.parametrize("name", ["a\0b", "x" * 300])
def test_a_name_that_no_file_can_have_is_refused(name: str) -> None:
    assert message_of(name)


@pytest.mark.skipif(os.name != "posix" or os.geteuid() == 0, reason="everything is readable here")
def test_a_file_that_may_not_be_read_is_named(write_race: Write) -> None:
    file = write_race()
    file.chmod(0)
    assert message_of(file) == f"{file}: cannot be read (Permission denied)."
