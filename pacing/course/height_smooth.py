"""From points to the smoothed road: cut, judge, weigh and smooth."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter1d

from pacing.course.course import Repair
from pacing.course.height_artefacts import STEEP, STEEP_RECORDED, Cut, cut_humps, hump_repairs
from pacing.course.height_error import (
    MORE_AT_CHANGES,
    fixed_smoothing,
    gradients_pct,
    halved_m,
    lessened,
    stated_error_pct,
)
from pacing.course.height_jumps import without_cliffs
from pacing.course.height_model import HeightModel, fit_model, road_heights, sums_of
from pacing.course.height_source import (
    AT_CHANGES,
    STEPPED,
    TERRAIN_GRID,
    Judged,
    as_told,
    judge_source,
)
from pacing.course.height_steps import Points, at_changes, flickers, without_held

Array = NDArray[np.float64]

DRAWS = 6
LOCAL_M = 1000.0
LOCAL_PRIOR = 0.5
SURE_STEP_M = 5.0
"""From this step on no noise matters beside the rounding."""


@dataclass(frozen=True)
class SmoothedHeights:
    """The road's heights at the nodes (N+1,), and how they were found."""

    road_m: Array
    judged: Judged
    noise_m: float
    gradient_error_pct: float
    smoothing_m: float
    repairs: tuple[Repair, ...]


def smooth_points(
    points: Points,
    nodes_m: Array,
    *,
    step_m: float | None,
    told: str | None,
    smoothing_m: float | None,
    timed: bool,
    spare: int = 0,
) -> SmoothedHeights:
    """Heights of the road at uniform nodes (N+1,) from points without spikes.

    ``step_m`` is the step that heights are rounded to, ``told`` their source as the user has it.
    The ``spare`` nodes at either end only show what stands there; no heights are given for them.
    """
    kept, judged, repairs = _judged(points, nodes_m, step_m=step_m, told=told, timed=timed)
    if spare:
        nodes_m = nodes_m[spare:-spare]
        kept = kept.chosen((kept.at_m >= nodes_m[0]) & (kept.at_m <= nodes_m[-1]))
    model, share = judged.model, 1.0
    noise = float(np.hypot(model.error_m, model.white_m))
    step = step_m or 1.0
    if judged.source == STEPPED and (step >= SURE_STEP_M or not flickers(kept)):
        kept, model = _between_steps(kept, nodes_m, step)
        noise, share = step / 12**0.5, MORE_AT_CHANGES
    sums = sums_of(*kept, nodes_m)
    local = None
    if judged.source == TERRAIN_GRID:
        local = roughness(kept, road_heights(sums, model, 0)[0], nodes_m)
    likeliest, departures = road_heights(sums, model, DRAWS, local)
    error = share * stated_error_pct(likeliest, departures, model, judged, sums.step_m)
    if smoothing_m is None:
        road, _ = road_heights(sums, lessened(model, judged.source), 0, local)
        spacing = float(nodes_m[-1] - nodes_m[0]) / max(len(kept.at_m), 1)
        smoothing_m = halved_m(model, spacing, sums.step_m)
    else:
        road = fixed_smoothing(sums, smoothing_m)
        away = gradients_pct(road - likeliest, sums.step_m)
        error = float(np.hypot(error, np.sqrt(np.mean(away**2))))
    return SmoothedHeights(road, judged, noise, error, smoothing_m, repairs)


def roughness(points: Points, road_m: Array, nodes_m: Array) -> Array:
    """How large the errors of a terrain grid are at the nodes (N+1,) beside their mean.

    A grid errs more on steep land than on a plain: by the departures of the points within
    LOCAL_M, drawn half way to the mean.
    """
    step = float(nodes_m[1] - nodes_m[0])
    off = points.height_m - np.interp(points.at_m, nodes_m, road_m)
    square = np.interp(nodes_m, points.at_m, off**2)
    around = gaussian_filter1d(square, LOCAL_M / step, mode="reflect")
    mean = max(float(square.mean()), 1e-6)
    return np.asarray(np.sqrt((around + LOCAL_PRIOR * mean) / ((1 + LOCAL_PRIOR) * mean)))


def _judged(
    points: Points, nodes_m: Array, *, step_m: float | None, told: str | None, timed: bool
) -> tuple[Points, Judged, tuple[Repair, ...]]:
    """The points that are left when what no road does is cut, and where they come from.

    Recorded heights are cut only where a barometer has failed: a rider has been on those slopes.
    """
    read = without_held(points, step_m)
    held = len(read.at_m) < len(points.at_m)
    keep, cuts = cut_humps(read, nodes_m, STEEP)
    kept = read.chosen(keep)
    if told is None:
        judged = judge_source(kept, nodes_m, step_m=step_m, held=held, timed=timed)
    else:
        judged = as_told(kept, nodes_m, told)
    if judged.source == TERRAIN_GRID:
        return kept, judged, hump_repairs(cuts)
    read, cliffs = without_cliffs(read, step_m)
    none: list[Cut] = []
    keep, cuts = (
        (np.ones_like(keep), none)
        if judged.source == STEPPED
        else cut_humps(read, nodes_m, STEEP_RECORDED)
    )
    kept = read.chosen(keep)
    if cliffs:
        judged = judged._replace(model=as_told(kept, nodes_m, judged.source).model)
    return kept, judged, (*cliffs, *hump_repairs(cuts))


def _between_steps(points: Points, nodes_m: Array, step_m: float) -> tuple[Points, HeightModel]:
    """The points as the changes between steps tell them, and the likeliest road for those."""
    points = at_changes(points, step_m)
    prior = AT_CHANGES._replace(median=AT_CHANGES.median._replace(white_m=step_m))
    return points, fit_model(*points, nodes_m, prior)[0]
