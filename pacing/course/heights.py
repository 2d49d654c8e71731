"""From recorded heights to the height of the road at every node of the grid."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Repair
from pacing.course.height_artefacts import (
    STEEP,
    STEEP_RECORDED,
    cut_humps,
    hump_repairs,
)
from pacing.course.height_error import (
    MORE_AT_CHANGES,
    fixed_smoothing,
    gradients_pct,
    halved_m,
    lessened,
    stated_error_pct,
)
from pacing.course.height_jumps import without_cliffs, without_spikes
from pacing.course.height_model import HeightModel, fit_model, road_heights, sums_of
from pacing.course.height_source import (
    AT_CHANGES,
    SOURCES_OF_HEIGHT,
    STEPPED,
    TERRAIN_GRID,
    Judged,
    as_told,
    judge_source,
)
from pacing.course.height_steps import (
    Points,
    at_changes,
    binned,
    flickers,
    step_of,
    without_held,
)
from pacing.errors import UnusableInputError

Array = NDArray[np.float64]

WRAP_M = 1500.0
DRAWS = 6


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
) -> HeightProfile:
    """Heights of the road at the nodes of the grid, as smooth as the data ask for.

    ``distance_m`` (M,) is horizontal distance of the points, never falling; ``elevation_m`` (M,)
    their heights, nan where missing; ``grid`` (N+1,) uniform nodes from the first to the last
    point. ``source`` is None (judged from the heights) or one of ``recorded``, ``terrain grid``,
    ``stepped``; ``timed`` tells that the points carry time stamps; ``closed`` that the finish is
    the start, so that heights and gradients join there. ``smoothing_m`` overrides the strength:
    a hump of that length is halved. Missing heights are bridged; the rise from start to finish is
    kept, heights cut or shifted by a repair apart. Raises UnusableInputError: unknown source, no
    heights.
    """
    if source is not None and source not in SOURCES_OF_HEIGHT:
        raise UnusableInputError(
            f"{source!r}", key="course.heights", expected=", ".join(SOURCES_OF_HEIGHT)
        )
    known = np.isfinite(elevation_m)
    if not known.any():
        raise UnusableInputError("no heights at all", key="course.heights")
    at, height = distance_m[known], elevation_m[known]
    net = 0.0 if closed else float(height[-1] - height[0])
    first = float(height[0] + height[-1]) / 2 if closed else float(height[0])
    step = step_of(height)
    points, spikes = without_spikes(binned(at, height), step)
    nodes, points = _wrapped(points, grid) if closed else (grid, points)
    smooth = _smooth(points, nodes, step=step, told=source, smoothing_m=smoothing_m, timed=timed)
    inside = slice(None) if len(nodes) == len(grid) else slice((len(nodes) - len(grid)) // 2, None)
    road = smooth.road[inside][: len(grid)]
    share = (grid - grid[0]) / (grid[-1] - grid[0])
    road = road + (first - road[0]) + (net - (road[-1] - road[0])) * share
    return HeightProfile(
        distance_m=grid,
        elevation_m=road,
        source=smooth.judged.source,
        noise_m=smooth.noise_m,
        gradient_error_pct=smooth.gradient_error_pct,
        smoothing_m=smooth.smoothing_m,
        repairs=(*spikes, *_within(smooth.repairs, grid)),
        sensor=smooth.judged.sensor,
        reason=smooth.judged.reason,
    )


@dataclass(frozen=True)
class _Smooth:
    road: Array
    judged: Judged
    noise_m: float
    gradient_error_pct: float
    smoothing_m: float
    repairs: tuple[Repair, ...]


def _smooth(
    points: Points,
    nodes: Array,
    *,
    step: float | None,
    told: str | None,
    smoothing_m: float | None,
    timed: bool,
) -> _Smooth:
    """Cut, judge, weigh and smooth."""
    read = without_held(points, step)
    held = len(read.at_m) < len(points.at_m)
    points = read
    keep, cuts = cut_humps(points, nodes, STEEP)
    kept = points.chosen(keep)
    if told is None:
        judged = judge_source(kept, nodes, step_m=step, held=held, timed=timed)
    else:
        judged = as_told(kept, nodes, told)
    cliffs: list[Repair] = []
    if judged.source != TERRAIN_GRID:
        points, cliffs = without_cliffs(points, step)
        keep, cuts = cut_humps(points, nodes, STEEP_RECORDED)
        if judged.source == STEPPED:
            keep, cuts = np.ones_like(keep), []
        kept = points.chosen(keep)
        if cliffs:
            judged = judged._replace(model=as_told(kept, nodes, judged.source).model)
    model, share = judged.model, 1.0
    if judged.source == STEPPED and ((step or 1.0) >= 5 or not flickers(kept)):
        kept, model = _between_steps(kept, nodes, step or 1.0)
        share = MORE_AT_CHANGES
    sums = sums_of(*kept, nodes)
    likeliest, departures = road_heights(sums, model, DRAWS)
    error = share * stated_error_pct(likeliest, departures, model, judged, sums.step_m)
    if smoothing_m is None:
        road, _ = road_heights(sums, lessened(model, judged.source), 0)
        spacing = float(nodes[-1] - nodes[0]) / max(len(kept.at_m), 1)
        smoothing_m = halved_m(model, spacing, sums.step_m)
    else:
        road = fixed_smoothing(sums, smoothing_m)
        away = gradients_pct(road - likeliest, sums.step_m)
        error = float(np.hypot(error, np.sqrt(np.mean(away**2))))
    return _Smooth(
        road=road,
        judged=judged,
        noise_m=float(np.hypot(model.error_m, model.white_m)),
        gradient_error_pct=error,
        smoothing_m=smoothing_m,
        repairs=(*cliffs, *hump_repairs(cuts)),
    )


def _between_steps(points: Points, nodes: Array, step_m: float) -> tuple[Points, HeightModel]:
    points = at_changes(points, step_m)
    prior = AT_CHANGES._replace(median=AT_CHANGES.median._replace(white_m=step_m))
    return points, fit_model(*points, nodes, prior)[0]


def _wrapped(points: Points, grid: Array) -> tuple[Array, Points]:
    """A closed course with some of its end before its start and some of its start after its end."""
    length = float(grid[-1] - grid[0])
    cell = length / (len(grid) - 1)
    count = min(int(WRAP_M / cell), len(grid) - 2)
    nodes = np.concatenate([grid[-1 - count : -1] - length, grid, grid[1 : 1 + count] + length])
    drift = points.height_m[-1] - points.height_m[0]
    level = points.height_m - drift * (points.at_m - grid[0]) / length
    at = np.concatenate([points.at_m - length, points.at_m, points.at_m + length])
    inside = (at >= nodes[0]) & (at <= nodes[-1])
    return nodes, Points(at[inside], np.tile(level, 3)[inside], np.tile(points.weight, 3)[inside])


def _within(repairs: tuple[Repair, ...], grid: Array) -> tuple[Repair, ...]:
    low, high = float(grid[0]) / 1000, float(grid[-1]) / 1000
    return tuple(repair for repair in repairs if low <= repair.from_km and repair.to_km <= high)
