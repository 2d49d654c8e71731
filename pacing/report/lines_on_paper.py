"""The course as lines on paper: north up, in points, each passage of a road beside the others."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

METRES_PER_DEGREE = 111_320.0
CHECKED = 41


def on_paper(
    lat_deg: Array, lon_deg: Array, box_pt: tuple[float, float, float, float]
) -> tuple[Array, float]:
    """Points (N, 2) within ``box_pt`` (left, low, right, high), and points per metre."""
    middle = np.radians(0.5 * (lat_deg.min() + lat_deg.max()))
    turned = np.degrees(np.unwrap(np.radians(lon_deg)))
    east = (turned - turned[0]) * METRES_PER_DEGREE * np.cos(middle)
    north = (lat_deg - lat_deg[0]) * METRES_PER_DEGREE
    left, low, right, high = box_pt
    scale = min((right - left) / max(np.ptp(east), 1.0), (high - low) / max(np.ptp(north), 1.0))
    x = (east - 0.5 * (east.min() + east.max())) * scale + 0.5 * (left + right)
    y = (north - 0.5 * (north.min() + north.max())) * scale + 0.5 * (low + high)
    return np.column_stack([x, y]), float(scale)


def lap_nodes(distance_m: Array, lap_length_m: float, laps: int) -> list[tuple[int, int]]:
    """First and last node of each lap."""
    ends = np.searchsorted(distance_m, lap_length_m * np.arange(1, laps) - 1e-6)
    edge = [0, *(int(end) for end in ends), distance_m.size - 1]
    return [(a, b) for a, b in pairwise(edge) if b > a]


def right_of(at: Array, step: int = 1) -> Array:
    """Unit vectors (N, 2) to the right of the direction of travel, over ``step`` nodes each way."""
    count = at.shape[0]
    before = at[np.maximum(np.arange(count) - step, 0)]
    after = at[np.minimum(np.arange(count) + step, count - 1)]
    along = after - before
    long = np.maximum(np.hypot(along[:, 0], along[:, 1]), 1e-9)
    right: Array = np.column_stack([along[:, 1], -along[:, 0]]) / long[:, None]
    return right


def moved(at: Array, laps: list[tuple[int, int]], apart_pt: float) -> Array:
    """The line moved to the right of the direction of travel, each lap one place further.

    Where a lap so moved would loop within a bend tighter than the move, it is drawn straight
    through the loop.
    """
    right = right_of(at, max(1, at.shape[0] // 2000))
    shown = at.copy()
    for number, (first, last) in enumerate(laps):
        lap = slice(first, last + 1)
        away = apart_pt * (0.5 + number)
        shown[lap] = _unlooped(at[lap] + away * right[lap], at[lap], away)
    return shown


def _unlooped(line: Array, road: Array, away_pt: float) -> Array:
    """``line``, ``away_pt`` beside ``road``, without the points that came nearer to the road."""
    count = line.shape[0]
    spacing = max(float(np.hypot(*np.diff(road, axis=0).T).mean()), 1e-6)
    reach = max(1, min(count - 1, int(np.ceil(4 * away_pt / spacing))))
    kept = np.ones(count, dtype=bool)
    for shift in np.unique(np.linspace(-reach, reach, CHECKED).round().astype(int)):
        near = slice(max(0, -shift), min(count, count - shift))
        other = slice(max(0, shift), min(count, count + shift))
        gap = line[near] - road[other]
        kept[near] &= np.hypot(gap[:, 0], gap[:, 1]) > 0.9 * away_pt
    kept[[0, -1]] = True
    index = np.arange(count)
    return np.column_stack([np.interp(index, index[kept], line[kept, axis]) for axis in (0, 1)])
