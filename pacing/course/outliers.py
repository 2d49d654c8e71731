"""Points that no road passes through: thrown far off the line, or drawn while standing still."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import percentile_filter

from pacing.course.geodesy import distances_m, steps
from pacing.course.track import Track

Array = NDArray[np.float64]

NEIGHBOURS = 31
FAR_M = 25.0
FAR_RATIO = 3.0
MOST_THROWN = 30
RETURN_SHARE = 0.3
THROWN_AT_END = 5
FAR_AT_END_M = 5000.0
STANDSTILL_RADIUS_M = 10.0
STANDSTILL_PATH_M = 60.0


def outliers(track: Track) -> NDArray[np.bool_]:
    """Which points (P,) the line jumps to and at once back from.

    A jump is a step of more than ``FAR_M`` and ``FAR_RATIO`` times nine tenths of the steps
    around. Up to ``MOST_THROWN`` points between two jumps are off if the second ends near where
    the first began; at either end of the track, up to ``THROWN_AT_END`` points beyond a jump of
    more than ``FAR_AT_END_M``.
    """
    off = np.zeros(len(track), dtype=bool)
    if len(track) < 4:
        return off
    step = distances_m(track.lat_deg, track.lon_deg)
    usual = percentile_filter(step, 90, size=min(NEIGHBOURS, len(step)), mode="reflect")
    usual = np.minimum(usual, np.percentile(step, 90)) if len(step) >= 10 else usual
    jumps = np.flatnonzero(step > np.maximum(FAR_M, FAR_RATIO * usual))
    if jumps.size and step[jumps[0]] > FAR_AT_END_M and jumps[0] < THROWN_AT_END:
        off[: jumps[0] + 1] = True
    if jumps.size and step[jumps[-1]] > FAR_AT_END_M and len(step) - jumps[-1] <= THROWN_AT_END:
        off[jumps[-1] + 1 :] = True
    if off.sum() >= len(track) - 2:
        return np.zeros(len(track), dtype=bool)
    at = 0
    while at < len(jumps):
        back = _way_back(track, step, jumps, at)
        if back is None or off[jumps[at]]:
            at += 1
            continue
        off[jumps[at] + 1 : jumps[back] + 1] = True
        at = back + 1
    return off


def _way_back(track: Track, step: Array, jumps: NDArray[np.intp], at: int) -> int | None:
    """The jump after ``jumps[at]`` that leads back to where it left from, if there is one."""
    here = int(jumps[at])
    for back in range(at + 1, len(jumps)):
        there = int(jumps[back])
        if there - here > MOST_THROWN:
            return None
        ends = [here, there + 1]
        left = float(distances_m(track.lat_deg[ends], track.lon_deg[ends])[0])
        if left < RETURN_SHARE * min(step[here], step[there]):
            return back
    return None


def standstills(track: Track) -> list[tuple[int, int]]:
    """First and last index of each run of points drawn while standing still.

    More than ``STANDSTILL_PATH_M`` of line that does not leave ``STANDSTILL_RADIUS_M``: riding
    through takes 2 radii, turning round there no more.
    """
    east, north = steps(track.lat_deg, track.lon_deg)
    x, y = (np.concatenate([[0.0], np.cumsum(part)]) for part in (east, north))
    way = np.concatenate([[0.0], np.cumsum(np.hypot(east, north))])
    # Only where the point STANDSTILL_PATH_M of line later is still near need one look closer.
    later = np.searchsorted(way, way + STANDSTILL_PATH_M)
    later = np.minimum(later, len(way) - 1)
    near = np.hypot(x[later] - x, y[later] - y) < 2 * STANDSTILL_RADIUS_M
    runs: list[tuple[int, int]] = []
    free_from = 0
    for first in np.flatnonzero(near & (way[later] - way >= 0.8 * STANDSTILL_PATH_M)):
        if first < free_from:
            continue
        last = _last_within(x, y, int(first), x[first], y[first])
        middle = slice(first, last + 1)
        last = max(last, _last_within(x, y, int(first), x[middle].mean(), y[middle].mean()))
        if way[last] - way[first] > STANDSTILL_PATH_M:
            runs.append((int(first), last))
            free_from = last + 1
    return runs


def _last_within(x: Array, y: Array, first: int, x_0: float, y_0: float) -> int:
    """The last point from ``first`` on before the line leaves the circle around a place."""
    start, width = first + 1, 64
    while start < len(x):
        part = slice(start, start + width)
        out = np.hypot(x[part] - x_0, y[part] - y_0) > STANDSTILL_RADIUS_M
        if out.any():
            return start + int(np.argmax(out)) - 1
        start, width = start + width, 2 * width
    return len(x) - 1
