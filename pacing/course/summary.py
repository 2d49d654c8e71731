"""The course in a few figures: steepest parts, which way it heads, pieces of one gradient."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Course
from pacing.course.pieces import cut_pieces

Array = NDArray[np.float64]

COMPASS = ("N", "NE", "E", "SE", "S", "SW", "W", "NW")
MOST_PIECES = 16
SHORTEST_PIECE_M = 400.0


class Stretch(NamedTuple):
    """A stretch of road [m] and its mean gradient (rise over horizontal run)."""

    from_m: float
    to_m: float
    gradient: float

    @property
    def middle_m(self) -> float:
        """The middle of the stretch."""
        return (self.from_m + self.to_m) / 2


class Heading(NamedTuple):
    """The share of the way that heads within 22.5° of a point of the compass."""

    towards: str
    from_deg: float
    to_deg: float
    share: float


def steepest_stretch(distance_m: Array, elevation_m: Array, length_m: float) -> Stretch:
    """The stretch of a length that rises or falls most, on nodes (N+1,) of road distance.

    On a shorter road, the whole of it.
    """
    end = float(distance_m[-1])
    length = min(length_m, end)
    start = np.append(distance_m[distance_m <= end - length], end - length)
    height = np.interp(np.stack([start, start + length]), distance_m, elevation_m)
    rise = height[1] - height[0]
    most = int(np.argmax(np.abs(rise)))
    run = np.sqrt(max(length**2 - float(rise[most]) ** 2, 1e-9))
    at = float(start[most])
    return Stretch(at, at + length, float(rise[most]) / float(run))


def headings(course: Course) -> tuple[Heading, ...]:
    """How much of the way heads where, by the eight points of the compass."""
    sector = np.floor((course.heading_deg + 22.5) / 45.0).astype(int) % 8
    share = np.bincount(sector, course.cell_length_m, 8) / course.length_m
    return tuple(
        Heading(name, (45.0 * n - 22.5) % 360.0, 45.0 * n + 22.5, float(share[n]))
        for n, name in enumerate(COMPASS)
    )


def pieces_of_one_gradient(course: Course) -> tuple[Stretch, ...]:
    """The course cut where its gradient changes most: in still air, what the rider has to climb."""
    ends = cut_pieces(
        course.distance_m,
        course.gradient,
        most_pieces=MOST_PIECES,
        shortest_m=SHORTEST_PIECE_M,
    )
    run = np.concatenate([[0.0], np.cumsum(course.cell_length_m / np.hypot(1.0, course.gradient))])
    at, height, run = course.distance_m[ends], course.elevation_m[ends], run[ends]
    gradient = np.diff(height) / np.diff(run)
    return tuple(
        Stretch(float(a), float(b), float(g))
        for a, b, g in zip(at[:-1], at[1:], gradient, strict=True)
    )
