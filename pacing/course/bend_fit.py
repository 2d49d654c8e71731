"""Fit of a straight, an arc and a straight to the points at a bend, for all bends at once."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.course.line import Line, chord_headings_rad

Array = NDArray[np.float64]

# Where points are clean they still follow the middle of the road or the rider's track only so far.
_LEAST_NOISE_M = 0.15
_NOISE_SHARE = 0.05
_MOST_HIDDEN_NOISE_M = 1.5
_ROUNDS = 12
_TIGHTEST_M = 2.0
# Weak prior: the fit stays within some of the first guess (heading rad, logarithm of the radius).
_HEADING_PRIOR = 0.6
_RADIUS_PRIOR = 1.2


def likely_noise_m(line: Line, spacing_m: Array | float) -> Array:
    """Noise to reckon with: of points far apart it cannot be judged from the points."""
    least = np.clip(_NOISE_SHARE * np.asarray(spacing_m), _LEAST_NOISE_M, _MOST_HIDDEN_NOISE_M)
    return np.asarray(np.maximum(line.position_noise_m, least))


class Corner(NamedTuple):
    """First guess of a bend: the knots that show it, its ends and the headings there."""

    knots: slice
    from_m: float
    to_m: float
    heading_from_rad: float
    heading_to_rad: float


class CornerFit(NamedTuple):
    """A fitted bend; ``turn_rad`` positive to the right; errors are standard deviations."""

    radius_m: float
    turn_rad: float
    turn_error_rad: float
    radius_error_share: float
    spacing_m: float
    misfit_m: float


class _Batch(NamedTuple):
    """Points of B bends in their own planes, turned so that every bend goes to the left.

    ``x``, ``y``, ``used`` and ``way`` (heading of the smooth line) are (B, N).
    """

    x: Array
    y: Array
    used: Array
    way: Array
    side: Array
    spacing: Array


def fit_corners(line: Line, corners: list[Corner]) -> list[CornerFit]:
    """Least-squares fit of every corner to the points as given, by damped Gauss-Newton steps."""
    if not corners:
        return []
    batch = _batch(line, corners)
    guess = _first_guess(line, corners, batch)
    state = guess.copy()
    damping = np.full(len(corners), 1e-2)
    cost = _cost(batch, state, guess)
    for _ in range(_ROUNDS):
        rest, slopes = _residuals(batch, state)
        step = _step(rest, slopes, state - guess, damping)
        tried = state + step
        new = _cost(batch, tried, guess)
        better = new < cost
        state = np.where(better[:, None], tried, state)
        cost = np.where(better, new, cost)
        damping = np.where(better, damping * 0.3, damping * 8.0)
    return _results(line, batch, state)


def _batch(line: Line, corners: list[Corner]) -> _Batch:
    heading = _knot_headings(line)
    most = max(corner.knots.stop - corner.knots.start for corner in corners)
    count = len(corners)
    x, y = np.zeros((count, most)), np.zeros((count, most))
    used, way = np.zeros((count, most)), np.zeros((count, most))
    side, spacing = np.empty(count), np.empty(count)
    for i, corner in enumerate(corners):
        points = line.knot_raw_m[corner.knots]
        origin = points[len(points) // 2]
        east, north = _plane(origin)
        n = len(points)
        side[i] = np.sign(corner.heading_to_rad - corner.heading_from_rad)
        # Left-hand axes with the heading's angle: x north, y east, mirrored for a right bend.
        x[i, :n] = (points - origin) @ north
        y[i, :n] = side[i] * ((points - origin) @ east)
        way[i, :n] = side[i] * heading[corner.knots]
        used[i, :n] = 1.0
        spacing[i] = _spacing(line, corner)
    return _Batch(x, y, used, way, side, spacing)


def _spacing(line: Line, corner: Corner) -> float:
    """Distance between the points within the bend, and the nearer one beyond it (mean square)."""
    at = line.knot_distance_m
    first = min(int(np.searchsorted(at, corner.from_m)), at.size - 1)
    last = max(int(np.searchsorted(at, corner.to_m, side="right")) - 1, first)
    chord = np.diff(at)
    beyond = [chord[k] for k in (first - 1, last) if 0 <= k < chord.size]
    inside = np.concatenate((chord[first:last], [min(beyond)]))
    return float(np.sqrt(np.mean(inside**2)))


def _knot_headings(line: Line) -> Array:
    chord = chord_headings_rad(line)
    return np.concatenate((chord[:1], (chord[1:] + chord[:-1]) / 2, chord[-1:]))


def _plane(origin: Array) -> tuple[Array, Array]:
    """Unit vectors to the east and to the north at a place."""
    up = origin / np.linalg.norm(origin)
    flat = np.hypot(up[0], up[1])
    east = np.array([-up[1], up[0], 0.0]) / flat
    return east, np.cross(up, east)


def _first_guess(line: Line, corners: list[Corner], batch: _Batch) -> Array:
    """State (B, 5): centre x and y, log radius, headings before and after."""
    before = batch.side * np.array([corner.heading_from_rad for corner in corners])
    after = batch.side * np.array([corner.heading_to_rad for corner in corners])
    length = np.array([corner.to_m - corner.from_m for corner in corners])
    radius = np.maximum(length / np.maximum(after - before, 0.1), _TIGHTEST_M)
    middle = np.array([(corner.to_m + corner.from_m) / 2 for corner in corners])
    apex_x, apex_y = np.empty(len(corners)), np.empty(len(corners))
    for i, corner in enumerate(corners):
        at = line.knot_distance_m[corner.knots]
        n = at.size
        apex_x[i] = np.interp(middle[i], at, batch.x[i, :n])
        apex_y[i] = np.interp(middle[i], at, batch.y[i, :n])
    mean = (before + after) / 2
    # y positive is to the left of x once mirrored: headings grow towards the bend's inside.
    return np.stack(
        [
            apex_x - radius * np.sin(mean),
            apex_y + radius * np.cos(mean),
            np.log(radius),
            before,
            after,
        ],
        axis=1,
    )


def _residuals(batch: _Batch, state: Array) -> tuple[Array, Array]:
    """Distance of the points from the fit (B, N), outward, and its slopes (B, N, 5)."""
    cx, cy, log_radius, before, after = (state[:, k : k + 1] for k in range(5))
    radius = np.exp(log_radius)
    dx, dy = batch.x - cx, batch.y - cy
    far = np.maximum(np.hypot(dx, dy), 1e-6)
    # Heading of the circle at the point, as near to the smooth line's as whole turns allow.
    along = np.arctan2(dx, -dy)
    near = np.clip(batch.way, before, after)
    along += 2 * np.pi * np.round((near - along) / (2 * np.pi))
    first, last = along < before, along > after
    straight = first | last
    way = np.where(first, before, after)
    nx = np.where(straight, np.sin(way), dx / far)
    ny = np.where(straight, -np.cos(way), dy / far)
    rest = (nx * dx + ny * dy - radius) * batch.used
    turn = np.cos(way) * dx + np.sin(way) * dy
    slopes = np.stack(
        [
            -nx,
            -ny,
            np.broadcast_to(-radius, nx.shape),
            np.where(first, turn, 0.0),
            np.where(last, turn, 0.0),
        ],
        axis=2,
    )
    return rest, slopes * batch.used[:, :, None]


_PRIOR = np.array([0.0, 0.0, 1 / _RADIUS_PRIOR**2, 1 / _HEADING_PRIOR**2, 1 / _HEADING_PRIOR**2])


def _cost(batch: _Batch, state: Array, guess: Array) -> Array:
    rest, _ = _residuals(batch, state)
    valid = (state[:, 4] > state[:, 3]) & (state[:, 2] < 7.0)
    cost = np.sum(rest**2, axis=1) + np.sum(_PRIOR * (state - guess) ** 2, axis=1)
    return np.where(valid, cost, np.inf)


def _step(rest: Array, slopes: Array, moved: Array, damping: Array) -> Array:
    normal = np.einsum("bni,bnj->bij", slopes, slopes) + np.diag(_PRIOR)
    diagonal = np.einsum("bii->bi", normal)
    normal = normal + (damping[:, None] * diagonal + 1e-9)[:, :, None] * np.eye(5)
    right = -np.einsum("bni,bn->bi", slopes, rest) - _PRIOR * moved
    return np.asarray(np.linalg.solve(normal, right[:, :, None])[:, :, 0])


def _spread(slopes: Array, noise: Array) -> Array:
    """Covariance (B, 5, 5) of the state for given noise (B,) of the points."""
    normal = np.einsum("bni,bnj->bij", slopes, slopes) / (noise**2)[:, None, None]
    return np.asarray(np.linalg.inv(normal + np.diag(_PRIOR) + 1e-12 * np.eye(5)))


def _results(line: Line, batch: _Batch, state: Array) -> list[CornerFit]:
    rest, slopes = _residuals(batch, state)
    radius = np.exp(state[:, 2])
    turn = state[:, 4] - state[:, 3]
    count = batch.used.sum(axis=1)
    misfit = np.sqrt(np.sum(rest**2, axis=1) / count)
    spread = np.sqrt(np.sum(rest**2, axis=1) / np.maximum(count - 5, 1))
    # Between points the road may bulge by what an arc does, and that is not known.
    hidden = np.minimum(batch.spacing**2 / (8 * radius), batch.spacing / 2)
    noise = np.maximum(likely_noise_m(line, batch.spacing), spread)
    spread_of_turn = _spread(slopes, noise)
    turn_error = np.sqrt(
        spread_of_turn[:, 3, 3] + spread_of_turn[:, 4, 4] - 2 * spread_of_turn[:, 3, 4]
    )
    radius_error = np.sqrt(_spread(slopes, np.hypot(noise, hidden))[:, 2, 2])
    return [
        CornerFit(
            radius_m=float(radius[i]),
            turn_rad=float(batch.side[i] * turn[i]),
            turn_error_rad=float(turn_error[i]),
            radius_error_share=float(radius_error[i]),
            spacing_m=float(batch.spacing[i]),
            misfit_m=float(misfit[i]),
        )
        for i in range(state.shape[0])
    ]
