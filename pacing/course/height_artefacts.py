"""What no road does: the humps and dips of terrain over tunnels and under bridges."""

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
LONGEST_M = 1200.0
LONGEST_WITH_FEET_M = 1600.0
STEEPEST_CHORD = 0.14
FOOT_SLOPES = (0.04, 0.09)
SMALLEST_FLANK_M = 3.0
FLANK_SHARE = 0.015
BESIDE_M = 150.0
STEEPEST_BESIDE = 0.22
LIGHT_M = 60.0


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
            "hump no road has, as over a tunnel, bridged"
            if cut.off_m > 0
            else "dip no road has, as under a bridge, bridged",
            cut.from_m / 1000,
            cut.to_m / 1000,
            f"{abs(cut.off_m):.0f} m {'above' if cut.off_m > 0 else 'below'} the road",
        )
        for cut in cuts
    )
