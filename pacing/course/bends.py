"""Bends: where the line turns, how tightly, and how far that can be trusted."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import erf

from pacing.course.bend_fit import Corner, CornerFit, fit_corners, likely_noise_m
from pacing.course.course import Bend
from pacing.course.line import Line, chord_headings_rad

Array = NDArray[np.float64]

# A wider bend is ridden at more than 70 km/h, wet or dry, and is not listed.
WIDEST_M = 170.0
# Less of a turn is straightened within the width of the lane.
LEAST_TURN_DEG = 20.0
# Below this the radius is called unknown.
LEAST_CONFIDENCE = 0.6
_STEP_M = 2.5
_WINDOWS_M = (10.0, 14.0, 20.0, 28.0, 40.0, 56.0, 80.0)
_WINDOW_TURN_RAD = 0.5
_EDGE_SHARE = 0.55


class _Turning(NamedTuple):
    """Heading (unwrapped, radians, clockwise) and curvature along a fine grid of distance."""

    distance_m: Array
    heading_rad: Array
    curvature_per_m: Array


def find_bends(line: Line) -> tuple[Bend, ...]:
    """Bends tight enough to matter, in riding order.

    ``radius_m`` is None where the points do not tell it: of two points far apart only the turn
    between them is known, not how it was ridden. ``turn_deg`` is positive to the right.
    ``confidence`` is the chance that the true radius lies within a quarter of the one found.

    Each bend is fitted as a straight, an arc and a straight to the points as they were given;
    the error of its radius follows from their noise, number and distance from each other. A bend
    that is not one arc is taken apart, the tightest part first.
    """
    turning = _turning(line)
    spans = _runs(turning, line)
    bends: list[Bend] = []
    while spans:
        fits = fit_corners(line, [_corner(line, turning, *span) for span in spans])
        rest: list[tuple[int, int]] = []
        for span, fit in zip(spans, fits, strict=True):
            parts = [span] if fit.misfit_m <= _tolerance_m(line, fit) else _cores(turning, *span)
            if len(parts) > 1 or parts != [span]:
                rest += parts
                continue
            bend = _bend(line, turning, span, fit)
            bends += [] if bend is None else [bend]
        spans = rest
    return tuple(sorted(bends, key=lambda bend: bend.at_m))


def _tolerance_m(line: Line, fit: CornerFit) -> float:
    """How far points may lie from one arc with its straights before it is called several."""
    return 1.4 * float(likely_noise_m(line, fit.spacing_m)) + 0.4


def _bend(line: Line, turning: _Turning, span: tuple[int, int], fit: CornerFit) -> Bend | None:
    """The bend as listed, or None where it is none: too wide, too slight, or not sure to be one."""
    confidence = float(erf(0.25 / (np.sqrt(2.0) * max(fit.radius_error_share, 1e-3))))
    start, end = _ends(turning, *span)
    turn, length = _turn(turning, *span), end - start
    noise = float(likely_noise_m(line, fit.spacing_m))
    error = 3.5 * noise / max(fit.spacing_m, length)
    if fit.turn_error_rad < error:
        turn, error = fit.turn_rad, fit.turn_error_rad
    if abs(turn) < 4.0 * error or np.degrees(abs(turn)) < LEAST_TURN_DEG:
        return None
    if fit.radius_m > WIDEST_M:
        return None
    known = confidence >= LEAST_CONFIDENCE
    return Bend(
        at_m=(start + end) / 2,
        length_m=fit.radius_m * abs(turn) if known else length,
        radius_m=fit.radius_m if known else None,
        turn_deg=float(np.degrees(turn)),
        confidence=confidence,
    )


def _turning(line: Line) -> _Turning:
    """Heading along the line; the turn at a knot is spread over half the shorter chord each way."""
    heading = chord_headings_rad(line)
    at = line.knot_distance_m
    chord = np.diff(at)
    reach = np.minimum(chord[:-1], chord[1:]) / 2
    breaks = np.stack([at[1:-1] - reach, at[1:-1] + reach], axis=1).ravel()
    values = np.stack([heading[:-1], heading[1:]], axis=1).ravel()
    grid = np.arange(0.0, at[-1] + _STEP_M, _STEP_M)
    along = np.interp(grid, breaks, values) if breaks.size else np.zeros(grid.size)
    return _Turning(grid, along, _curvature(grid, along))


def _curvature(grid: Array, heading: Array) -> Array:
    """Curvature (N,) over the shortest window within which the line turns by half a radian.

    A turn is always weighed against the same angle: short windows see tight bends, long ones keep
    wide bends from being broken up by noise.
    """
    curvature = np.zeros(grid.size)
    settled = np.zeros(grid.size, dtype=bool)
    for window in _WINDOWS_M:
        ahead = np.interp(grid + window / 2, grid, heading)
        turn = ahead - np.interp(grid - window / 2, grid, heading)
        curvature = np.where(settled, curvature, turn / window)
        settled |= np.abs(turn) >= _WINDOW_TURN_RAD
    return curvature


def _runs(turning: _Turning, line: Line) -> list[tuple[int, int]]:
    """First and last index of the stretches that turn one way more tightly than the widest bend.

    Two are one where hardly more than a point lies between them.
    """
    side = np.where(
        np.abs(turning.curvature_per_m) > 1.0 / WIDEST_M, np.sign(turning.curvature_per_m), 0.0
    )
    edge = np.flatnonzero(np.diff(side) != 0) + 1
    starts = np.concatenate(([0], edge))
    ends = np.concatenate((edge, [side.size])) - 1
    spacing = np.interp(turning.distance_m, line.distance_m, line.spacing_m)
    runs: list[tuple[int, int]] = []
    for a, b in zip(starts[side[starts] != 0], ends[side[starts] != 0], strict=True):
        if runs and side[runs[-1][1]] == side[a]:
            gap = turning.distance_m[a] - turning.distance_m[runs[-1][1]]
            if gap < min(max(10.0, 1.2 * spacing[a]), 40.0):
                runs[-1] = (runs[-1][0], int(b))
                continue
        runs.append((int(a), int(b)))
    return [run for run in runs if abs(_turn(turning, *run)) > np.radians(LEAST_TURN_DEG) / 2]


def _turn(turning: _Turning, first: int, last: int) -> float:
    return float(turning.heading_rad[last] - turning.heading_rad[first])


def _ends(turning: _Turning, first: int, last: int) -> tuple[float, float]:
    """Where the turn begins and ends: all but a twentieth of it at either end lies between."""
    heading = turning.heading_rad[first : last + 1]
    turned = (heading - heading[0]) / (heading[-1] - heading[0])
    start = int(np.argmax(turned > 0.05))
    end = int(turned.size - np.argmax(turned[::-1] < 0.95) - 1)
    return float(turning.distance_m[first + start]), float(turning.distance_m[first + end])


def _cores(turning: _Turning, first: int, last: int) -> list[tuple[int, int]]:
    """Parts of a run about equally tight: the tightest, then what is left on either side."""
    least = np.radians(LEAST_TURN_DEG) / 2
    if last - first < 2 or abs(_turn(turning, first, last)) < least:
        return []
    size = np.abs(turning.curvature_per_m[first : last + 1])
    peak = int(np.argmax(size))
    low = np.flatnonzero(size < _EDGE_SHARE * size[peak])
    before, after = low[low < peak], low[low > peak]
    a = first + (int(before[-1]) + 1 if before.size else 0)
    b = first + (int(after[0]) - 1 if after.size else last - first)
    if abs(_turn(turning, a, b)) < least:
        return [(first, last)]
    return [*_cores(turning, first, a - 1), (a, b), *_cores(turning, b + 1, last)]


def _corner(line: Line, turning: _Turning, first: int, last: int) -> Corner:
    """A first guess of a bend, and the knots that show it: the core and a flank on either side."""
    start, end = _ends(turning, first, last)
    length = max(end - start, _STEP_M)
    at = line.knot_distance_m
    nearby = at[max(np.searchsorted(at, start) - 1, 0) : np.searchsorted(at, end) + 2]
    spacing = float(np.median(np.diff(nearby))) if nearby.size > 1 else length
    flank = float(np.clip(0.6 * length, max(15.0, min(3.5 * spacing, 100.0)), 100.0))
    size = turning.curvature_per_m * np.sign(_turn(turning, first, last))
    back = np.flatnonzero(size[:first] < -1.0 / (2 * WIDEST_M))
    on = np.flatnonzero(size[last + 1 :] < -1.0 / (2 * WIDEST_M))
    earliest = max(start - flank, turning.distance_m[back[-1]] if back.size else 0.0)
    latest = min(end + flank, turning.distance_m[last + 1 + on[0]] if on.size else np.inf)
    a = int(np.searchsorted(at, earliest))
    b = int(np.searchsorted(at, latest, side="right"))
    a = max(min(a, int(np.searchsorted(at, start)) - 1), 0)
    b = min(max(b, int(np.searchsorted(at, end, side="right")) + 1), at.size)
    return Corner(
        knots=slice(a, b),
        from_m=float(start),
        to_m=float(end),
        heading_from_rad=float(turning.heading_rad[first]),
        heading_to_rad=float(turning.heading_rad[last]),
    )
