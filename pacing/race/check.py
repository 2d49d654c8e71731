"""The whole race table against the table of keys: nothing unknown, missing or out of range."""

from __future__ import annotations

from collections.abc import Mapping, Set
from typing import Any

from pacing.race.keys import LIST_MARK, NOT_YET, Key, lists_of, sections
from pacing.race.lines import Path
from pacing.race.nearest import did_you_mean, did_you_mean_anywhere, did_you_mean_key
from pacing.race.origin import Origins, dotted, path_of, shown
from pacing.race.value import checked_value

TOP = ("course", "rider", "bike", "air", "plan", "uncertainty", "options")
MOST_ENTRIES = 2000


class Checked:
    """A checker of one race table: collects cautions, raises on the first thing unusable."""

    def __init__(self, given: Mapping[str, Any], origins: Origins) -> None:
        self.given = given
        self.origins = origins
        self.cautions: list[str] = []

    def caution(self, path: Path, words: str) -> None:
        """Note that a value is usable but remarkable."""
        origin = self.origins.of(path)
        self.cautions.append(f"Check {origin.option or dotted(path)}: {words}.")

    def table(self) -> dict[str, Any]:
        """Every section checked, fixed defaults filled in, absent keys None.

        Raises `UnusableInputError` naming file, key and, where known, line.
        """
        for name, value in self.given.items():
            if name not in TOP:
                if isinstance(value, dict | list):
                    raise self.origins.error((name,), "unknown table", mend=did_you_mean(name, TOP))
                mend = did_you_mean_anywhere(name)
                raise self.origins.error((name,), "unknown key", mend=mend)
        self._refuse_what_is_not_built()
        return {name: self._section(name) for name in TOP if name != "options"}

    def _refuse_what_is_not_built(self) -> None:
        for key, refused, reason in NOT_YET:
            path: Path = ()
            value: Any = self.given
            for part in path_of(key):
                value = _inside(value, part)
                path += (part,)
            if value is not None and refused in (None, value):
                raise self.origins.error(path, reason, mend="leave it out for now")

    def _section(self, name: str) -> dict[str, Any]:
        value = self.given.get(name, {})
        if not isinstance(value, dict):
            raise self.origins.error((name,), shown(value), expected=f"a table [{name}]")
        lists = lists_of(name)
        hourly = name == "air" and bool(value.get("hours"))
        filled = self._keys(name, value, (name,), lists=lists, needed=not hourly)
        for listed in lists:
            filled[listed] = self._entries(name, listed, value, filled)
        if name == "rider" and not filled["positions"]:
            raise self._missing(
                sections()["rider.positions[]"]["cda_m2"], ("rider", "positions", 0, "cda_m2")
            )
        return filled

    def _entries(
        self, name: str, listed: str, value: Mapping[str, Any], filled: Mapping[str, Any]
    ) -> list[dict[str, Any]]:
        path: Path = (name, listed)
        entries = value.get(listed, [])
        expected = f"tables, each under [[{name}.{listed}]]"
        if not isinstance(entries, list):
            raise self.origins.error(path, shown(entries), expected=expected)
        if len(entries) > MOST_ENTRIES:
            raise self.origins.error(path, shown(entries), expected=f"at most {MOST_ENTRIES}")
        section = f"{name}.{listed}{LIST_MARK}"
        checked = []
        for number, entry in enumerate(entries):
            if not isinstance(entry, dict):
                raise self.origins.error((*path, number), shown(entry), expected=expected)
            beside = value if section == "air.hours[]" else {}
            inherited = {key: beside[key] for key in sections()[section] if key in beside}
            checked.append(
                self._keys(
                    section,
                    without_rivals(inherited, entry) | entry,
                    (*path, number),
                    quiet=inherited.keys() - entry.keys(),
                )
            )
        return checked

    def _keys(
        self,
        section: str,
        given: Mapping[str, Any],
        path: Path,
        *,
        lists: tuple[str, ...] = (),
        needed: bool = True,
        quiet: Set[str] = frozenset(),
    ) -> dict[str, Any]:
        keys = sections()[section]
        for name in given:
            if name not in keys and name not in lists:
                mend = did_you_mean_key(name, section, lists)
                if name in TOP and isinstance(given[name], dict):
                    mend = f"keep [{name}] in the race file"
                raise self.origins.error((*path, name), "unknown key", mend=mend)
        filled: dict[str, Any] = {}
        for name, key in keys.items():
            value = given.get(name)
            if value is not None:
                caution = _no_caution if name in quiet else self.caution
                filled[name] = checked_value(key, value, (*path, name), self.origins, caution)
                continue
            if key.required and needed and not _replaced(name, given):
                raise self._missing(key, (*path, name))
            filled[name] = list(key.default) if isinstance(key.default, list) else key.default
        return filled

    def _missing(self, key: Key, path: Path) -> Exception:
        table = f"[{key.section}]" if LIST_MARK not in key.section else f"[[{key.section[:-2]}]]"
        return self.origins.error(
            path, "missing", expected=key.expected, mend=f"add {key.name} = … under {table}"
        )


RIVALS: tuple[tuple[frozenset[str], frozenset[str]], ...] = (
    (frozenset({"pressure_hpa"}), frozenset({"station_pressure_hpa", "station_height_m"})),
    (frozenset({"bearing_drag"}), frozenset({"bearing_n", "bearing_n_per_m_s"})),
)
"""Two ways to say one thing: where a file says one and a key beside it the other, it wins."""


def without_rivals(base: Mapping[str, Any], beside: Mapping[str, Any]) -> dict[str, Any]:
    """``base`` without what a key in ``beside`` says in the other of two ways."""
    kept = dict(base)
    for one, other in RIVALS:
        for here, there in ((one, other), (other, one)):
            if here & beside.keys() and not there & beside.keys():
                kept = {key: value for key, value in kept.items() if key not in there}
    return kept


def _no_caution(path: Path, words: str) -> None:
    pass


def _replaced(name: str, given: Mapping[str, Any]) -> bool:
    return name == "pressure_hpa" and given.get("station_pressure_hpa") is not None


def _inside(value: Any, part: str | int) -> Any:
    if isinstance(value, dict) and isinstance(part, str):
        return value.get(part)
    if isinstance(value, list) and isinstance(part, int) and part < len(value):
        return value[part]
    return None
