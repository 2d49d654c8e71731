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
_BATCH = 64
# Share of the bulge of an arc between two points that stays unknown; from arcs with clean points.
_HIDDEN = 0.4
# Errors of the radius of arcs with noise are so much larger than the theory of least squares says.
_TRUE_ERROR = 1.35
# A step astray is refused by its cost, not by an overflow; this is beyond any bend.
_STRAIGHTEST = 25.0
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
    apex_x: Array
    apex_y: Array


def fit_corners(line: Line, corners: list[Corner]) -> list[CornerFit]:
    """Least-squares fit of every corner to the points as given, by damped Gauss-Newton steps."""
    chord = chord_headings_rad(line)
    heading = np.concatenate((chord[:1], (chord[1:] + chord[:-1]) / 2, chord[-1:]))
    order = sorted(
        range(len(corners)), key=lambda i: corners[i].knots.stop - corners[i].knots.start
    )
    fits: dict[int, CornerFit] = {}
    # Alike many points together, so that little of a batch is empty.
    for first in range(0, len(order), _BATCH):
        part = order[first : first + _BATCH]
        fits.update(zip(part, _fit(line, heading, [corners[i] for i in part]), strict=True))
    return [fits[i] for i in range(len(corners))]


def _fit(line: Line, heading: Array, corners: list[Corner]) -> list[CornerFit]:
    batch = _batch(line, heading, corners)
    guess = _first_guess(line, corners, batch)
    state = guess.copy()
    damping = np.full(len(corners), 1e-2)
    rest, slopes = _residuals(batch, state)
    cost = _cost(rest, state, guess)
    for _ in range(_ROUNDS):
        tried = state + _step(rest, slopes, state - guess, damping)
        new_rest, new_slopes = _residuals(batch, tried)
        new = _cost(new_rest, tried, guess)
        better = new < cost
        state = np.where(better[:, None], tried, state)
        rest = np.where(better[:, None], new_rest, rest)
        slopes = np.where(better[:, None, None], new_slopes, slopes)
        cost = np.where(better, new, cost)
        damping = np.where(better, damping * 0.3, damping * 8.0)
    return _results(line, batch, state, rest, slopes)


def _batch(line: Line, heading: Array, corners: list[Corner]) -> _Batch:
    start = np.array([corner.knots.start for corner in corners])
    count = np.array([corner.knots.stop for corner in corners]) - start
    side = np.sign([corner.heading_to_rad - corner.heading_from_rad for corner in corners])
    steps = np.arange(count.max())
    used = (steps < count[:, None]).astype(float)
    knots = start[:, None] + np.minimum(steps, count[:, None] - 1)
    origin = line.knot_raw_m[start + count // 2]
    east, north = _plane(origin)
    offset = line.knot_raw_m[knots] - origin[:, None, :]
    middle = np.array([(corner.from_m + corner.to_m) / 2 for corner in corners])
    apex = np.stack(
        [np.interp(middle, line.knot_distance_m, axis) for axis in line.knot_raw_m.T], 1
    )
    # Left-hand axes with the heading's angle: x north, y east, mirrored for a left bend.
    return _Batch(
        x=np.einsum("bni,bi->bn", offset, north),
        y=side[:, None] * np.einsum("bni,bi->bn", offset, east),
        used=used,
        way=side[:, None] * heading[knots],
        side=side,
        spacing=_spacing(line, corners),
        apex_x=np.einsum("bi,bi->b", apex - origin, north),
        apex_y=side * np.einsum("bi,bi->b", apex - origin, east),
    )


def _spacing(line: Line, corners: list[Corner]) -> Array:
    """Distance between the points within each bend, and the nearer one beyond it (mean square)."""
    at = line.knot_distance_m
    chord = np.diff(at)
    squares = np.concatenate(([0.0], np.cumsum(chord**2)))
    first = np.searchsorted(at, [corner.from_m for corner in corners])
    first = np.minimum(first, at.size - 1)
    last = np.searchsorted(at, [corner.to_m for corner in corners], side="right") - 1
    last = np.maximum(last, first)
    walled = np.concatenate(([np.inf], chord, [np.inf]))
    beyond = np.minimum(walled[first], walled[last + 1])
    return np.asarray(np.sqrt((squares[last] - squares[first] + beyond**2) / (last - first + 1)))


def _plane(origin: Array) -> tuple[Array, Array]:
    """Unit vectors (B, 3) to the east and to the north at places (B, 3)."""
    up = origin / np.linalg.norm(origin, axis=1)[:, None]
    flat = np.maximum(np.hypot(up[:, 0], up[:, 1]), 1e-12)
    east = np.stack([-up[:, 1], up[:, 0], np.zeros(len(up))], axis=1) / flat[:, None]
    return east, np.cross(up, east)


def _first_guess(line: Line, corners: list[Corner], batch: _Batch) -> Array:
    """State (B, 5): centre x and y, log radius, headings before and after."""
    before = batch.side * np.array([corner.heading_from_rad for corner in corners])
    after = batch.side * np.array([corner.heading_to_rad for corner in corners])
    length = np.array([corner.to_m - corner.from_m for corner in corners])
    radius = np.maximum(length / np.maximum(after - before, 0.1), _TIGHTEST_M)
    mean = (before + after) / 2
    # y positive is to the left of x once mirrored: headings grow towards the bend's inside.
    return np.stack(
        [
            batch.apex_x - radius * np.sin(mean),
            batch.apex_y + radius * np.cos(mean),
            np.log(radius),
            before,
            after,
        ],
        axis=1,
    )


def _residuals(batch: _Batch, state: Array) -> tuple[Array, Array]:
    """Distance of the points from the fit (B, N), outward, and its slopes (B, N, 5)."""
    cx, cy, log_radius, before, after = (state[:, k : k + 1] for k in range(5))
    radius = np.exp(np.minimum(log_radius, _STRAIGHTEST))
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


def _cost(rest: Array, state: Array, guess: Array) -> Array:
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


def _results(
    line: Line, batch: _Batch, state: Array, rest: Array, slopes: Array
) -> list[CornerFit]:
    radius = np.exp(state[:, 2])
    turn = state[:, 4] - state[:, 3]
    count = batch.used.sum(axis=1)
    misfit = np.sqrt(np.sum(rest**2, axis=1) / count)
    spread = np.sqrt(np.sum(rest**2, axis=1) / np.maximum(count - 5, 1))
    # Between points the road may bulge by what an arc does, and that is not known.
    hidden = np.minimum(_HIDDEN * batch.spacing**2 / (8 * radius), batch.spacing / 2)
    noise = np.maximum(likely_noise_m(line, batch.spacing), spread)
    spread_of_turn = _spread(slopes, noise)
    turn_error = np.sqrt(
        spread_of_turn[:, 3, 3] + spread_of_turn[:, 4, 4] - 2 * spread_of_turn[:, 3, 4]
    )
    radius_error = _TRUE_ERROR * np.sqrt(_spread(slopes, np.hypot(noise, hidden))[:, 2, 2])
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
