"""What no road does: terrain over tunnels and under bridges, height spikes and cliffs."""

from __future__ import annotations

from itertools import product
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solveh_banded
from scipy.ndimage import median_filter

from pacing.course.course import Repair
from pacing.course.height_model import second_difference_bands, sums_of
from pacing.course.height_steps import Points

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]

STEEP = 0.14
"""Slope away from the local one, one way and then the other, that no road takes in one hump."""
STEEP_RECORDED = 0.35
LONGEST_M = 1000.0
LONGEST_WITH_FEET_M = 1400.0
STEEPEST_CHORD = 0.14
FOOT_SLOPES = (0.04, 0.09)
SMALLEST_FLANK_M = 3.0
FLANK_SHARE = 0.015
BESIDE_M = 150.0
STEEPEST_BESIDE = 0.22
LIGHT_M = 60.0
CLIFF_M = 8.0
CLIFF_SLOPE = 0.5
ISLAND_M = 600.0
CALM_M = 60.0
CALM_SLOPE = 0.2


class Cut(NamedTuple):
    """A stretch [m] whose heights are no road's, and how far they stand off [m]."""

    from_m: float
    to_m: float
    off_m: float


def cut_humps(points: Points, grid_m: Array, steep: float) -> tuple[Mask, list[Cut]]:
    """Which points to keep (M,), and the two-sided humps and dips that were cut.

    A hump leaves the local slope by more than ``steep`` one way and then the other within
    LONGEST_M, over a chord no steeper than STEEPEST_CHORD that agrees with the slopes beside it.
    """
    keep = np.ones(len(points.at_m), dtype=bool)
    cuts: list[Cut] = []
    for _ in range(4):
        height = _lightly_smoothed(points, keep, grid_m)
        found = _humps(height, float(grid_m[1] - grid_m[0]), steep)
        if not found:
            break
        for first, last in found:
            bridge = np.interp(
                grid_m[first : last + 1], grid_m[[first, last]], height[[first, last]]
            )
            off = height[first : last + 1] - bridge
            inside = (points.at_m > grid_m[first]) & (points.at_m < grid_m[last])
            if (inside & keep).any():
                farthest = float(off[np.argmax(np.abs(off))])
                cuts.append(Cut(float(grid_m[first]), float(grid_m[last]), farthest))
            keep &= ~inside
    return keep, _joined(cuts)


def _lightly_smoothed(points: Points, keep: Mask, grid_m: Array) -> Array:
    at, height = points.at_m[keep], points.height_m[keep]
    weight = np.clip(np.gradient(at) / 10.0, 0.02, 5.0) if len(at) > 2 else np.ones(len(at))
    sums = sums_of(at, height, weight, grid_m)
    bands = second_difference_bands(sums.nodes) * (LIGHT_M / np.pi / sums.step_m) ** 4
    bands[0] += sums.diagonal + 1e-9
    bands[1, :-1] += sums.beside
    return np.asarray(solveh_banded(bands, sums.moment, lower=True, check_finite=False))


def _humps(height_m: Array, step_m: float, steep: float) -> list[tuple[int, int]]:
    """Non-overlapping humps as pairs of nodes, the best agreeing with its neighbourhood first."""
    slope = np.diff(height_m) / step_m
    away = slope - median_filter(slope, size=2 * round(750 / step_m) + 1, mode="reflect")
    runs = sorted(_runs(away > steep, 1) + _runs(away < -steep, -1))
    most = round(LONGEST_M / step_m)
    candidates = []
    for index, (first, stop, way) in enumerate(runs):
        feet = [len(slope) - foot for foot in _feet(way * away[::-1], len(slope) - first, most)]
        for start, end, other in runs[index + 1 :]:
            if end - first > most:
                break
            if other == way:
                continue
            flanks = [
                abs(float(away[one].sum())) for one in (slice(first, stop), slice(start, end))
            ]
            far_feet = _feet(-way * away, end, most)
            for low, high in product(feet, far_feet):
                least_m = max(SMALLEST_FLANK_M, FLANK_SHARE * (high - low) * step_m)
                if (high - low) * step_m > LONGEST_WITH_FEET_M or min(flanks) * step_m < least_m:
                    continue
                misfit = _chord_misfit(height_m, low, high, step_m)
                if misfit is not None:
                    short = (low != feet[0]) + (high != far_feet[0])
                    candidates.append((misfit + 0.02 * short, low, high))
    chosen: list[tuple[int, int]] = []
    for _, low, high in sorted(candidates):
        if all(high <= first or low >= last for first, last in chosen):
            chosen.append((low, high))
    return chosen


