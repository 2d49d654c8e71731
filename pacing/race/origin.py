"""Where each key of a race was written, and what to say of it when it cannot be used."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from pacing.errors import UnusableInputError
from pacing.race.lines import Path
from pacing.race.toml_file import TomlFile

LONGEST_SHOWN = 60
_BARE = re.compile(r"[A-Za-z0-9_-]+")


@dataclass(frozen=True)
class Origin:
    """Where a key came from: a file, and the path of the key there; or a command's option."""

    file: TomlFile | None
    path: Path = ()
    option: str | None = None


@dataclass(frozen=True)
class Origins:
    """The origin of every path that does not come from the race file itself."""

    race: TomlFile | None = None
    others: Mapping[Path, Origin] = field(default_factory=dict)

    def of(self, path: Path) -> Origin:
        """The origin of a key: that of the longest listed path that leads to it."""
        for end in range(len(path), 0, -1):
            found = self.others.get(path[:end])
            if found is not None:
                return Origin(found.file, found.path + path[end:], found.option)
        return Origin(self.race, path)

    def error(
        self,
        path: Path,
        found: str,
        *,
        expected: str | None = None,
        mend: str | None = None,
    ) -> UnusableInputError:
        """The error to raise about the key at ``path`` (as the race names it)."""
        origin = self.of(path)
        key = origin.option or dotted(path)
        if origin.file is None:
            return UnusableInputError(found, key=key, expected=expected, mend=mend)
        return UnusableInputError(
            found,
            file=origin.file.file,
            line=origin.file.line_of(origin.path),
            key=key,
            expected=expected,
            mend=mend,
        )


def dotted(path: Path) -> str:
    """A path as a dotted name: ``rider.positions[0].cda_m2``."""
    text = ""
    for part in path:
        if isinstance(part, int):
            text += f"[{part}]"
        else:
            word = part if _BARE.fullmatch(part) and len(part) <= LONGEST_SHOWN else quoted(part)
            text += f".{word}" if text else word
    return text


def path_of(name: str) -> Path:
    """The path of a simple dotted name, ``rider.positions[0].name``: `dotted` undone."""
    path: Path = ()
    for word in name.split("."):
        part, _, number = word.partition("[")
        path += (part, int(number.rstrip("]"))) if number else (part,)
    return path


def quoted(text: str) -> str:
    """Text in quotes, shortened, with nothing in it that a terminal would obey."""
    short = text if len(text) <= LONGEST_SHOWN else text[: LONGEST_SHOWN - 1] + "…"
    safe = "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in short)
    return f'"{safe}"'


def shown(value: Any) -> str:
    """What was found, in a few words."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return f"the text {quoted(value)}" if value.strip() else "an empty text"
    if isinstance(value, int):
        if abs(value) < 10**15:
            return str(value)
        return f"a whole number of some {math.ceil(value.bit_length() * 0.30103)} digits"
    if isinstance(value, float):
        return f"{value:.15g}" if math.isfinite(value) else f"{value} (not a finite number)"
    if isinstance(value, list):
        return "an empty list" if not value else f"a list of {len(value)}"
    if isinstance(value, dict):
        return "a table"
    return f"the date or time {value}"
