"""How the direction of the line changes along it, and the stretches that turn one way."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.course.line import Line, chord_headings_rad

Array = NDArray[np.float64]
Span = tuple[int, int]

WIDEST_M = 170.0
"""A wider bend is ridden at more than 70 km/h, wet or dry, and is not listed."""

LEAST_TURN_DEG = 20.0
"""Less of a turn is straightened within the width of the lane."""

_STEP_M = 2.5
_HALF_WINDOWS = (2, 3, 4, 6, 8, 11, 16)
_WINDOW_TURN_RAD = 0.5
_EDGE_SHARE = 0.55


class Turning(NamedTuple):
    """Heading (unwrapped, radians, clockwise) and curvature along a fine grid of distance."""

    distance_m: Array
    heading_rad: Array
    curvature_per_m: Array


def turning_of(line: Line) -> Turning:
    """Heading along the line; the turn at a knot is spread over half the shorter chord each way."""
    heading = chord_headings_rad(line)
    at = line.knot_distance_m
    chord = np.diff(at)
    reach = np.minimum(chord[:-1], chord[1:]) / 2
    breaks = np.stack([at[1:-1] - reach, at[1:-1] + reach], axis=1).ravel()
    values = np.stack([heading[:-1], heading[1:]], axis=1).ravel()
    grid = np.arange(0.0, at[-1] + _STEP_M, _STEP_M)
    along = np.interp(grid, breaks, values) if breaks.size else np.zeros(grid.size)
    return Turning(grid, along, _curvature(along))


def _curvature(heading: Array) -> Array:
    """Curvature (N,) over the shortest window within which the line turns by half a radian.

    A turn is always weighed against the same angle: short windows see tight bends, long ones keep
    wide bends from being broken up by noise.
    """
    curvature = np.zeros(heading.size)
    settled = np.zeros(heading.size, dtype=bool)
    for half in _HALF_WINDOWS:
        padded = np.pad(heading, half, mode="edge")
        turn = padded[2 * half :] - padded[: -2 * half]
        curvature = np.where(settled, curvature, turn / (2 * half * _STEP_M))
        settled |= np.abs(turn) >= _WINDOW_TURN_RAD
    return curvature


def runs(turning: Turning, line: Line) -> list[Span]:
    """First and last index of the stretches that turn one way more tightly than the widest bend.

    Two are one where hardly more than a point lies between them.
    """
    side = np.where(
        np.abs(turning.curvature_per_m) > 1.0 / WIDEST_M, np.sign(turning.curvature_per_m), 0.0
    )
    edge = np.flatnonzero(np.diff(side) != 0) + 1
    starts = np.concatenate(([0], edge))
    stops = np.concatenate((edge, [side.size])) - 1
    spacing = np.interp(turning.distance_m, line.distance_m, line.spacing_m)
    found: list[Span] = []
    for a, b in zip(starts[side[starts] != 0], stops[side[starts] != 0], strict=True):
        if found and side[found[-1][1]] == side[a]:
            gap = turning.distance_m[a] - turning.distance_m[found[-1][1]]
            if gap < min(max(10.0, 1.2 * spacing[a]), 40.0):
                found[-1] = (found[-1][0], int(b))
                continue
        found.append((int(a), int(b)))
    return [run for run in found if abs(turn_rad(turning, *run)) > np.radians(LEAST_TURN_DEG) / 2]


def turn_rad(turning: Turning, first: int, last: int) -> float:
    """Change of direction between two places of the grid, positive to the right."""
    return float(turning.heading_rad[last] - turning.heading_rad[first])


def ends(turning: Turning, first: int, last: int) -> tuple[float, float]:
    """Where the turn begins and ends: all but a twentieth of it at either end lies between."""
    heading = turning.heading_rad[first : last + 1]
    turned = (heading - heading[0]) / (heading[-1] - heading[0])
    start = int(np.argmax(turned > 0.05))
    end = max(int(turned.size - np.argmax(turned[::-1] < 0.95) - 1), start)
    return float(turning.distance_m[first + start]), float(turning.distance_m[first + end])


def cores(turning: Turning, first: int, last: int) -> list[Span]:
    """Parts of a run about equally tight: the tightest, then what is left on either side."""
    least = np.radians(LEAST_TURN_DEG) / 2
    if last - first < 2 or abs(turn_rad(turning, first, last)) < least:
        return []
    size = np.abs(turning.curvature_per_m[first : last + 1])
    peak = int(np.argmax(size))
    low = np.flatnonzero(size < _EDGE_SHARE * size[peak])
    before, after = low[low < peak], low[low > peak]
    a = first + (int(before[-1]) + 1 if before.size else 0)
    b = first + (int(after[0]) - 1 if after.size else last - first)
    if abs(turn_rad(turning, a, b)) < least:
        return [(first, last)]
    return [*cores(turning, first, a - 1), (a, b), *cores(turning, b + 1, last)]
