"""On which line of a TOML text each key stands, which the standard parser does not tell.

The text has been parsed before, so it is valid TOML and the scan may be simple: headers and
keys at the outer level, values skipped. Keys inside inline tables and arrays are not listed;
they are looked up by the key that holds them.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping

Path = tuple[str | int, ...]

_BLANK = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*+")
_PART = re.compile(r"""[ \t]*([A-Za-z0-9_-]+|"(?:[^"\\\n]|\\.)*+"|'[^'\n]*+')[ \t]*""")
_STRINGS = {
    '"""': re.compile(r'"""(?:[^"\\]|\\[\s\S]|"(?!""))*+"{3,5}'),
    "'''": re.compile(r"'''(?:[^']|'(?!''))*+'{3,5}"),
    '"': re.compile(r'"(?:[^"\\\n]|\\.)*+"'),
    "'": re.compile(r"'[^'\n]*+'"),
}
_PLAIN = re.compile(r"[^\"'#\[\]{}\n]++")


def key_lines(text: str) -> Mapping[Path, int]:
    """The line (from 1) of every header and outer key of a valid TOML ``text``.

    Empty where the scan loses its way: better no line than a wrong one.
    """
    try:
        return _scan(text.replace("\r\n", "\n"))
    except (ValueError, IndexError):
        return {}


def line_of(lines: Mapping[Path, int], path: Path) -> int | None:
    """The line of ``path``, else of the nearest key or table that holds it."""
    for end in range(len(path), 0, -1):
        if path[:end] in lines:
            return lines[path[:end]]
    return None


def _scan(text: str) -> dict[Path, int]:
    lines: dict[Path, int] = {}
    counts: dict[Path, int] = {}
    table: Path = ()
    counted_to, line = 0, 1
    at = _skip_blank(text, 0)
    while at < len(text):
        line, counted_to = line + text.count("\n", counted_to, at), at
        if text[at] == "[":
            table, at = _header(text, at, counts)
            lines.setdefault(table, line)
        else:
            parts, at = _dotted(text, at)
            if text[at] != "=":
                raise ValueError("no key here")
            lines.setdefault(table + parts, line)
            at = _skip_value(text, at + 1)
        at = _skip_blank(text, at)
    return lines


def _skip_blank(text: str, at: int) -> int:
    found = _BLANK.match(text, at)
    return found.end() if found else at


def _header(text: str, at: int, counts: dict[Path, int]) -> tuple[Path, int]:
    listed = text.startswith("[[", at)
    parts, at = _dotted(text, at + (2 if listed else 1))
    path: Path = ()
    for part in parts[:-1]:
        path += (part,)
        if path in counts:
            path += (counts[path],)
    path += (parts[-1],)
    if listed:
        counts[path] = counts.get(path, -1) + 1
        path += (counts[path],)
    return path, at + (2 if listed else 1)


def _dotted(text: str, at: int) -> tuple[tuple[str, ...], int]:
    parts: list[str] = []
    while True:
        found = _PART.match(text, at)
        if not found:
            raise ValueError("no key here")
        word = found[1]
        parts.append(tomllib.loads(f"k = {word}")["k"] if word[0] in "\"'" else word)
        at = found.end()
        if text[at] != ".":
            return tuple(parts), at
        at += 1


def _skip_value(text: str, at: int) -> int:
    depth = 0
    while at < len(text):
        sign = text[at]
        if sign in "\"'":
            opening = text[at : at + 3] if text[at : at + 3] in _STRINGS else sign
            found = _STRINGS[opening].match(text, at)
            if not found:
                raise ValueError("a string without end")
            at = found.end()
            continue
        if sign == "\n" and depth == 0:
            return at
        if sign == "#":
            found = _BLANK.match(text, at)
            if depth == 0:
                return at
            at = found.end() if found else at + 1
            continue
        depth += (sign in "[{") - (sign in "]}")
        found = _PLAIN.match(text, at)
        at = found.end() if found else at + 1
    return at
