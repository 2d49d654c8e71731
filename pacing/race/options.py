"""A race table with some values replaced: what an option, a draw or a batch case is.

Keys are called by their dotted names, entries of lists by their own names; a value replaces,
a text such as "-0.004", "+0.2" or "-3 %" changes.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from pacing.errors import UnusableInputError
from pacing.race.check import TOP, without_rivals
from pacing.race.keys import ENTRY_NAME, LIST_MARK, Key, lists_of, sections
from pacing.race.lines import Path
from pacing.race.nearest import did_you_mean, did_you_mean_key
from pacing.race.origin import Origin, Origins, dotted, quoted, shown

CHANGE = re.compile(r"\s*([+-])\s*(\d+(?:\.\d+)?)\s*(%?)\s*")
WRAPS = "wind_from_deg"
CHANGEABLE = tuple(name for name in TOP if name != "options")


@dataclass(frozen=True)
class Override:
    """One key replaced: its ``path`` as called by the user, where that was written, the value."""

    path: Path
    value: Any
    start: Path = ()
    origins: Origins = field(default_factory=Origins)

    def error(
        self, found: str, *, expected: str | None = None, mend: str | None = None
    ) -> Exception:
        """The error to raise about this override."""
        return self.origins.error((*self.start, *self.path), found, expected=expected, mend=mend)

    @property
    def origin(self) -> Origin:
        """Where the new value stands, to be named instead of the key it replaces."""
        path = (*self.start, *self.path)
        origin = self.origins.of(path)
        return Origin(origin.file, origin.path, origin.option or dotted(path))


def overrides_in(
    table: Mapping[str, Any], *, start: Path = (), origins: Origins | None = None
) -> tuple[Override, ...]:
    """Every key that ``table`` replaces; nested tables and dotted names may be mixed.

    ``table`` is an option of a race file, or ``{"bike.crr": 0.004}``; its ``name`` is passed
    over. ``start`` and ``origins`` say where it stands. Raises `UnusableInputError` for what is
    no key of a race, naming the nearest.
    """
    found: list[Override] = []
    for name, value in table.items():
        if name != "name":
            _collect(Override(_parts(name), value, start, origins or Origins()), found)
    return tuple(found)


def replaced(
    given: Mapping[str, Any], overrides: tuple[Override, ...], *, filled: Mapping[str, Any]
) -> dict[str, Any]:
    """The table as written with ``overrides`` applied, unchecked; its options are left out.

    ``filled`` is the same race with every default, to which relative changes apply. Raises
    `UnusableInputError` for an entry that is not there and for a change that is none.
    """
    table = {name: value for name, value in given.items() if name != "options"}
    for override in overrides:
        path, key = landing(override, filled)
        value = override.value if key is None else _changed(key, override, filled, path)
        table = _with_value(table, path, value)
    return table


def landing(override: Override, filled: Mapping[str, Any]) -> tuple[Path, Key | None]:
    """The path an override lands on, entries by number, and its key (None for a whole list)."""
    path = override.path
    section, name = str(path[0]), str(path[1])
    if name not in lists_of(section):
        return path, sections()[section][name]
    if len(path) == 2:
        return path, None
    listed = f"{section}.{name}{LIST_MARK}"
    names = [entry[ENTRY_NAME[listed]] for entry in filled[section][name]]
    if path[2] not in names:
        known = (
            "one of " + ", ".join(quoted(n) for n in names) if names else "an entry that is there"
        )
        raise override.error(f"no entry is called {quoted(str(path[2]))}", expected=known)
    return (section, name, names.index(path[2]), path[3]), sections()[listed][str(path[3])]


def _parts(name: str) -> Path:
    if "." not in name:
        return (name,)
    try:
        inner: Any = tomllib.loads(f"{name} = 0")
    except ValueError:
        raise UnusableInputError(
            "not a dotted name", key=quoted(name), expected="a key such as rider.mass_kg"
        ) from None
    path: Path = ()
    while isinstance(inner, dict) and len(inner) == 1:
        ((part, inner),) = inner.items()
        path += (part,)
    return path


def _collect(override: Override, found: list[Override]) -> None:
    known, value = _known(override), override.value
    if known == "key" or (known == "list" and isinstance(value, list)):
        found.append(override)
    elif isinstance(value, dict):
        for name, inner in value.items():
            path = (*override.path, name)
            _collect(Override(path, inner, override.start, override.origins), found)
    else:
        raise override.error(shown(value), expected="the keys of a race below this")


def _known(override: Override) -> str:
    """What a path is: "key", "list", or "table" for all that leads to keys."""
    names = [str(part) for part in override.path]
    if names[0] not in CHANGEABLE:
        raise override.error("unknown key", mend=did_you_mean(names[0], CHANGEABLE))
    if len(names) == 1:
        return "table"
    section, name, rest = names[0], names[1], names[2:]
    lists = lists_of(section)
    if name in lists:
        if len(rest) < 2:
            return "table" if rest else "list"
        section, name, rest, lists = f"{section}.{name}{LIST_MARK}", rest[1], rest[2:], ()
    if name == "file" and section != "course":
        raise override.error("a file cannot be exchanged", expected="the keys themselves")
    if name not in sections()[section] or rest:
        raise override.error("unknown key", mend=did_you_mean_key(name, section, lists))
    return "key"


def _with_value(holder: Any, path: Path, value: Any) -> Any:
    """A copy of ``holder`` with the value at ``path``; what is not on the path is shared."""
    part, rest = path[0], path[1:]
    if isinstance(part, int):
        items = list(holder)
        items[part] = _with_value(items[part], rest, value)
        return items
    table = dict(holder or {})
    if rest:
        table[part] = _with_value(table.get(part), rest, value)
        return table
    return without_rivals(table, {part: value}) | {part: value}


def _changed(key: Key, override: Override, filled: Mapping[str, Any], path: Path) -> Any:
    """The new value: as given, or that of ``filled`` changed by a text such as "-3 %"."""
    value = override.value
    before: Any = filled
    if not isinstance(value, str) or key.low is None or key.kind == "text or integer":
        return value
    found = CHANGE.fullmatch(value)
    if not found:
        raise override.error(
            shown(value), expected=f'{key.expected}, or a change such as "-0.004" or "-3 %"'
        )
    for part in path:
        before = before[part]
    if before is None or isinstance(before, list):
        raise override.error(
            f"a change of {quoted(value)} to what is not given", expected=key.expected
        )
    amount = float(found[1] + found[2])

    def changed(number: float) -> float:
        return number * (1.0 + amount / 100.0) if found[3] else number + amount

    if isinstance(before, dict):
        angles, values = key.columns or ("", "")
        return {angles: before[angles], values: [changed(number) for number in before[values]]}
    number = changed(before)
    wraps = key.name == WRAPS and not key.section.startswith("uncertainty")
    return number % 360.0 if wraps else number
