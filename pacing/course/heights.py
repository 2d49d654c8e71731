"""From recorded heights to the height of the road at every node of the grid."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cho_solve_banded, cholesky_banded
from scipy.optimize import minimize_scalar

from pacing.course.course import Repair

Array = NDArray[np.float64]


@dataclass(frozen=True)
class HeightProfile:
    """Smoothed heights ``elevation_m`` (N+1,) at the nodes ``distance_m`` (N+1,).

    ``noise_m`` is the standard deviation of what was taken off, ``gradient_error_pct`` the expected
    error of the gradient over 100 m, ``smoothing_m`` the length of hump that is halved.
    """

    distance_m: Array
    elevation_m: Array
    source: str
    noise_m: float
    gradient_error_pct: float
    smoothing_m: float
    repairs: tuple[Repair, ...] = ()


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
    point. ``source`` is None (judged from the file) or one of ``recorded``, ``terrain grid``,
    ``stepped``; ``timed`` tells that the points carry time stamps; ``closed`` joins the finish to
    the start. Missing heights are bridged; the rise from start to finish is kept.
    """
    known = np.isfinite(elevation_m)
    at, height = distance_m[known], elevation_m[known]
    normal, moment = _normal_equations(at, height, grid)
    penalty = _second_difference_penalty(len(grid))
    step = float(grid[1] - grid[0])
    if smoothing_m is None:
        weight = _likeliest_weight(normal, moment, penalty, height)
    else:
        weight = (smoothing_m / np.pi / step) ** 4 * len(height) / len(grid)
    factor = cholesky_banded(normal + weight * penalty, lower=True)
    smooth = cho_solve_banded((factor, True), moment)
    residual = height - np.interp(at, grid, smooth)
    noise = float(np.sqrt(np.mean(residual**2)))
    ends = np.interp(grid[[0, -1]], at, height)
    drift = ends - smooth[[0, -1]]
    smooth = smooth + drift[0] + (drift[1] - drift[0]) * (grid - grid[0]) / (grid[-1] - grid[0])
    length = np.pi * step * (weight * len(grid) / len(height)) ** 0.25
    return HeightProfile(
        distance_m=grid,
        elevation_m=smooth,
        source=source or "recorded",
        noise_m=noise,
        gradient_error_pct=100 * noise / max(length, step),
        smoothing_m=float(length),
    )


def _normal_equations(at: Array, height: Array, grid: Array) -> tuple[Array, Array]:
    """Bands (3, N+1) and right side of the fit of a chain of straight cells to the points."""
    step = (grid[-1] - grid[0]) / (len(grid) - 1)
    place = np.clip((at - grid[0]) / step, 0.0, len(grid) - 1)
    cell = np.minimum(place.astype(int), len(grid) - 2)
    share = place - cell
    count = len(grid)
    bands = np.zeros((3, count))
    bands[0] = np.bincount(cell, (1 - share) ** 2, count) + np.bincount(cell + 1, share**2, count)
    bands[1] = np.bincount(cell, share * (1 - share), count)
    moment = np.bincount(cell, (1 - share) * height, count)
    moment += np.bincount(cell + 1, share * height, count)
    return bands, np.asarray(moment, dtype=np.float64)


def _second_difference_penalty(count: int) -> Array:
    """Lower bands (3, N) of the sum of squared second differences, with a trace of a ridge."""
    bands = np.zeros((3, count))
    if count > 2:
        bands[0, :-2] += 1.0
        bands[0, 1:-1] += 4.0
        bands[0, 2:] += 1.0
        bands[1, :-2] -= 2.0
        bands[1, 1:-1] -= 2.0
        bands[2, :-2] += 1.0
    bands[0] += 1e-12
    return bands


def _likeliest_weight(normal: Array, moment: Array, penalty: Array, height: Array) -> float:
    """Weight of the penalty with the highest marginal likelihood of the heights."""
    total = float(height @ height)
    freedom = max(len(height) - 2, 1)
    order = max(normal.shape[1] - 2, 1)

    def cost(log_weight: float) -> float:
        factor = cholesky_banded(normal + np.exp(log_weight) * penalty, lower=True)
        fit = cho_solve_banded((factor, True), moment)
        misfit = max(total - float(moment @ fit), 1e-9)
        return float(freedom * np.log(misfit) + 2 * np.sum(np.log(factor[0])) - order * log_weight)

    found = minimize_scalar(cost, bounds=(-2.0, 16.0), method="bounded", options={"xatol": 0.05})
    return float(np.exp(found.x))
