"""How far smoothed heights may be from the road's, and how strongly they are smoothed."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solveh_banded

from pacing.course.height_model import HeightModel, Sums, second_difference_bands
from pacing.course.height_source import TERRAIN_GRID, Judged

Array = NDArray[np.float64]

OVER_M = 100.0
FINE_FACTOR, COARSE_FACTOR = 1.0, 1.0
COARSE_LENGTH_M = 28.0
DRIFT_PCT = 0.0
LAG_M = 0.0


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
    """Expected root mean square error of the gradient over 100 m, in points of %."""
    left_open = float(np.sqrt(np.mean(gradients_pct(departures_m, step_m) ** 2)))
    if judged.source == TERRAIN_GRID:
        coarse = model.error_length_m > COARSE_LENGTH_M
        return left_open * (COARSE_FACTOR if coarse else FINE_FACTOR)
    if judged.sensor != "barometer":
        return left_open
    change = np.diff(gradients_pct(road_m, step_m)) / step_m
    late = LAG_M * float(np.sqrt(np.mean(change**2))) if len(change) else 0.0
    return float(np.sqrt(left_open**2 + DRIFT_PCT**2 + late**2))


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
