"""The race file from disk, with the files it names merged in."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any, NamedTuple

from pacing.race import lines
from pacing.race.build import build
from pacing.race.check import without_rivals
from pacing.race.origin import Origin, Origins, shown
from pacing.race.race import Race
from pacing.race.toml_file import TomlFile, read_toml

SHARED = ("rider", "bike", "air")
"""Tables that may live in a file of their own."""


class Given(NamedTuple):
    """What was written: one merged table, and where each key of it stands."""

    table: dict[str, Any]
    origins: Origins


def load_race(
    file: Path | str,
    *,
    air: Path | str | None = None,
    start: str | None = None,
    cues: int | None = None,
) -> Race:
    """The race that a TOML file describes, course read and every default filled in.

    ``air`` names a TOML file that stands in for the race's ``[air]``; ``start`` (a clock) and
    ``cues`` for ``plan.start`` and ``plan.max_cues``, as the options of the command do.

    Raises `UnusableInputError` (file, key and line where known) for anything unusable in the
    race file, the files it names or the course; `CannotBeRiddenError` for a reserve above W′.
    """
    given = read_given(Path(file), air=air, start=start, cues=cues)
    return build(given.table, given.origins, file=Path(file))


def read_given(
    file: Path,
    *,
    air: Path | str | None = None,
    start: str | None = None,
    cues: int | None = None,
) -> Given:
    """The tables as written, files merged, without looking at what the keys say."""
    race = read_toml(file)
    table = dict(race.table)
    others: dict[lines.Path, Origin] = {}
    if air is not None:
        table["air"] = {}
        _merge(table, others, "air", read_toml(air, what="a file of the day's air (TOML)"))
    for name in SHARED:
        section = table.get(name)
        if isinstance(section, dict) and "file" in section:
            _merge(table, others, name, _named_file(race, name, section["file"]))
    for key, option, value in (("start", "--start", start), ("max_cues", "--cues", cues)):
        if value is not None:
            plan = table.get("plan", {})
            table["plan"] = {**plan, key: value} if isinstance(plan, dict) else plan
            others["plan", key] = Origin(None, option=option)
    return Given(table, Origins(race, others))


def _named_file(race: TomlFile, name: str, value: Any) -> TomlFile:
    if not isinstance(value, str) or not value.strip():
        raise Origins(race).error((name, "file"), shown(value), expected="a path in quotes")
    file, what = race.file.parent / value, f"a file with the keys of [{name}] (TOML)"
    if not os.path.exists(file):  # noqa: PTH110 - does not raise on a name too long
        raise Origins(race).error((name, "file"), f"no such file: {file}", expected=what)
    return read_toml(file, what=what)


def _merge(
    table: dict[str, Any], others: dict[lines.Path, Origin], name: str, found: TomlFile
) -> None:
    """Puts the keys of a file under those that stand in the race file."""
    held: Mapping[str, Any] = found.table
    start: lines.Path = ()
    if list(held) == [name] and isinstance(held[name], dict):
        held, start = held[name], (name,)
    if "file" in held:
        raise Origins(found).error(
            (*start, "file"), "a file named by a file", expected="the keys themselves"
        )
    beside = {key: value for key, value in table[name].items() if key != "file"}
    kept = without_rivals(held, beside)
    table[name] = kept | beside
    for key in kept.keys() - beside.keys():
        others[name, key] = Origin(found, (*start, key))
