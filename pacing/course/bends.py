"""Bends: where the line turns, how tightly, and how far that can be trusted."""

from __future__ import annotations

from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import erf

from pacing.course.bend_bounds import (
    TIGHT_TURN_DEG,
    TIGHTEST_M,
    dead_turn_radius_m,
    ridden_radius_m,
    widest_radii_m,
)
from pacing.course.bend_fit import Corner, CornerFit, fit_corners, likely_noise_m
from pacing.course.course import Bend
from pacing.course.line import Line
from pacing.course.turning import (
    LEAST_TURN_DEG,
    WIDEST_M,
    Span,
    Turning,
    cores,
    ends,
    runs,
    turn_rad,
    turning_of,
)

Array = NDArray[np.float64]

LEAST_CONFIDENCE = 0.7
"""Below this the radius is called unknown."""

_WITHIN = 0.25
_SURE_TURN_RAD = 0.1
_LONGEST_FLANK_M = 100.0
_HOOK_REACH_M = 25.0
_WIDEST_BOUND_M = 400.0
_MOST_CONFIDENCE = 0.8


class _Road(NamedTuple):
    """A line, how it turns, and the widest radius that fits at each knot (K,)."""

    line: Line
    turning: Turning
    widest_m: Array


def find_bends(line: Line) -> tuple[Bend, ...]:
    """Bends tight enough to matter, in riding order.

    ``radius_m`` is None where the points do not tell it: of two points far apart only the turn
    between them is known, not how it was ridden. ``confidence`` is the chance that the true radius
    lies within a quarter of the one found.

    Each bend is fitted as a straight, an arc and a straight to the points as they were given;
    the error of its radius follows from their noise, number and distance from each other. A bend
    that is not one arc is taken apart, the tightest part first. A dead turn is known by the way
    back; hooks that no road has, from standing still, are left out.
    """
    if line.knot_distance_m.size < 3:
        return ()
    spacing = np.diff(line.knot_distance_m)
    near = np.minimum(np.append(spacing, np.inf), np.append(np.inf, spacing))
    road = _Road(line, turning_of(line), widest_radii_m(line, likely_noise_m(line, near)))
    spans = runs(road.turning, line)
    bends: list[Bend] = []
    while spans:
        fits = fit_corners(line, [_corner(road, span) for span in spans])
        rest: list[Span] = []
        for span, fit in zip(spans, fits, strict=True):
            parts = [span]
            if fit.misfit_m > 1.4 * float(likely_noise_m(line, fit.spacing_m)) + 0.4:
                parts = cores(road.turning, *span)
            if parts != [span]:
                rest += parts
                continue
            bend = _bend(road, span, fit)
            bends += [] if bend is None else [bend]
        spans = rest
    return _without_hooks(road.turning, sorted(bends, key=lambda bend: bend.at_m))


def _bend(road: _Road, span: Span, fit: CornerFit) -> Bend | None:
    """The bend as listed, or None where it is none: too wide, too slight, or not sure to be one."""
    start, end = ends(road.turning, *span)
    turn, length = turn_rad(road.turning, *span), end - start
    error = 3.5 * float(likely_noise_m(road.line, fit.spacing_m)) / max(fit.spacing_m, length)
    if fit.turn_error_rad < max(error, _SURE_TURN_RAD):
        turn, error = fit.turn_rad, fit.turn_error_rad
    slight = np.degrees(abs(turn)) < LEAST_TURN_DEG
    if slight or abs(turn) < 4.0 * error or fit.radius_m > WIDEST_M:
        return None
    confidence = float(erf(_WITHIN / (np.sqrt(2.0) * max(fit.radius_error_share, 1e-3))))
    bend = Bend((start + end) / 2, length, None, float(np.degrees(turn)), confidence)
    if confidence < LEAST_CONFIDENCE:
        return _bounded(road, bend)
    return replace(bend, radius_m=fit.radius_m, length_m=fit.radius_m * abs(turn))


