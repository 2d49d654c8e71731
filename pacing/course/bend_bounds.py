"""What the points still say of a bend whose radius they do not tell."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.course.line import Line, chord_headings_rad

Array = NDArray[np.float64]

TIGHTEST_M = 4.0
"""The tightest corner a race is ridden round without all but stopping; common practice."""

TIGHTEST_DEAD_TURN_M = 2.5
"""The same for a dead turn round a cone; common practice."""

_SAME_ROAD_M = 10.0
_LOOK_BACK_M = np.arange(20.0, 101.0, 10.0)


def widest_radii_m(line: Line, noise_m: Array) -> Array:
    """Radius (K,) than which the road is tighter somewhere next to each knot, inf where straight.

    Of all curves through three points the circle is the one least bent at its tightest. The turn
    is lessened by what the noise (K,) may add to it.
    """
    turn = np.abs(np.diff(chord_headings_rad(line)))
    chord = np.diff(line.knot_distance_m)
    length = 2.0 / (1.0 / chord[:-1] + 1.0 / chord[1:])
    turn = np.minimum(turn, np.pi) - 3.0 * noise_m[1:-1] / length
    radius = np.full(line.knot_distance_m.size, np.inf)
    bent = turn > 0.05
    radius[1:-1][bent] = length[bent] / (2.0 * np.sin(turn[bent] / 2.0))
    return radius


def dead_turn_radius_m(line: Line, at_m: float) -> float | None:
    """Radius of a turn at ``at_m`` after which the same road is ridden back, else None."""
    reach = _LOOK_BACK_M[(at_m - _LOOK_BACK_M >= 0.0) & (at_m + _LOOK_BACK_M <= line.length_m)]
    if reach.size < 4:
        return None
    apart = np.linalg.norm(_places(line, at_m + reach) - _places(line, at_m - reach), axis=1)
    noise = line.position_noise_m
    same = (
        np.median(apart) < _SAME_ROAD_M + 2 * noise and apart.max() < 2 * _SAME_ROAD_M + 2 * noise
    )
    return max(float(np.median(apart)) / 2, TIGHTEST_DEAD_TURN_M) if same else None


def _places(line: Line, distance_m: Array) -> Array:
    """Earth-centred places (M, 3) along the line."""
    columns = [np.interp(distance_m, line.knot_distance_m, axis) for axis in line.knot_m.T]
    return np.stack(columns, axis=1)
