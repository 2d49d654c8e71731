"""How far smoothed heights may be from the road's, and how strongly they are smoothed."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solveh_banded

from pacing.course.height_model import HeightModel, Sums, second_difference_bands
from pacing.course.height_source import (
    RECORDED,
    STEPPED,
    TERRAIN_GRID,
    Judged,
)

Array = NDArray[np.float64]

OVER_M = 100.0
LESS_WHITE, LESS_FINE, LESS_COARSE, LESS_STEPPED = 0.75, 0.6, 0.5, 0.45
COARSE_LENGTH_M = 28.0
MORE_FINE, MORE_COARSE, MORE_AT_CHANGES = 1.08, 1.25, 0.85
"""True over expected error, on the tuning seeds: terrain errors are not quite the model's."""
DRIFT_PCT = 0.1
"""Gradient error by drift over 100 m at 10 m/s; a barometer's typical size, no source."""
LAG_S = 1.1
"""Half of what barometers lag, as they may or may not; common practice, no source."""


def lessened(model: HeightModel, source: str) -> HeightModel:
    """The model with smaller errors, for smoothing.

    The likeliest road is smoother than any road, so that climbing and time come out too small.
    Smoothing as if the errors were less gives the road back its own unevenness, at no cost in the
    error of the gradient. The factors were chosen on the tuning seeds of the truth table.
    """
    if source == STEPPED:
        share = LESS_STEPPED
    elif model.error_m == 0:
        share = LESS_WHITE
    else:
        share = LESS_COARSE if model.error_length_m > COARSE_LENGTH_M else LESS_FINE
    return model._replace(error_m=share * model.error_m, white_m=share * model.white_m)


def fixed_smoothing(sums: Sums, smoothing_m: float) -> Array:
    """Heights (N+1,) smoothed so that a hump of ``smoothing_m`` is halved, whatever the noise."""
    density = float(np.mean(sums.diagonal)) + 2 * float(np.mean(sums.beside))
    weight = density * (smoothing_m / np.pi / sums.step_m) ** 4
    bands = second_difference_bands(sums.nodes) * weight
    bands[0] += sums.diagonal + 1e-9 * density
    bands[1, :-1] += sums.beside
    return np.asarray(solveh_banded(bands, sums.moment, lower=True))


def gradients_pct(height_m: Array, step_m: float) -> Array:
    """Gradient [%] over about 100 m from every node on; the last axis is along the road."""
    cells = min(max(round(OVER_M / step_m), 1), height_m.shape[-1] - 1)
    rise = height_m[..., cells:] - height_m[..., :-cells]
    return np.asarray(100 * rise / (cells * step_m))


def stated_error_pct(
    road_m: Array, departures_m: Array, model: HeightModel, judged: Judged, step_m: float
) -> float:
    """Expected root mean square error of the gradient over 100 m, in points of %.

    What the points leave open; for a barometer also drift and lag, which no point shows, at the
    speed that the gradient allows.
    """
    left_open = float(np.sqrt(np.mean(gradients_pct(departures_m, step_m) ** 2)))
    if judged.source == TERRAIN_GRID or (judged.source == RECORDED and model.error_m > 0.5):
        return left_open * (MORE_COARSE if model.error_length_m > COARSE_LENGTH_M else MORE_FINE)
    gradient = gradients_pct(road_m, step_m)
    if judged.source == STEPPED or judged.sensor != "barometer" or gradient.size < 2:
        return left_open
    speed = np.clip(11.0 - 1.1 * gradient, 3.5, 17.0)
    late = LAG_S * speed[1:] * np.diff(gradient) / step_m
    drift = DRIFT_PCT * np.sqrt(10.0 / speed)
    return float(np.sqrt(left_open**2 + np.mean(drift**2) + np.mean(late**2)))


def halved_m(model: HeightModel, spacing_m: float, step_m: float) -> float:
    """Length [m] of the hump of which the smoother leaves half: where road and error are even."""
    length = np.geomspace(2 * step_m, 1e5, 400)
    turn = np.pi * step_m / length
    bend = (model.bend_pct / 100 * step_m) ** 2 * step_m / 10
    road = bend / (2 - 2 * np.cos(turn)) ** 2
    keep = np.exp(-step_m / model.error_length_m)
    first, second = 2 * keep, -(keep**2)
    kick = (1 + second) * ((1 - second) ** 2 - first**2) / (1 - second)
    wander = model.error_m**2 * kick / np.abs(1 - keep * np.exp(-1j * turn)) ** 4
    noise = wander + model.white_m**2 * spacing_m / step_m
    even = np.flatnonzero(road >= noise)
    return float(length[even[0]]) if len(even) else float(length[-1])
