"""A TOML file from disk, with every way it can be unusable told in plain words."""

from __future__ import annotations

import os
import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

from pacing.errors import UnusableInputError
from pacing.race import lines

MOST_BYTES = 1_000_000
DEEPEST = 32
_TOO_DEEP = re.compile(
    r"""(?<![\w"'.-])(?:[\w"'-]++[ \t]*+\.[ \t]*+){%d}""" % DEEPEST  # noqa: UP031
)
_PLACE = re.compile(r" \(at line (\d+), column (\d+)\)$")


@dataclass(frozen=True)
class TomlFile:
    """One file: its path as the user named it, its table, its text."""

    file: Path
    table: dict[str, Any]
    text: str

    @cached_property
    def _lines(self) -> Mapping[lines.Path, int]:
        return lines.key_lines(self.text)

    def line_of(self, path: lines.Path) -> int | None:
        """The line of a key, where it can be known."""
        return lines.line_of(self._lines, path)


def read_toml(file: Path | str, *, what: str = "a race file (TOML)") -> TomlFile:
    """The file's table; a byte-order mark and Windows line ends are allowed.

    Raises `UnusableInputError`: no such file, a folder, unreadable, empty, larger than
    ``MOST_BYTES``, not UTF-8, not TOML (with its line), nested too deeply.
    """
    file = Path(file)
    text = _text_of(_bytes_of(file, what), file)
    if not text.strip():
        raise UnusableInputError("the file is empty", file=file, expected=what)
    return TomlFile(file, _parsed(text, file), text)


def _bytes_of(file: Path, what: str) -> bytes:
    try:
        with file.open("rb") as stream:
            data = stream.read(MOST_BYTES + 1)
    except FileNotFoundError:
        raise UnusableInputError("no such file", file=file, expected=what) from None
    except IsADirectoryError:
        raise UnusableInputError("a folder", file=file, expected=what) from None
    except ValueError:
        raise UnusableInputError("not a file name", file=repr(str(file)), expected=what) from None
    except OSError as problem:
        if os.path.isdir(file):  # noqa: PTH112 - does not raise on a name too long
            raise UnusableInputError("a folder", file=file, expected=what) from None
        reason = problem.strerror or type(problem).__name__
        raise UnusableInputError(f"cannot be read ({reason})", file=file) from None
    if len(data) > MOST_BYTES:
        raise UnusableInputError(
            f"larger than {MOST_BYTES / 1e6:g} MB", file=file, expected=f"{what}, a few kB"
        )
    return data


def _text_of(data: bytes, file: Path) -> str:
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as problem:
        raise UnusableInputError(
            f"not UTF-8 text (byte 0x{data[problem.start]:02x})",
            file=file,
            line=data.count(b"\n", 0, problem.start) + 1,
            mend="save the file as UTF-8",
        ) from None


def _parsed(text: str, file: Path) -> dict[str, Any]:
    if _TOO_DEEP.search(text):
        raise UnusableInputError(
            "tables nested too deeply", file=file, expected=f"at most {DEEPEST} levels"
        )
    try:
        return tomllib.loads(text)
    except RecursionError:
        raise UnusableInputError(
            "tables or lists nested too deeply", file=file, expected=f"at most {DEEPEST} levels"
        ) from None
    except tomllib.TOMLDecodeError as problem:
        words, line = str(problem), _line_in(str(problem), text)
        raise UnusableInputError(f"not TOML: {_plain(words)}", file=file, line=line) from None
    except ValueError:
        raise UnusableInputError("not TOML: a number with too many digits", file=file) from None


_PLAIN = (
    ("Cannot (overwrite|declare|mutate|redefine)|already|Duplicate", "a key or table given twice"),
    (
        "Expected '=' after a key|character for a key|Invalid statement",
        "a line that is not key = value",
    ),
    (
        r"Illegal character '\\n'|Unterminated string|Expected \"'\"|Expected '\"'",
        "text whose quotes do not close",
    ),
    ("Invalid value", "a value that is no number, true, false, clock or text in quotes"),
    (r"Unescaped '\\' in a string", "a \\ in double quotes; single quotes take it as it is"),
    ("Expected newline or end of document", "something after the value that does not belong to it"),
    (r"Expected '\]", "a [table] whose bracket does not close"),
    ("Unclosed array", "a list whose bracket does not close"),
    ("Unclosed inline table|Invalid inline table", "a { table } that does not close on its line"),
)
"""The parser's words, where ours are plainer."""


def _plain(words: str) -> str:
    for pattern, plain in _PLAIN:
        if re.search(pattern, words):
            return plain
    words = re.sub(r" \(at .*\)$", "", words)
    return f"{words[:1].lower()}{words[1:]}"


def _line_in(words: str, text: str) -> int | None:
    found = _PLACE.search(words)
    if found:
        return int(found[1])
    if words.endswith("(at end of document)"):
        return text.rstrip("\n").count("\n") + 1
    return None
