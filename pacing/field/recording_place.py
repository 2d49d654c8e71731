"""Where a rider was and where they headed, from recorded positions."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.course.geodesy import EQUATOR_RADIUS_M, distances_m, unwrapped_deg
from pacing.course.outliers import outliers
from pacing.course.track import Track
from pacing.field.recording import Recording

Array = NDArray[np.float64]

REACH_SAMPLES = 2
LEAST_WAY_M = 3.0


@dataclass(frozen=True)
class Places:
    """Positions on a plane and headings of n samples; NaN where unknown.

    ``east_m`` and ``north_m`` (n,) are on a plane touching at the first position, true to scale
    within 0.1 % up to 40 km away. ``step_m`` (n−1,) is the geodesic distance between samples.
    ``thrown`` marks positions off any road, which are taken as unknown.
    """

    east_m: Array
    north_m: Array
    heading_deg: Array
    step_m: Array
    thrown: NDArray[np.bool_]
    placed: bool
    notes: tuple[str, ...] = ()


def places_of(recording: Recording) -> Places:
    """Positions and headings of a recording; all NaN where none were recorded."""
    count = recording.time_s.size
    nothing = np.full(count, np.nan)
    known = np.isfinite(recording.lat_deg)
    thrown = np.zeros(count, dtype=bool)
    if known.mean() < 0.5:
        return Places(nothing, nothing, nothing, nothing[1:], thrown, placed=False)
    thrown[known] = _thrown(recording, known)
    lat = np.where(thrown, np.nan, recording.lat_deg)
    lon = np.where(thrown, np.nan, recording.lon_deg)
    good = np.isfinite(lat)
    lon[good] = unwrapped_deg(lon[good])
    east, north = on_plane_m(lat, lon, lat[good][0], lon[good][0])
    step = np.full(count - 1, np.nan)
    index = np.flatnonzero(good)
    next_to = np.diff(index) == 1
    step[index[:-1][next_to]] = distances_m(lat[good], lon[good])[next_to]
    return Places(east, north, _headings(east, north), step, thrown, placed=True)


def on_plane_m(lat_deg: Array, lon_deg: Array, lat_0: float, lon_0: float) -> tuple[Array, Array]:
    """East and north [m] of ``lat_0``, ``lon_0`` [deg], on a plane (longitudes unwrapped)."""
    radius = EQUATOR_RADIUS_M * (1.0 - 0.0033528 * np.sin(np.radians(lat_0)) ** 2)
    east = radius * np.cos(np.radians(lat_0)) * np.radians(lon_deg - lon_0)
    return np.asarray(east), np.asarray(radius * np.radians(lat_deg - lat_0))


def _thrown(recording: Recording, known: NDArray[np.bool_]) -> NDArray[np.bool_]:
    track = Track(
        name="",
        lat_deg=recording.lat_deg[known],
        lon_deg=recording.lon_deg[known],
        elevation_m=recording.elevation_m[known],
        time_s=None,
        segment=np.zeros(int(known.sum()), dtype=np.int64),
    )
    return outliers(track)


def _headings(east: Array, north: Array) -> Array:
    """Direction of travel (n,) over two samples to either side; the last one known while still."""
    count = east.size
    at = np.arange(count)
    before, after = np.maximum(at - REACH_SAMPLES, 0), np.minimum(at + REACH_SAMPLES, count - 1)
    d_east, d_north = east[after] - east[before], north[after] - north[before]
    heading = np.degrees(np.arctan2(d_east, d_north)) % 360.0
    still = np.hypot(d_east, d_north) < LEAST_WAY_M
    missing = ~np.isfinite(d_east)
    last = np.maximum.accumulate(np.where(still | missing, -1, at))
    held = np.where(last >= 0, heading[np.maximum(last, 0)], np.nan)
    return np.where(missing, np.nan, np.where(still, held, heading))