def _runs(mask: Mask, way: int) -> list[tuple[int, int, int]]:
    edges = np.flatnonzero(np.diff(np.concatenate([[0], mask.astype(int), [0]])))
    return [(int(a), int(b), way) for a, b in zip(edges[::2], edges[1::2], strict=True)]


def _feet(away: Array, start: int, most: int) -> list[int]:
    """Cells at which a flank from ``start`` on has come back to, or near, the local slope."""
    stretch = away[start : start + most // 2]
    feet = []
    for slope in FOOT_SLOPES:
        back = np.flatnonzero(stretch <= slope)
        feet.append(start + (int(back[0]) if len(back) else len(stretch)))
    return feet


def _chord_misfit(height_m: Array, low: int, high: int, step_m: float) -> float | None:
    """How badly the chord fits the slopes beside it, and a little for length; None if too badly.

    A side that is itself steeper than a road, or that has no room, does not count; where neither
    counts, this is the dip between two humps and not a dip of its own.
    """
    last, reach = len(height_m) - 1, round(BESIDE_M / step_m)
    chord = float(height_m[high] - height_m[low]) / ((high - low) * step_m)
    sides = [(max(low - reach, 0), low), (high, min(high + reach, last))]
    slopes = [
        float(height_m[end] - height_m[start]) / ((end - start) * step_m)
        for start, end in sides
        if end - start >= reach // 3
    ]
    calm = [slope for slope in slopes if abs(slope) <= STEEPEST_BESIDE]
    if abs(chord) > STEEPEST_CHORD or (slopes and not calm):
        return None
    beside = sum(calm) / len(calm) if calm else chord
    misfit = abs(chord - beside) + 0.1 * (high - low) * step_m / 1000
    return misfit if misfit < 0.17 else None


def _joined(cuts: list[Cut]) -> list[Cut]:
    """Cuts in order along the road, those that touch made one."""
    joined: list[Cut] = []
    for cut in sorted(cuts):
        if joined and cut.from_m <= joined[-1].to_m:
            last = joined.pop()
            off = max(last.off_m, cut.off_m, key=abs)
            cut = Cut(last.from_m, max(last.to_m, cut.to_m), off)
        joined.append(cut)
    return joined


def hump_repairs(cuts: list[Cut]) -> tuple[Repair, ...]:
    """One line of the report for each cut."""
    return tuple(
        Repair(
            "terrain over a tunnel or cutting bridged"
            if cut.off_m > 0
            else "terrain under a bridge or embankment bridged",
            cut.from_m / 1000,
            cut.to_m / 1000,
            f"{abs(cut.off_m):.0f} m {'above' if cut.off_m > 0 else 'below'} the road",
        )
        for cut in cuts
    )


def find_jumps(points: Points, step_m: float | None) -> list[tuple[int, int | None]]:
    """Jumps no road makes: the point before each, and the last point before the way back, if any.

    A jump there and back within ISLAND_M is a spike. A jump that stays is a cliff, as when a
    barometer is set anew. Either lies between stretches that are no walls themselves.
    """
    at, height = points.at_m, points.height_m
    rise, run = np.diff(height), np.maximum(np.diff(at), 1.0)
    usual = 1.4826 * float(np.median(np.abs(rise[rise != 0]))) if np.any(rise != 0) else 0.0
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
