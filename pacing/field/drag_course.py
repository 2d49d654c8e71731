"""What the race file's course knows of the road of a test ridden on it."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.errors import UnusableInputError
from pacing.field.debrief_match import match_ride
from pacing.field.recording_check import Ride
from pacing.race import Race

Array = NDArray[np.float64]

FAR_DEG = 0.5
MOST_OF_IT = 0.8


class RoadKnown(NamedTuple):
    """Of a ride's n samples: height [m], surface factor of Crr, share of the wind."""

    height_m: Array
    crr_factor: Array
    wind_share: Array


def roads_known(rides: Sequence[Ride], race: Race) -> tuple[RoadKnown, ...] | None:
    """What the course says of the road, sample by sample, if every ride was ridden on it."""
    found = []
    for ride in rides:
        known = _road(ride, race)
        if known is None:
            return None
        found.append(known)
    return tuple(found)


def _road(ride: Ride, race: Race) -> RoadKnown | None:
    course = race.course
    placed = np.isfinite(ride.recording.lat_deg)
    if not ride.placed or not placed.any():
        return None
    lat = ride.recording.lat_deg[placed]
    if lat.min() > course.lat_deg.max() + FAR_DEG or lat.max() < course.lat_deg.min() - FAR_DEG:
        return None
    try:
        matched = match_ride(ride, course)
    except UnusableInputError:
        return None
    on = np.isfinite(matched.at_m)
    way = np.diff(ride.travelled_m)
    if way[on[1:] & on[:-1]].sum() < MOST_OF_IT * way.sum():
        return None
    at = np.nan_to_num(matched.at_m)
    cell = np.clip(np.searchsorted(course.distance_m, at, side="right") - 1, 0, None)
    cell = np.minimum(cell, course.gradient.size - 1)
    height = np.where(on, np.interp(at, course.distance_m, course.elevation_m), np.nan)
    return RoadKnown(
        height,
        np.where(on, course.crr_factor[cell], 1.0),
        np.where(on, course.wind_share[cell], 1.0),
    )
