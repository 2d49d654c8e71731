"""Places along the course that a rider sees or reads, and the words for them."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Course

Array = NDArray[np.float64]

LEAST_RISE_M = 6.0
"""Height a crest must stand above, and a bottom lie below, what is around it to be noticed."""
LEAST_TURN_DEG = 60.0
MARK_M = 100.0


class Place(NamedTuple):
    """A place a change of power can be tied to; ``name`` is what is seen there."""

    at_m: float
    name: str


def places_of(course: Course) -> tuple[Place, ...]:
    """Landmarks, slow points, bends, crests and bottoms, in order of distance."""
    found = [Place(mark.at_m, mark.name) for mark in course.landmarks]
    found += [Place(p.at_m, p.note or "slow point") for p in course.slow_points]
    found += [
        Place(b.at_m, "sharp bend" if abs(b.turn_deg) > 100.0 else "bend")
        for b in course.bends
        if abs(b.turn_deg) >= LEAST_TURN_DEG
    ]
    found += _crests_and_bottoms(course.distance_m, course.elevation_m)
    return tuple(sorted(found))


def _crests_and_bottoms(distance_m: Array, elevation_m: Array) -> list[Place]:
    """Turning points of the height that stand out by `LEAST_RISE_M` on both sides."""
    found: list[Place] = []
    low = high = 0
    rising: bool | None = None
    for node, height in enumerate(elevation_m.tolist()):
        if height > elevation_m[high]:
            high = node
        if height < elevation_m[low]:
            low = node
        if rising is not False and elevation_m[high] - height >= LEAST_RISE_M:
            if rising is not None:
                found.append(Place(float(distance_m[high]), "crest"))
            rising, low = False, node
        elif rising is not True and height - elevation_m[low] >= LEAST_RISE_M:
            if rising is not None:
                found.append(Place(float(distance_m[low]), "bottom"))
            rising, high = True, node
    return found


def words_at(course: Course, places: tuple[Place, ...], at_m: float, *, within_m: float) -> str:
    """What a rider sees at ``at_m``: the nearest place within ``within_m``, else nothing."""
    near = [place for place in places if abs(place.at_m - at_m) <= within_m]
    if not near:
        return ""
    return min(near, key=lambda place: abs(place.at_m - at_m)).name


def readable_nodes(course: Course, places: tuple[Place, ...]) -> NDArray[np.intp]:
    """Nodes at which a cue may begin: every 100 m on the display, and every place."""
    marks = np.arange(MARK_M, course.length_m, MARK_M)
    spots = np.concatenate([marks, [place.at_m for place in places]])
    nearest = np.searchsorted(course.distance_m, spots - 0.5 * float(course.cell_length_m[0]))
    inside = (nearest > 0) & (nearest < course.distance_m.size - 1)
    return np.unique(nearest[inside])
