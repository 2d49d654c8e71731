"""The slope of a road that is even: a plane through the recorded heights, or nearly level."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.field.recording_check import Ride

Array = NDArray[np.float64]

LEVEL_SD = 0.002
"""A road that looks level is so within 0.2 % (common practice, no source)."""
LEAST_SD = 0.0002
LEAST_HEIGHT_SD_M = 0.3
THIN = 5


class Tilt(NamedTuple):
    """Slope of the road towards east and north (2,), rise over run, and its covariance (2, 2)."""

    slope: Array
    covariance: Array


def tilt_of(rides: Sequence[Ride]) -> Tilt:
    """What recorded heights say of an even road's slope; level within 0.2 % where they say little.

    Each ride has its own level and its own even drift. Heights along one pass are wrong alike,
    so that only the passes count as so many measurements.
    """
    normal = np.eye(2) / LEVEL_SD**2
    right = np.zeros(2)
    for ride in rides:
        part = _of_ride(ride)
        if part is not None:
            normal += part[0]
            right += part[1]
    covariance = np.linalg.inv(normal)
    slope = covariance @ right
    return Tilt(slope, covariance + np.eye(2) * LEAST_SD**2)


def _of_ride(ride: Ride) -> tuple[Array, Array] | None:
    """Normal matrix and right-hand side for the slope, from one ride's heights."""
    if not (ride.has_heights and ride.placed):
        return None
    good = np.isfinite(ride.height_m) & np.isfinite(ride.east_m) & ~ride.stopped
    at = np.flatnonzero(good)[::THIN]
    if at.size < 20:
        return None
    place = np.column_stack([ride.east_m[at], ride.north_m[at]])
    aside = np.column_stack([np.ones(at.size), ride.time_s[at] - ride.time_s[at].mean()])
    aside[:, 1] /= max(float(np.ptp(ride.time_s[at])), 1.0)
    root, _ = np.linalg.qr(aside)
    place = place - root @ (root.T @ place)
    height = ride.height_m[at] - root @ (root.T @ ride.height_m[at])
    weak = np.eye(2) * 1e-6 * float(np.trace(place.T @ place))
    fitted = np.linalg.solve(place.T @ place + weak, place.T @ height)
    spread = max(float(np.std(height - place @ fitted)), LEAST_HEIGHT_SD_M)
    extent = max(float(np.ptp(place @ _longest(place))), 1.0)
    passes = min(
        max(float(ride.travelled_m[at[-1]] - ride.travelled_m[at[0]]) / extent, 1.0), 200.0
    )
    weight = passes / (at.size * spread**2)
    return weight * (place.T @ place), weight * (place.T @ height)


def _longest(place: Array) -> Array:
    """Direction (2,) in which places (M, 2) spread the most."""
    _, vectors = np.linalg.eigh(place.T @ place)
    return np.asarray(vectors[:, -1])
