"""How fast the road may be taken: bends, slow places, and the braking that leads to them.

These are planning values, well inside what tyres and brakes can do; they are not safe speeds.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Course
from pacing.units import GRAVITY_M_S2, KMH_PER_M_S

Array = NDArray[np.float64]

LATERAL_G_DRY, LATERAL_G_WET = 0.3, 0.2
BRAKING_G_DRY, BRAKING_G_WET = 0.25, 0.15
LONGEST_SPEED_KMH_DRY, LONGEST_SPEED_KMH_WET = 70.0, 65.0
CENTRE_OF_MASS_RATIO = 0.5
"""Horizontal over vertical distance of the centre of mass to the front contact.

Source: wilson-bicycling-science.
"""


def bend_speed_m_s(radius_m: Array | float, *, lateral_g: float) -> Array:
    """Speed at which a bend of ``radius_m`` asks for ``lateral_g`` of sideways acceleration."""
    return np.sqrt(lateral_g * GRAVITY_M_S2 * np.asarray(radius_m, dtype=float))


def pitch_over_g(gradient: Array | float, *, ratio: float = CENTRE_OF_MASS_RATIO) -> Array:
    """Net deceleration, in g, at which the rear wheel lifts, on a ``gradient`` (downhill < 0).

    (d cos θ − h sin θ)/h with θ the angle of descent, d/h = ``ratio``; 0.419 at 8 % down.
    Source: wilson-bicycling-science.
    """
    slope = np.asarray(gradient, dtype=float)
    return (ratio + slope) / np.sqrt(1.0 + slope**2)


def braking_m_s2(gradient: Array, *, dry: bool) -> Array:
    """Net deceleration planned with, per cell: less on a descent as the pitch-over limit falls."""
    level = BRAKING_G_DRY if dry else BRAKING_G_WET
    share = np.clip(pitch_over_g(gradient) / CENTRE_OF_MASS_RATIO, 0.1, 1.0)
    return np.asarray(level * GRAVITY_M_S2 * share)


def node_limits_m_s(course: Course, *, max_speed_m_s: float, dry: bool) -> Array:
    """Speed limit at each node (N+1,), before braking: rider's own, bends and slow points."""
    limit = np.full(course.distance_m.size, max_speed_m_s)
    lateral_g = LATERAL_G_DRY if dry else LATERAL_G_WET
    for bend in course.bends:
        radius_m = bend.planning_radius_m
        if radius_m is not None:
            speed = float(bend_speed_m_s(radius_m, lateral_g=lateral_g))
            _lower(limit, course.distance_m, bend.at_m, bend.length_m, speed)
    for point in course.slow_points:
        _lower(limit, course.distance_m, point.at_m, point.length_m, point.speed_m_s)
    return limit


def _lower(limit: Array, distance_m: Array, at_m: float, length_m: float, speed_m_s: float) -> None:
    first = int(np.searchsorted(distance_m, at_m - 0.5 * length_m - 1e-6))
    last = int(np.searchsorted(distance_m, at_m + 0.5 * length_m + 1e-6))
    if last <= first:  # shorter than a cell: the nearest node carries it
        first = int(np.argmin(np.abs(distance_m - at_m)))
        last = first + 1
    limit[first:last] = np.minimum(limit[first:last], speed_m_s)


def with_braking(limit_m_s: Array, *, cell_m: Array, braking_m_s2: Array) -> Array:
    """Lower the limit ahead of each slow place so that it can be reached by braking.

    Backwards, v² = v_next² + 2 a h over each cell; ``limit_m_s`` (N+1,), the others (N,).
    """
    gain = np.concatenate([2.0 * braking_m_s2 * cell_m, [0.0]])
    # v_i² <= min over j >= i of v_j² + sum of gains between: a running minimum of a shifted series
    ahead = np.concatenate([[0.0], np.cumsum(gain[:-1])])
    shifted = limit_m_s**2 + ahead
    lowest = np.minimum.accumulate(shifted[::-1])[::-1]
    return np.asarray(np.sqrt(np.maximum(lowest - ahead, 0.0)))


def speed_limits_m_s(course: Course, *, max_speed_m_s: float | None, dry: bool) -> Array:
    """Speed limit at each node (N+1,), braking envelope included.

    ``max_speed_m_s`` None takes the planning default for dry or wet roads.
    """
    if max_speed_m_s is None:
        max_speed_m_s = (LONGEST_SPEED_KMH_DRY if dry else LONGEST_SPEED_KMH_WET) / KMH_PER_M_S
    limit = node_limits_m_s(course, max_speed_m_s=max_speed_m_s, dry=dry)
    braking = braking_m_s2(course.gradient, dry=dry)
    return with_braking(limit, cell_m=course.cell_length_m, braking_m_s2=braking)
