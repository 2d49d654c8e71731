"""How recorded heights drift: the same place passed twice tells it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from pacing.field.recording_place import Places

Array = NDArray[np.float64]

NEAR_M = 12.0
THIN_M = 20.0
LEAST_APART_S = 240.0
LEAST_PAIRS = 10
LONG_GAP_S = 30.0
WORTH_SAYING_M = 5.0

RATE_SD_M_PER_S = 10.0 / 3600.0
"""How fast a barometer drifts with the weather, one standard deviation (common practice)."""
JUMP_SD_M = 10.0
PAIR_SD_M = 1.0
ALIKE = 10.0
"""So many neighbouring pairs tell about as much as one: their errors are alike."""


@dataclass(frozen=True)
class Drift:
    """An even drift of the heights, ``rate_m_per_s`` with its standard error.

    ``misclosure_m`` is the largest difference of height found at one place passed twice.
    """

    rate_m_per_s: float
    rate_se_m_per_s: float
    misclosure_m: float
    pairs: int
    notes: tuple[str, ...] = ()


def height_drift(time_s: Array, places: Places, height_m: Array, step_s: Array) -> Drift | None:
    """Drift of recorded heights (n,), from places passed more than once; None without any.

    An even rate over the whole ride and a jump over every long gap, by least squares with
    what a barometer does held against it.
    """
    first, second = _passed_twice(time_s, places, height_m)
    if first.size < LEAST_PAIRS:
        return None
    rise = height_m[second] - height_m[first]
    gaps = np.flatnonzero(step_s > LONG_GAP_S)
    # Gaps in order, so that each pair's column says which of them lie between its two passes.
    before = np.searchsorted(gaps, first, side="left")
    after = np.searchsorted(gaps, second, side="left")
    columns = np.zeros((first.size, 1 + gaps.size))
    columns[:, 0] = time_s[second] - time_s[first]
    for k in range(gaps.size):
        columns[:, 1 + k] = (before <= k) & (k < after)
    weight = np.full(first.size, 1.0 / (ALIKE * PAIR_SD_M**2))
    prior = np.concatenate([[RATE_SD_M_PER_S**-2], np.full(gaps.size, JUMP_SD_M**-2)])
    for _ in range(4):
        normal = columns.T @ (weight[:, None] * columns) + np.diag(prior)
        found = np.linalg.solve(normal, columns.T @ (weight * rise))
        off = np.abs(rise - columns @ found) / PAIR_SD_M
        weight = np.minimum(1.0, 3.0 / np.maximum(off, 1e-9)) / (ALIKE * PAIR_SD_M**2)
    rate_se = float(np.sqrt(np.linalg.inv(normal)[0, 0]))
    worst = float(np.quantile(np.abs(rise), 0.95))
    notes: tuple[str, ...] = ()
    if worst > WORTH_SAYING_M:
        notes = (f"heights of the same place differ by up to {worst:.0f} m: the recorder drifts",)
    return Drift(float(found[0]), rate_se, worst, int(first.size), notes)


def _passed_twice(
    time_s: Array, places: Places, height_m: Array
) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Pairs of samples at one place, the second a good while after the first."""
    good = np.isfinite(places.east_m) & np.isfinite(height_m)
    index = np.flatnonzero(good)
    if index.size < LEAST_PAIRS:
        return index[:0], index[:0]
    step = np.hypot(np.diff(places.east_m[index]), np.diff(places.north_m[index]))
    along = np.concatenate([[0.0], np.cumsum(step)])
    _, thin = np.unique(np.floor(along / THIN_M), return_index=True)
    kept = index[thin]
    points = np.column_stack([places.east_m[kept], places.north_m[kept]])
    pairs = cKDTree(points).query_pairs(NEAR_M, output_type="ndarray")
    first, second = kept[pairs.min(axis=1)], kept[pairs.max(axis=1)]
    apart = time_s[second] - time_s[first] > LEAST_APART_S
    return first[apart], second[apart]