def _bounded(road: _Road, bend: Bend) -> Bend:
    """A bend of unknown radius: what is sure to be tight is known after all, else its bound."""
    if abs(bend.turn_deg) > 150.0:
        radius = dead_turn_radius_m(road.line, bend.at_m)
        if radius is not None:
            return replace(bend, radius_m=radius, confidence=max(bend.confidence, LEAST_CONFIDENCE))
    at = road.line.knot_distance_m
    reach = bend.length_m / 2 + 1.0
    first, last = np.searchsorted(at, [bend.at_m - reach, bend.at_m + reach])
    widest = float(np.min(road.widest_m[first:last], initial=np.inf))
    if not np.isfinite(widest) or widest > _WIDEST_BOUND_M:
        return bend
    # Any radius from the tightest ridden to the widest possible is as likely as any other share.
    likely = float(np.sqrt(TIGHTEST_M * max(widest, TIGHTEST_M)))
    room = np.log(max(widest / TIGHTEST_M, 1.0 + _WITHIN))
    confidence = min(float(np.log((1 + _WITHIN) / (1 - _WITHIN)) / room), _MOST_CONFIDENCE)
    if confidence >= LEAST_CONFIDENCE and abs(bend.turn_deg) >= TIGHT_TURN_DEG:
        return replace(bend, radius_m=likely, confidence=confidence)
    return replace(bend, widest_m=ridden_radius_m(widest, bend.turn_deg))


def _without_hooks(turning: Turning, bends: list[Bend]) -> tuple[Bend, ...]:
    """Leave out sharp turns that are undone within a few metres, and loops around nothing."""
    hooks = []
    for bend in bends:
        tight = bend.radius_m is None or bend.radius_m < 10.0
        if not tight or abs(bend.turn_deg) < 100.0 or bend.length_m > _HOOK_REACH_M:
            continue
        reach = bend.length_m / 2 + _HOOK_REACH_M
        before, after = np.interp(
            [bend.at_m - reach, bend.at_m + reach], turning.distance_m, turning.heading_rad
        )
        left = abs((np.degrees(after - before) + 180.0) % 360.0 - 180.0)
        if left < 0.4 * min(abs(bend.turn_deg), 180.0):
            hooks.append((bend.at_m - reach, bend.at_m + reach))
    return tuple(
        bend
        for bend in bends
        if not any(a < bend.at_m < b for a, b in hooks)
        or (bend.radius_m is not None and bend.radius_m > 15.0)
    )


def _corner(road: _Road, span: Span) -> Corner:
    """A first guess of a bend, and the knots that show it: the core and a flank on either side."""
    turning, (first, last) = road.turning, span
    start, end = ends(turning, first, last)
    at = road.line.knot_distance_m
    nearby = at[max(np.searchsorted(at, start) - 1, 0) : np.searchsorted(at, end) + 2]
    spacing = float(np.median(np.diff(nearby))) if nearby.size > 1 else end - start
    least = max(15.0, min(3.5 * spacing, _LONGEST_FLANK_M))
    flank = float(np.clip(0.6 * (end - start), least, _LONGEST_FLANK_M))
    earliest, latest = _free_of_other_bends(turning, span, start - flank, end + flank)
    a = int(np.searchsorted(at, earliest))
    b = int(np.searchsorted(at, latest, side="right"))
    a = max(min(a, int(np.searchsorted(at, start)) - 1), 0)
    b = min(max(b, int(np.searchsorted(at, end, side="right")) + 1), at.size)
    # A straight whose points were left out is shown by its far end.
    if a > 0 and earliest == start - flank and at[a] - at[a - 1] > 3.0 * spacing:
        a -= 1
    if b < at.size and latest == end + flank and at[b] - at[b - 1] > 3.0 * spacing:
        b += 1
    return Corner(
        knots=slice(a, b),
        from_m=start,
        to_m=end,
        heading_from_rad=float(turning.heading_rad[first]),
        heading_to_rad=float(turning.heading_rad[last]),
    )


def _free_of_other_bends(
    turning: Turning, span: Span, earliest_m: float, latest_m: float
) -> tuple[float, float]:
    """Bounds drawn in to where the line bends the other way."""
    first, last = span
    grid = turning.distance_m
    a, b = np.searchsorted(grid, [earliest_m, latest_m])
    other = -0.5 / WIDEST_M * np.sign(turn_rad(turning, first, last))
    before = np.flatnonzero(turning.curvature_per_m[a:first] * np.sign(other) > abs(other))
    after = np.flatnonzero(turning.curvature_per_m[last + 1 : b] * np.sign(other) > abs(other))
    if before.size:
        earliest_m = float(grid[a + before[-1]])
    if after.size:
        latest_m = float(grid[last + 1 + after[0]])
    return earliest_m, latest_m
