"""Where heights come from: a recorder, a terrain grid or whole steps, judged from the heights."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.course.height_model import HeightModel, Prior, fit_model
from pacing.course.height_steps import COARSE_M, HAND_HELD_STEP_M, Points

Array = NDArray[np.float64]

RECORDED, TERRAIN_GRID, STEPPED = "recorded", "terrain grid", "stepped"
SOURCES_OF_HEIGHT = (RECORDED, TERRAIN_GRID, STEPPED)

CLEAR_GAIN = 6.0
"""How much likelier (log) a wandering error must make the heights to be believed."""
GRID_ERROR_M = 0.4
CLEAN_M = 0.12
BAROMETER_M = 0.35
SPARSE_M = 80.0
NO_ROAD_BEND_PCT = 2.0
RECORDER_STEPS_M = (0.2, HAND_HELD_STEP_M, 0.5)

WHITE = Prior(HeightModel(0.3, 0.0, 15.0, 0.5), HeightModel(0.7, 0.0, 0.0, 1.5))
FINE_GRID = Prior(HeightModel(0.3, 2.0, 15.0, 0.2), HeightModel(0.5, 1.0, 0.1, 0.7))
COARSE_GRID = Prior(HeightModel(0.3, 2.0, 45.0, 0.2), HeightModel(0.5, 1.0, 0.05, 0.7))
MOST_BEND_PCT = 0.8
"""Coarse grids leave open how fast the gradient changes: no faster than a mountain road's."""
AT_CHANGES = Prior(HeightModel(0.5, 0.0, 15.0, 1.0), HeightModel(0.5, 0.0, 0.0, 0.0))
"""For heights at the changes between steps, in steps: their noise is known."""


class Judged(NamedTuple):
    """The source of heights, the model that fits them best, and why."""

    source: str
    model: HeightModel
    sensor: str
    reason: str


def judge_source(
    points: Points, grid_m: Array, *, step_m: float | None, held: bool, timed: bool
) -> Judged:
    """The likeliest source of heights.

    ``step_m`` is the step they are rounded to, ``held`` whether many repeat without being rounded,
    ``timed`` whether the points carry times: planned routes seldom do.
    """
    white, white_cost = fit_model(*points, grid_m, WHITE)
    grid, grid_cost = likelier_grid(points, grid_m)
    gain = white_cost - grid_cost
    wandering = gain > CLEAR_GAIN
    model = grid if wandering else white
    noise = float(np.hypot(model.error_m, model.white_m))
    if step_m is not None and step_m >= COARSE_M and (step_m >= 5 or noise < 0.6 * step_m):
        return Judged(STEPPED, model, "", f"all heights are whole steps of {step_m:g} m")
    if held:
        return Judged(TERRAIN_GRID, grid, "", "heights repeat until the next is read")
    if not timed and step_m in RECORDER_STEPS_M:
        return _recorded(points, grid_m, model, f"steps of {step_m:.2g} m, as recorders store")
    if not timed and _spacing_m(points) > SPARSE_M:
        return Judged(TERRAIN_GRID, grid, "", "no times, and points as far apart as a planner's")
    if not timed and white.bend_pct > NO_ROAD_BEND_PCT:
        return Judged(TERRAIN_GRID, grid, "", "no times, and bends that no road has")
    if wandering and not timed and model.error_m > GRID_ERROR_M:
        reason = f"no times, and errors of {model.error_m:.1f} m that wander along the road"
        return Judged(TERRAIN_GRID, grid, "", reason)
    if not timed and noise < CLEAN_M:
        return Judged(TERRAIN_GRID, grid, "", "no times and hardly any noise")
    reason = f"noise of {noise:.1f} m from point to point"
    return _recorded(points, grid_m, model, f"points with times, {reason}" if timed else reason)


def _recorded(points: Points, grid_m: Array, model: HeightModel, reason: str) -> Judged:
    """A recorder, by its noise a barometer or a satellite receiver.

    A receiver's heights wander over minutes, far longer than a grid's cells: the model with the
    longest error follows them least.
    """
    noise = float(np.hypot(model.error_m, model.white_m))
    if model.error_m > GRID_ERROR_M:
        model = _coarse(points, grid_m)[0]
    return Judged(RECORDED, model, "barometer" if noise < BAROMETER_M else "satellite", reason)


def _spacing_m(points: Points) -> float:
    return float(points.at_m[-1] - points.at_m[0]) / max(len(points.at_m) - 1, 1)


def as_told(points: Points, grid_m: Array, source: str) -> Judged:
    """The model for heights whose source the user has told."""
    reason = "as told"
    if source == TERRAIN_GRID:
        return Judged(source, likelier_grid(points, grid_m)[0], "", reason)
    white, white_cost = fit_model(*points, grid_m, WHITE)
    grid, grid_cost = likelier_grid(points, grid_m)
    model = grid if white_cost - grid_cost > CLEAR_GAIN else white
    return _recorded(points, grid_m, model, reason)._replace(source=source)


def likelier_grid(points: Points, grid_m: Array) -> tuple[HeightModel, float]:
    """The likelier of a fine (about 30 m) and a coarse (about 90 m) terrain grid, and its cost."""
    fine = fit_model(*points, grid_m, FINE_GRID)
    return min(fine, _coarse(points, grid_m), key=lambda fit: fit[1])


def _coarse(points: Points, grid_m: Array) -> tuple[HeightModel, float]:
    model, cost = fit_model(*points, grid_m, COARSE_GRID)
    return model._replace(bend_pct=min(model.bend_pct, MOST_BEND_PCT)), cost
