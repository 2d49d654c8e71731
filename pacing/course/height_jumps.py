"""Jumps of recorded heights that no road makes: spikes, and cliffs that stay."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Repair
from pacing.course.height_steps import Points

Array = NDArray[np.float64]

CLIFF_M = 8.0
CLIFF_SLOPE = 0.5
ISLAND_M = 600.0
CALM_M = 60.0
CALM_SLOPE = 0.2


def find_jumps(points: Points, step_m: float | None) -> list[tuple[int, int | None]]:
    """Jumps no road makes: the point before each, and the last point before the way back, if any.

    A jump there and back within ISLAND_M is a spike. A jump that stays is a cliff, as when a
    barometer is set anew. Either lies between stretches that are no walls themselves.
    """
    at, height = points.at_m, points.height_m
    rise, run = np.diff(height), np.maximum(np.diff(at), 1.0)
    some = np.abs(rise[rise != 0])
    usual = 1.4826 * float(np.median(some)) if len(some) > 0.1 * len(rise) else 0.0
    least = max(CLIFF_M, 8 * usual, 2.5 * (step_m or 0.0))
    jumps = np.flatnonzero((np.abs(rise) > least) & (np.abs(rise) / run > CLIFF_SLOPE))
    found: list[tuple[int, int | None]] = []
    past = -1
    for here in jumps:
        if here <= past or not _calm(at, height, int(here), -1):
            continue
        back = _way_back(at, rise, jumps[jumps > here], int(here))
        end = int(here if back is None else back) + 1
        if _calm(at, height, end, 1):
            found.append((int(here), back))
            past = end - 1
    return found


def without_spikes(points: Points, step_m: float | None) -> tuple[Points, list[Repair]]:
    """The points without those of height spikes."""
    keep = np.ones(len(points.at_m), dtype=bool)
    repairs = []
    for here, back in find_jumps(points, step_m):
        if back is not None:
            keep[here + 1 : back + 1] = False
            repairs.append(_repair("height spike left out", points, here, back + 1))
    return points.chosen(keep), repairs


def without_cliffs(points: Points, step_m: float | None) -> tuple[Points, list[Repair]]:
    """The points with all that follows a cliff shifted by its height."""
    height = points.height_m.copy()
    repairs = []
    for here, back in find_jumps(points, step_m):
        if back is None:
            height[here + 1 :] -= points.height_m[here + 1] - points.height_m[here]
            repairs.append(_repair("height cliff taken out", points, here, here + 1))
    return points._replace(height_m=height), repairs


def _repair(what: str, points: Points, here: int, end: int) -> Repair:
    rise = points.height_m[here + 1] - points.height_m[here]
    return Repair(
        what, float(points.at_m[here]) / 1000, float(points.at_m[end]) / 1000, f"{rise:+.0f} m"
    )


def _calm(at_m: Array, height_m: Array, index: int, way: int) -> bool:
    """Whether the heights go on from a point, back (-1) or on (1), without another wall."""
    beyond = at_m[index] + way * CALM_M
    other = int(np.searchsorted(at_m, beyond)) - (1 if way > 0 else 0)
    other = min(max(other, 0), len(at_m) - 1)
    if other == index:
        other = min(max(index + way, 0), len(at_m) - 1)
    run = max(abs(float(at_m[other] - at_m[index])), 10.0)
    return abs(float(height_m[other] - height_m[index])) / run < CALM_SLOPE


def _way_back(at_m: Array, rise: Array, jumps: NDArray[np.int64], here: int) -> int | None:
    """The jump that undoes the one ``here`` within reach, if there is one."""
    for there in jumps:
        if at_m[there] - at_m[here + 1] > ISLAND_M:
            return None
        if abs(rise[here] + rise[there]) < 0.35 * abs(rise[here]):
            return int(there)
    return None
