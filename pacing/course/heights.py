"""From recorded heights to the height of the road at every node of the grid."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Repair
from pacing.course.height_jumps import without_spikes
from pacing.course.height_smooth import smooth_points
from pacing.course.height_source import RECORDED, SOURCES_OF_HEIGHT
from pacing.course.height_steps import Points, binned, step_of
from pacing.errors import UnusableInputError

Array = NDArray[np.float64]

WRAP_M = 3000.0
FEWEST_POINTS = 5
FEWEST_NODES = 20
DRIFT_TOLD_M = 2.0
UNKNOWN_ERROR_PCT = 20.0
"""The largest gradient error that is stated: beyond, nothing is known."""


@dataclass(frozen=True)
class HeightProfile:
    """Smoothed heights ``elevation_m`` (N+1,) at the nodes ``distance_m`` (N+1,).

    ``noise_m`` is the standard deviation of the error of a height, ``gradient_error_pct`` the
    expected error of the gradient over 100 m (root mean square), ``smoothing_m`` the length of
    hump that is halved, ``reason`` why the source was judged so, ``sensor`` the kind of recorder.
    """

    distance_m: Array
    elevation_m: Array
    source: str
    noise_m: float
    gradient_error_pct: float
    smoothing_m: float
    repairs: tuple[Repair, ...] = ()
    sensor: str = ""
    reason: str = ""


def smooth_heights(
    distance_m: Array,
    elevation_m: Array,
    *,
    grid: Array,
    source: str | None = None,
    smoothing_m: float | None = None,
    timed: bool = False,
    closed: bool = False,
    returns: bool = False,
) -> HeightProfile:
    """Heights of the road at the nodes of the grid, as smooth as the data ask for.

    ``distance_m`` (M,) is horizontal distance of the points, never falling; ``elevation_m`` (M,)
    their heights, nan where missing; ``grid`` (N+1,) uniform nodes from the first to the last
    point. ``source`` is None (judged from the heights) or one of ``recorded``, ``terrain grid``,
    ``stepped``; ``timed`` tells that the points carry time stamps; ``closed`` that the finish is
    the start, passed in one direction, so that heights and gradients join there; ``returns`` that
    it is the same place, so that the heights do. ``smoothing_m`` overrides the strength: a hump of
    that length is halved. Missing heights are bridged; the rise from start to finish is kept.
    Raises UnusableInputError: unknown source, no heights.
    """
    if source is not None and source not in SOURCES_OF_HEIGHT:
        raise UnusableInputError(
            f"{source!r}", key="course.heights", expected=", ".join(SOURCES_OF_HEIGHT)
        )
    known = np.isfinite(elevation_m)
    if not known.any():
        raise UnusableInputError("no heights at all", key="course.heights")
    at, height = distance_m[known], elevation_m[known]
    drift: tuple[Repair, ...] = ()
    if closed or returns:
        height, drift = _brought_level(at, height)
    step = step_of(elevation_m[known])
    points, spikes = without_spikes(binned(at, height), step)
    if len(points.at_m) < FEWEST_POINTS or len(grid) < 3 or np.ptp(points.height_m) == 0:
        return _unsmoothed(points, grid, source, (*drift, *spikes))
    around = closed and len(grid) >= FEWEST_NODES
    extra, wrapped = _wrapped(points, grid) if around else (0, points)
    nodes = grid[0] + (grid[-1] - grid[0]) / (len(grid) - 1) * np.arange(-extra, len(grid) + extra)
    spare = extra // 2
    smooth = smooth_points(
        wrapped,
        nodes,
        step_m=step,
        told=source,
        smoothing_m=smoothing_m,
        timed=timed,
        spare=spare,
    )
    here = slice(extra - spare, extra - spare + len(grid))
    return HeightProfile(
        distance_m=grid,
        elevation_m=_through_the_ends(smooth.road_m[here], grid, at, height, smooth.noise_m),
        source=smooth.judged.source,
        noise_m=smooth.noise_m,
        gradient_error_pct=min(smooth.gradient_error_pct, UNKNOWN_ERROR_PCT),
        smoothing_m=smooth.smoothing_m,
        repairs=(*drift, *spikes, *_within(smooth.repairs, grid)),
        sensor=smooth.judged.sensor,
        reason=smooth.judged.reason,
    )


def _unsmoothed(
    points: Points, grid: Array, source: str | None, repairs: tuple[Repair, ...]
) -> HeightProfile:
    """Straight lines between the points: too few to smooth, or all of one height."""
    level = float(np.ptp(points.height_m)) == 0 and len(points.at_m) >= FEWEST_POINTS
    return HeightProfile(
        distance_m=grid,
        elevation_m=np.interp(grid, points.at_m, points.height_m),
        source=source or RECORDED,
        noise_m=0.0,
        gradient_error_pct=0.0 if level else UNKNOWN_ERROR_PCT,
        smoothing_m=0.0,
        repairs=repairs,
        reason="one height everywhere" if level else "too few heights to judge",
    )


def _brought_level(at: Array, height: Array) -> tuple[Array, tuple[Repair, ...]]:
    """Heights (M,) with the difference between the two ends, which are one place, spread evenly."""
    drift = float(height[-1] - height[0])
    length = max(float(at[-1] - at[0]), 1e-9)
    level = height - drift * ((at - at[0]) / length - 0.5)
    if abs(drift) < DRIFT_TOLD_M:
        return level, ()
    amount = f"{drift:+.0f} m at the finish, spread over the course"
    ends_km = float(at[0]) / 1000, float(at[-1]) / 1000
    return level, (Repair("start and finish brought to one height", *ends_km, amount),)


def _wrapped(points: Points, grid: Array) -> tuple[int, Points]:
    """A closed course with some of its end before its start and some of its start after its end.

    Returns how many nodes that takes on either side, and the points. The outer half is there so
    that no tunnel is cut in two by the end of the inner one.
    """
    length = float(grid[-1] - grid[0])
    cell = length / (len(grid) - 1)
    extra = min(int(WRAP_M / cell), len(grid) - 2)
    at = np.concatenate([points.at_m - length, points.at_m, points.at_m + length])
    inside = (at >= grid[0] - extra * cell) & (at <= grid[-1] + extra * cell)
    tiled = Points(at, np.tile(points.height_m, 3), np.tile(points.weight, 3))
    return extra, tiled.chosen(inside)


def _through_the_ends(road: Array, grid: Array, at: Array, height: Array, noise_m: float) -> Array:
    """The road, tilted a little so that it rises from start to finish as the heights do.

    An end that lies far off the road is an outlier and is not followed.
    """
    off = height[[0, -1]] - np.interp(at[[0, -1]], grid, road)
    off = np.where(np.abs(off) <= 4 * noise_m + 1.0, off, 0.0)
    length = max(float(at[-1] - at[0]), 1e-9)
    return np.asarray(road + off[0] + (off[1] - off[0]) * (grid - at[0]) / length)


def _within(repairs: tuple[Repair, ...], grid: Array) -> tuple[Repair, ...]:
    low, high = float(grid[0]) / 1000, float(grid[-1]) / 1000
    return tuple(repair for repair in repairs if low <= repair.from_km and repair.to_km <= high)
