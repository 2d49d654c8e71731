"""Which position was ridden when: by the recording itself, by lap or by time window."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.errors import UnusableInputError
from pacing.field.recording import Recording

Index = NDArray[np.intp]

EXPECTED = 'NAME=WHERE, such as "aero bars=lap 1,3" or "upright=600-1200" (seconds)'
_SPAN = re.compile(r"(\d+(?:\.\d+)?)\s*-\s*(\d+(?:\.\d+)?)")


@dataclass(frozen=True)
class Where:
    """Laps, or windows of time in seconds from the start, in which a position was held."""

    laps: tuple[float, ...] = ()
    windows_s: tuple[tuple[float, float], ...] = ()


def positions_from(texts: Iterable[str]) -> dict[str, Where]:
    """Positions as given on the command line: ``aero bars=lap 1,3`` or ``upright=600-1200``.

    Raises `UnusableInputError` for anything else.
    """
    found: dict[str, Where] = {}
    for text in texts:
        name, sign, where = (part.strip() for part in text.partition("="))
        if not sign or not name or not where:
            raise UnusableInputError(f"'{text}'", key="--position", expected=EXPECTED)
        before = found.get(name, Where())
        laps = re.fullmatch(r"laps?\s+(.+)", where)
        if laps:
            words = laps[1].replace(",", " ").split()
            if not all(re.fullmatch(r"\d+(\.\d+)?", word) for word in words):
                raise UnusableInputError(f"'{text}'", key="--position", expected=EXPECTED)
            found[name] = Where((*before.laps, *map(float, words)), before.windows_s)
            continue
        spans = [_SPAN.fullmatch(part.strip()) for part in where.split(",")]
        windows = [(float(s[1]), float(s[2])) for s in spans if s]
        if len(windows) != len(spans) or any(a >= b for a, b in windows):
            raise UnusableInputError(f"'{text}'", key="--position", expected=EXPECTED)
        found[name] = Where(before.laps, (*before.windows_s, *windows))
    return found


def groups_of(
    recordings: Sequence[Recording], asked: Mapping[str, Where], otherwise: str
) -> tuple[tuple[str, ...], list[Index]]:
    """Names of the positions ridden, and for each ride the position's index at every sample (n,).

    −1 marks samples of no position asked for. With none asked for, the recordings' own names;
    without those, all is ``otherwise``. Raises `UnusableInputError` where a position asked for
    was never ridden.
    """
    if asked:
        names = tuple(asked)
        groups = [_asked(recording, asked) for recording in recordings]
    else:
        own = dict.fromkeys(
            str(name) for r in recordings for name in np.unique(r.position).tolist() if name
        )
        names = tuple(own) or (otherwise,)
        groups = [_own(recording, names, bool(own)) for recording in recordings]
    for index, name in enumerate(names):
        if not any(np.any(group == index) for group in groups):
            laps = sorted({float(x) for r in recordings for x in r.lap[np.isfinite(r.lap)]})
            there = ", ".join(f"{lap:g}" for lap in laps[:12]) or "none recorded"
            raise UnusableInputError(
                f"nothing ridden in position '{name}'",
                key="--position",
                expected=f"laps of the ride ({there}) or seconds within it",
            )
    return names, groups


def _asked(recording: Recording, asked: Mapping[str, Where]) -> Index:
    group = np.full(recording.time_s.size, -1, dtype=np.intp)
    for index, where in enumerate(asked.values()):
        here = np.isin(recording.lap, where.laps)
        for a, b in where.windows_s:
            here |= (recording.time_s >= a) & (recording.time_s <= b)
        group[here] = index
    return group


def _own(recording: Recording, names: tuple[str, ...], named: bool) -> Index:
    if not named:
        return np.zeros(recording.time_s.size, dtype=np.intp)
    group = np.full(recording.time_s.size, -1, dtype=np.intp)
    for index, name in enumerate(names):
        group[recording.position == name] = index
    return group
