"""The noise in a line of points, judged from the points, and the places without it."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import LinAlgError, cho_solve_banded, cholesky_banded
from scipy.optimize import minimize_scalar

Array = NDArray[np.float64]

_ROUNDS = 6
# Degrees of freedom of the changes of direction. So few leave bends and corners alone; chosen for
# the true length of invented roads with 0.5 to 3 m of noise.
_TAIL = 1.0
# A corner is looked for over so much road to either side; it turns by a radian or so.
_CORNER_BASE_M = 40.0
_CORNER_AWAY = 0.6


class Smoothed(NamedTuple):
    """Smoothed places (K, 3) and the noise (standard deviation in each direction) removed."""

    place_m: Array
    noise_m: float


def smoothed_places(raw: Array, most_noise_m: float) -> Smoothed:
    """Places ``raw`` (K, 3) [m] without noise, by weighted penalised changes of direction.

    The weights belong to changes of direction with heavy tails (Student's t), found by expectation
    and maximisation: few where the road bends, hardly any at a corner.
    """
    if raw.shape[0] < 5 or most_noise_m < 0.02:
        return Smoothed(raw, 0.0)
    origin = raw.mean(axis=0)
    raw = raw - origin
    place, noise, likeliest = raw, 0.0, None
    weight = _first_weights(raw)
    for _ in range(_ROUNDS):
        step = np.linalg.norm(np.diff(place, axis=0), axis=1)
        step = np.maximum(step, 0.1 * np.median(step))
        change = _direction_change(step)
        bands = _normal_bands(change * np.sqrt(weight))
        likeliest = _likeliest_stiffness(raw, bands, likeliest)
        place, noise, stiffness = _penalised(raw, bands, likeliest, most_noise_m)
        weight = _weights(_apply(change, place), step, weight, stiffness, noise)
    return Smoothed(place + origin, noise)


def _first_weights(raw: Array) -> Array:
    """Weights (K-2,) to begin with: low where the direction differs much before and after.

    Without them a dead turn on a road that is straight but for it is rounded off, and a few rounds
    do not bring it back.
    """
    way = np.concatenate(([0.0], np.cumsum(np.linalg.norm(np.diff(raw, axis=0), axis=1))))
    knot = np.arange(1, raw.shape[0] - 1)
    before = np.minimum(np.searchsorted(way, way[knot] - _CORNER_BASE_M), knot - 1)
    after = np.searchsorted(way, way[knot] + _CORNER_BASE_M, side="right") - 1
    back, on = raw[knot] - raw[before], raw[np.maximum(after, knot + 1)] - raw[knot]
    size = np.linalg.norm(back, axis=1) * np.linalg.norm(on, axis=1)
    away = 1.0 - np.sum(back * on, axis=1) / np.maximum(size, 1e-9)
    return np.asarray(1.0 / (1.0 + (away / _CORNER_AWAY) ** 4))


def _direction_change(step: Array) -> Array:
    """Coefficients (3, K-2) of the change of direction over the root of the length it takes."""
    over = 1.0 / np.sqrt((step[1:] + step[:-1]) / 2)
    return np.stack([over / step[:-1], -over * (1 / step[:-1] + 1 / step[1:]), over / step[1:]])


def _apply(rows: Array, place: Array) -> Array:
    before, here, after = (row[:, None] for row in rows)
    return np.asarray(before * place[:-2] + here * place[1:-1] + after * place[2:])


def _weights(turn: Array, step: Array, weight: Array, stiffness: float, noise_m: float) -> Array:
    """Weights (K-2,) of the changes of direction: low where the road bends more than elsewhere."""
    if noise_m < 1e-4:
        return weight
    typical = noise_m**2 / stiffness
    length = ((step[1:] + step[:-1]) / 2) ** 3
    unknown = np.interp(np.log(stiffness * weight / length), _LOG_STIFF, _UNKNOWN) / weight
    level = np.sum(turn * turn, axis=1) / typical + unknown
    return np.asarray((_TAIL + 1.0) / (_TAIL + level))


def _unknown_share(log_stiffness: Array) -> Array:
    """Share of the prior variance of a change of direction that the points leave unknown.

    For evenly spaced points: the mean over all wavelengths of noise over noise and road.
    """
    wave = (2.0 - 2.0 * np.cos((np.arange(2000) + 0.5) * np.pi / 2000)) ** 2
    ratio = np.exp(log_stiffness)[:, None] * wave
    return np.asarray(np.mean(ratio / (1.0 + ratio), axis=1))


_LOG_STIFF = np.linspace(-20.0, 30.0, 101)
_UNKNOWN = _unknown_share(_LOG_STIFF)


def _normal_bands(rows: Array) -> Array:
    """Upper bands (3, K) of the matrix of the penalty."""
    count = rows.shape[1] + 2
    bands = np.zeros((3, count))
    bands[2, :-2] += rows[0] ** 2
    bands[2, 1:-1] += rows[1] ** 2
    bands[2, 2:] += rows[2] ** 2
    bands[1, 1:-1] += rows[0] * rows[1]
    bands[1, 2:] += rows[1] * rows[2]
    bands[0, 2:] += rows[0] * rows[2]
    return bands


def _solve(bands: Array, stiffness: float, raw: Array) -> tuple[Array, float]:
    """Smoothed places, and the log determinant of the system."""
    system = stiffness * bands
    system[2] += 1.0
    root = cholesky_banded(system, check_finite=False)
    return (
        cho_solve_banded((root, False), raw, check_finite=False),
        2.0 * float(np.sum(np.log(root[2]))),
    )


def _likeliest_stiffness(raw: Array, bands: Array, near: float | None) -> float:
    """Stiffness with the greatest restricted likelihood, looked for near a former one if given."""
    free = int(raw.shape[0]) - 2

    def unlikely(log_stiffness: float) -> float:
        try:
            place, log_determinant = _solve(bands, float(np.exp(log_stiffness)), raw)
        except LinAlgError:
            return np.inf
        left = max(float(np.sum(raw * (raw - place))), 1e-9)
        return free * (float(np.log(left)) - log_stiffness) + log_determinant

    if near is None:
        scale = -float(np.log(np.median(bands[2])))
        grid = [scale + np.log(10.0) * power for power in range(-3, 9)]
        best = grid[int(np.argmin([unlikely(at) for at in grid]))]
        reach = float(np.log(10.0))
    else:
        best, reach = float(np.log(near)), float(np.log(4.0))
    found = minimize_scalar(
        unlikely,
        bounds=(best - reach, best + reach),
        method="bounded",
        options={"xatol": 0.03},
    )
    return float(np.exp(found.x))


def _penalised(
    raw: Array, bands: Array, stiffness: float, most_noise_m: float
) -> tuple[Array, float, float]:
    """Smoothed places, their noise and the stiffness, lessened until the noise is possible."""
    for _ in range(30):
        place, _ = _solve(bands, stiffness, raw)
        noise = _noise_across(raw, place)
        if noise <= most_noise_m * 1.01:
            break
        stiffness *= max((most_noise_m / noise) ** 2, 1e-3)
    return place, noise, stiffness


def _noise_across(raw: Array, place: Array) -> float:
    """Standard deviation of the points across the line (along it, the step absorbs the noise)."""
    off = raw - place
    along = place[2:] - place[:-2]
    along /= np.maximum(np.linalg.norm(along, axis=1), 1e-9)[:, None]
    aside = off[1:-1] - np.sum(off[1:-1] * along, axis=1)[:, None] * along
    whole = float(np.sum(raw * off)) / max(float(np.sum(off * off)), 1e-12)
    return float(np.sqrt(np.sum(aside * aside) / (raw.shape[0] - 2) * max(whole, 1.0)))
