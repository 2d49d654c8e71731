"""What recorded heights are made of: a road, an error that wanders along it, and white noise.

The road's slope changes at random from cell to cell (penalised second differences); the wandering
error forgets over a length (a terrain grid's cells, a receiver's minutes). Every matrix is banded,
so time and memory grow with the number of nodes.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cho_solve_banded, cholesky_banded, solve_banded
from scipy.optimize import minimize

Array = NDArray[np.float64]

LONGEST_FIT_NODES = 3200
WINDOW_NODES = 200
TRACE = 1e-30
"""Keeps what decays far from any point out of the slow denormal numbers."""
SMALLEST, LARGEST = (0.01, 0.01, 1.0, 0.03), (10.0, 60.0, 400.0, 30.0)


class HeightModel(NamedTuple):
    """Standard deviations of the parts of a height.

    ``bend_pct`` is how much the gradient changes from one 10 m cell to the next (points of %),
    ``error_m`` and ``error_length_m`` describe the wandering error, ``white_m`` the white noise.
    """

    bend_pct: float
    error_m: float
    error_length_m: float
    white_m: float


class Prior(NamedTuple):
    """Median of each part before the heights are seen, and the spread of its logarithm.

    A spread of 0 holds the part at its median; ``error_m`` 0 leaves the wandering error out.
    """

    median: HeightModel
    spread: HeightModel


@dataclass(frozen=True)
class Sums:
    """Weighted sums over points, per node (N+1,): what fitting a chain of straight cells needs.

    The nodes may be those of several ``windows`` of one size, one after the other.
    """

    step_m: float
    diagonal: Array
    beside: Array
    moment: Array
    square: float
    count: int
    windows: int = 1

    @property
    def nodes(self) -> int:
        """Number of nodes."""
        return len(self.diagonal)


def sums_of(at_m: Array, height_m: Array, weight: Array, grid_m: Array) -> Sums:
    """Sums for points (M,) of given weight on uniform nodes (N+1,)."""
    count = len(grid_m)
    step = (grid_m[-1] - grid_m[0]) / (count - 1)
    place = np.clip((at_m - grid_m[0]) / step, 0.0, count - 1)
    cell = np.minimum(place.astype(int), count - 2)
    right = place - cell
    left = 1.0 - right

    def total(values_left: Array, values_right: Array) -> Array:
        at_left = np.bincount(cell, values_left, count)
        return np.asarray(at_left + np.bincount(cell + 1, values_right, count))

    return Sums(
        step_m=float(step),
        diagonal=total(weight * left**2, weight * right**2),
        beside=np.asarray(np.bincount(cell, weight * left * right, count)[:-1]),
        moment=total(weight * left * height_m, weight * right * height_m),
        square=float(np.sum(weight * height_m**2)),
        count=len(at_m),
    )


def second_difference_bands(nodes: int) -> Array:
    """Lower bands (3, N+1) of the sum of squared second differences."""
    bands = np.zeros((3, nodes))
    inner = max(nodes - 2, 0)
    for row, first in enumerate((1.0, -2.0, 1.0)):
        for other, second in enumerate((1.0, -2.0, 1.0)[: row + 1]):
            bands[row - other, other : other + inner] += first * second
    return bands


def _wandering_bands(nodes: int, keep: float) -> tuple[Array, float]:
    """Precision bands (3, N+1) and its log determinant of an error of unit standard deviation.

    A smooth second-order wander with the double root ``keep`` per cell.
    """
    first, second = 2 * keep, -(keep**2)
    kick = (1 + second) * ((1 - second) ** 2 - first**2) / (1 - second)
    bands = np.zeros((3, nodes))
    terms = (-second, -first, 1.0)
    for row in range(3):
        for other in range(row + 1):
            bands[row - other, other : other + nodes - 2] += terms[row] * terms[other] / kick
    near = first / (1 - second)
    bands[0, :2] += 1 / (1 - near**2)
    bands[1, 0] -= near / (1 - near**2)
    return bands, float(-(nodes - 2) * np.log(kick) - np.log(1 - near**2))


def _system(
    sums: Sums, model: HeightModel, local: Array | None = None
) -> tuple[Array, Array, float]:
    """Bands, right side and constant of the posterior of road (and error) at the nodes.

    With a wandering error, road and error of a node stand side by side in the unknowns.
    """
    tight = 1 / model.white_m**2
    diagonal, beside, moment = sums.diagonal * tight, sums.beside * tight, sums.moment * tight
    size = sums.nodes // sums.windows
    bend = (model.bend_pct / 100 * sums.step_m * np.sqrt(sums.step_m / 10)) ** 2
    road = np.tile(second_difference_bands(size) / bend, sums.windows)
    constant = sums.count * np.log(model.white_m) + sums.windows * (size - 2) / 2 * np.log(bend)
    if model.error_m == 0:
        road[0] += diagonal
        road[1, :-1] += beside
        return road, moment, float(constant)
    keep = float(np.exp(-sums.step_m / model.error_length_m))
    error, log_determinant = _wandering_bands(size, keep)
    error = np.tile(error / model.error_m**2, sums.windows)
    if local is not None:
        for offset in range(3):
            error[offset, : sums.nodes - offset] /= local[offset:] * local[: sums.nodes - offset]
    constant += sums.nodes * np.log(model.error_m) - sums.windows * log_determinant / 2
    bands = np.zeros((5, 2 * sums.nodes))
    bands[0, 0::2], bands[0, 1::2] = road[0] + diagonal, error[0] + diagonal
    bands[1, 0::2], bands[1, 1:-1:2] = diagonal + TRACE, beside
    bands[2, 0:-2:2], bands[2, 1:-2:2] = road[1, :-1] + beside, error[1, :-1] + beside
    bands[3, 0:-2:2] = beside
    bands[4, 0:-4:2], bands[4, 1:-4:2] = road[2, :-2], error[2, :-2]
    return bands, np.repeat(moment, 2) + TRACE, float(constant)


def _cost(sums: Sums, model: HeightModel) -> float:
    """Minus the log of the marginal likelihood, constants of the data left out.

    Source: wahba-1985, the marginal likelihood of a smoothing spline, with a second error.
    """
    bands, moment, constant = _system(sums, model)
    try:
        factor = cholesky_banded(bands, lower=True, overwrite_ab=True, check_finite=False)
    except np.linalg.LinAlgError:
        return 1e12
    fit = cho_solve_banded((factor, True), moment, check_finite=False)
    misfit = sums.square / model.white_m**2 - float(np.sum(moment * fit))
    return misfit / 2 + float(np.log(factor[0]).sum()) + constant


def fit_model(
    at_m: Array, height_m: Array, weight: Array, grid_m: Array, prior: Prior
) -> tuple[HeightModel, float]:
    """The most likely model under a prior, and its cost (lower is likelier).

    Long courses are judged on windows all along, so that the time stays bounded.
    """
    sums = _sampled(at_m, height_m, weight, grid_m)
    median, spread = np.array(prior.median), np.array(prior.spread)
    free = spread > 0
    start = np.log(median[free])
    low, high = np.log(np.array(SMALLEST)[free]), np.log(np.array(LARGEST)[free])

    def model_at(logs: Array) -> HeightModel:
        values = median.copy()
        values[free] = np.exp(np.clip(logs, low, high))
        return HeightModel(*(float(value) for value in values))

    def cost(logs: Array) -> float:
        model = model_at(logs)
        away = float(np.sum(((logs - start) / spread[free]) ** 2)) / 2
        return _cost(sums, model) + away

    simplex = start + np.vstack([np.zeros(len(start)), 0.5 * np.eye(len(start))])
    found = minimize(
        cost,
        start,
        method="Nelder-Mead",
        options={"xatol": 0.1, "fatol": 0.3, "maxfev": 150, "initial_simplex": simplex},
    )
    return model_at(found.x), float(found.fun)


def _sampled(at_m: Array, height_m: Array, weight: Array, grid_m: Array) -> Sums:
    """Sums for the whole course, or for windows spread evenly along a long one."""
    nodes = len(grid_m)
    if nodes <= LONGEST_FIT_NODES:
        return sums_of(at_m, height_m, weight, grid_m)
    parts = []
    for start in np.linspace(0, nodes - WINDOW_NODES, LONGEST_FIT_NODES // WINDOW_NODES):
        part = grid_m[int(start) : int(start) + WINDOW_NODES]
        inside = slice(*np.searchsorted(at_m, [part[0], part[-1]]))
        if len(at_m[inside]) >= 5:
            parts.append(sums_of(at_m[inside], height_m[inside], weight[inside], part))
    if not parts:
        return sums_of(at_m, height_m, weight, grid_m)
    return Sums(
        step_m=parts[0].step_m,
        diagonal=np.concatenate([part.diagonal for part in parts]),
        beside=np.concatenate([np.append(part.beside, 0.0) for part in parts])[:-1],
        moment=np.concatenate([part.moment for part in parts]),
        square=sum(part.square for part in parts),
        count=sum(part.count for part in parts),
        windows=len(parts),
    )


def road_heights(
    sums: Sums, model: HeightModel, draws: int, local: Array | None = None
) -> tuple[Array, Array]:
    """The likeliest road at the nodes (N+1,) and random departures from it (draws, N+1).

    The departures have the spread that the points leave open; they are the same in every call.
    ``local`` (N+1,) multiplies the wandering error where the land is rougher or smoother.
    """
    bands, moment, _ = _system(sums, model, local)
    factor = cholesky_banded(bands, lower=True, check_finite=False)
    fit = cho_solve_banded((factor, True), moment, check_finite=False)
    upper = np.zeros_like(factor)
    width = len(factor) - 1
    for row in range(width + 1):
        upper[width - row, row:] = factor[row, : factor.shape[1] - row]
    kicks = np.random.default_rng(0).normal(size=(len(fit), draws))
    departures = solve_banded((0, width), upper, kicks, check_finite=False).T
    every = 1 if model.error_m == 0 else 2
    return np.asarray(fit[::every]), np.asarray(departures[:, ::every])
