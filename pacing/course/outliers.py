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
STANDSTILL_RADII_M = (10.0, 5.0, 3.0)
LINGERING_RADII = 5.0
WHIRLING_RADII, WHIRLING_RAD = 3.0, 3.0 * np.pi


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
    jumps = _jumps(step)
    at = 0
    while at < len(jumps):
        back = _way_back(track, step, jumps, at)
        if back is not None:
            off[jumps[at] + 1 : jumps[back] + 1] = True
        at = at + 1 if back is None else back + 1
    kept = np.flatnonzero(~off)
    _mark_lone_ends(off, kept, distances_m(track.lat_deg[kept], track.lon_deg[kept]))
    return off


def _jumps(step: Array) -> NDArray[np.intp]:
    """Which steps (P-1,) [m] are far longer than those around and than most."""
    usual = percentile_filter(step, 90, size=min(NEIGHBOURS, len(step)), mode="reflect")
    usual = np.minimum(usual, np.percentile(step, 90)) if len(step) >= 10 else usual
    return np.flatnonzero(step > np.maximum(FAR_M, FAR_RATIO * usual))


def _mark_lone_ends(off: NDArray[np.bool_], kept: NDArray[np.intp], step: Array) -> None:
    """Mark a few points beyond a great jump at either end of the points kept so far."""
    if len(step) < 2 * THROWN_AT_END:
        return
    far = np.flatnonzero((step > FAR_AT_END_M) & (step > FAR_RATIO * np.percentile(step, 75)))
    before = far[far < THROWN_AT_END]
    after = far[far >= len(step) - THROWN_AT_END]
    if before.size:
        off[: kept[before[-1] + 1]] = True
    if after.size:
        off[kept[after[0] + 1] :] = True


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
    """First and last index of each run of points drawn while standing still, in order.

    A line that does not leave a circle although it is longer than ``LINGERING_RADII`` radii, or
    longer than ``WHIRLING_RADII`` and turning by more than ``WHIRLING_RAD`` in all. Riding
    through takes 2 radii; turning back in it, half a turn and hardly more way.
    """
    east, north = steps(track.lat_deg, track.lon_deg)
    x, y = (np.concatenate([[0.0], np.cumsum(part)]) for part in (east, north))
    turn = np.abs((np.diff(np.arctan2(east, north)) + np.pi) % (2 * np.pi) - np.pi)
    turned = np.concatenate([[0.0, 0.0], np.cumsum(turn)])[: len(x)]
    runs: list[tuple[int, int]] = []
    taken = np.zeros(len(x), dtype=bool)
    for radius in STANDSTILL_RADII_M:
        for first, last in _lingering(x, y, turned, radius):
            if not taken[first : last + 1].any():
                taken[first : last + 1] = True
                runs.append((first, last))
    return sorted(runs)


def _lingering(x: Array, y: Array, turned: Array, radius_m: float) -> list[tuple[int, int]]:
    """Runs of points that linger within a circle of a radius."""
    way = np.concatenate([[0.0], np.cumsum(np.hypot(np.diff(x), np.diff(y)))])
    # Only where the point so much of line later is still near need one look closer.
    least = WHIRLING_RADII * radius_m
    later = np.minimum(np.searchsorted(way, way + least), len(way) - 1)
    near = np.hypot(x[later] - x, y[later] - y) < 2 * radius_m
    runs: list[tuple[int, int]] = []
    free_from = 0
    for first in np.flatnonzero(near & (way[later] - way >= 0.8 * least)).tolist():
        if first < free_from:
            continue
        last = _last_within(x, y, first, radius_m, x[first], y[first])
        middle = slice(first, last + 1)
        last = max(last, _last_within(x, y, first, radius_m, x[middle].mean(), y[middle].mean()))
        radii = (way[last] - way[first]) / radius_m
        whirls = turned[last] - turned[min(first + 1, last)] > WHIRLING_RAD
        if radii > LINGERING_RADII or (radii > WHIRLING_RADII and whirls):
            runs.append((first, last))
            free_from = last + 1
    return runs


def _last_within(x: Array, y: Array, first: int, radius_m: float, x_0: float, y_0: float) -> int:
    """The last point from ``first`` on before the line leaves the circle around a place."""
    start, width = first + 1, 64
    while start < len(x):
        part = slice(start, start + width)
        out = np.hypot(x[part] - x_0, y[part] - y_0) > radius_m
        if out.any():
            return start + int(np.argmax(out)) - 1
        start, width = start + width, 2 * width
    return len(x) - 1
