"""What the points still say of a bend whose radius they do not tell."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.course.line import Line

Array = NDArray[np.float64]

TIGHTEST_M = 4.0
"""The tightest corner a race is ridden round without all but stopping; common practice."""

TIGHTEST_DEAD_TURN_M = 2.5
"""The same for a dead turn round a cone; common practice."""

TIGHT_TURN_DEG = 75.0
"""A lesser turn is cut within the width of the road, however tightly it is drawn."""

_ROOM_M = 1.5
_BASE_M = 6.0
_SAME_ROAD_M = 10.0
_LOOK_BACK_M = np.arange(20.0, 101.0, 10.0)


def widest_radii_m(line: Line, noise_m: Array) -> Array:
    """Radius (K,) than which the road is tighter somewhere next to each knot, inf where straight.

    Of all curves through three points the circle is the one least bent at its tightest. The turn
    is lessened by what the noise (K,) may add to it. Points are taken at least a bicycle's length
    or three apart, for nothing turns within less.
    """
    at, place = line.knot_distance_m, line.knot_m
    knot = np.arange(1, at.size - 1)
    before = np.searchsorted(at, at[knot] - _BASE_M, side="right") - 1
    after = np.searchsorted(at, at[knot] + _BASE_M)
    before, after = np.clip(before, 0, knot - 1), np.clip(after, knot + 1, at.size - 1)
    back, on = place[knot] - place[before], place[after] - place[knot]
    one, other = np.linalg.norm(back, axis=1), np.linalg.norm(on, axis=1)
    one, other = np.maximum(one, 1e-6), np.maximum(other, 1e-6)
    turn = np.arccos(np.clip(np.sum(back * on, axis=1) / (one * other), -1.0, 1.0))
    length = 2.0 / (1.0 / one + 1.0 / other)
    turn -= 3.0 * noise_m[1:-1] / length
    radius = np.full(at.size, np.inf)
    bent = turn > 0.05
    radius[1:-1][bent] = length[bent] / (2.0 * np.sin(turn[bent] / 2.0))
    return radius


def ridden_radius_m(radius_m: float, turn_deg: float) -> float:
    """Radius of the widest path round a bend on a road with some room to either side."""
    half = np.radians(min(abs(turn_deg), 170.0)) / 2
    return float(radius_m + _ROOM_M / (1.0 / np.cos(half) - 1.0))


def dead_turn_radius_m(line: Line, at_m: float) -> float | None:
    """Radius of a turn at ``at_m`` after which the same road is ridden back, else None."""
    reach = _LOOK_BACK_M[(at_m - _LOOK_BACK_M >= 0.0) & (at_m + _LOOK_BACK_M <= line.length_m)]
    if reach.size < 4:
        return None
    there = _places(line, at_m - reach)
    back = _places(line, np.arange(at_m, min(at_m + 2.0 * reach[-1], line.length_m), 2.0))
    apart = np.min(np.linalg.norm(there[:, None] - back[None, :], axis=2), axis=1)
    most = _SAME_ROAD_M + 2.0 * line.position_noise_m
    same = np.median(apart) < most and np.max(apart) < 2.0 * most
    return max(float(np.median(apart)) / 2.0, TIGHTEST_DEAD_TURN_M) if same else None


def _places(line: Line, distance_m: Array) -> Array:
    """Earth-centred places (M, 3) along the line."""
    columns = [np.interp(distance_m, line.knot_distance_m, axis) for axis in line.knot_m.T]
    return np.stack(columns, axis=1)
