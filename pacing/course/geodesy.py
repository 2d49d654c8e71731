"""Distances and headings on the WGS84 ellipsoid.

Consecutive points are joined by the chord through the ellipsoid, lengthened to the arc by the
local radius of curvature. Unlike a step in latitude and longitude this needs no special case at
high latitudes or where the longitude jumps from 180 to -180.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

EQUATOR_RADIUS_M = 6_378_137.0
FLATTENING = 1.0 / 298.257223563
ECCENTRICITY_SQUARED = FLATTENING * (2.0 - FLATTENING)


def ecef_m(lat_deg: Array, lon_deg: Array) -> Array:
    """Points (P,) on the ellipsoid as earth-centred coordinates (P, 3) [m].

    Source: wgs84
    """
    lat, lon = np.radians(lat_deg), np.radians(lon_deg)
    across = EQUATOR_RADIUS_M / np.sqrt(1.0 - ECCENTRICITY_SQUARED * np.sin(lat) ** 2)
    return np.stack(
        [
            across * np.cos(lat) * np.cos(lon),
            across * np.cos(lat) * np.sin(lon),
            across * (1.0 - ECCENTRICITY_SQUARED) * np.sin(lat),
        ],
        axis=-1,
    )


def _curvature_radius_m(lat: Array, east: Array, north: Array) -> Array:
    """Radius of curvature [m] along the direction (east, north), by Euler's formula."""
    bulge = 1.0 - ECCENTRICITY_SQUARED * np.sin(lat) ** 2
    across = EQUATOR_RADIUS_M / np.sqrt(bulge)
    along = across * (1.0 - ECCENTRICITY_SQUARED) / bulge
    squared = np.maximum(east**2 + north**2, 1e-12)
    return squared / (north**2 / along + east**2 / across + 1e-24)


def steps(lat_deg: Array, lon_deg: Array) -> tuple[Array, Array]:
    """East and north part (P-1,) [m] of each step between consecutive points (P,) [deg].

    Their hypotenuse is the geodesic distance: within 1e-8 of it below 1 km, 1e-5 below 100 km.
    Source: wgs84
    """
    points = ecef_m(lat_deg, lon_deg)
    chord = np.diff(points, axis=0)
    lat, lon = np.radians(lat_deg), np.radians(lon_deg)
    # The frame at the middle of the step, from the sum of both ends' upward directions.
    up = np.stack([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)], axis=-1)
    middle = up[:-1] + up[1:]
    middle /= np.maximum(np.linalg.norm(middle, axis=-1, keepdims=True), 1e-12)
    flat = np.maximum(np.hypot(middle[:, 0], middle[:, 1]), 1e-12)
    east = (chord[:, 1] * middle[:, 0] - chord[:, 0] * middle[:, 1]) / flat
    north_z = flat
    north_out = (chord[:, 0] * middle[:, 0] + chord[:, 1] * middle[:, 1]) / flat
    north = chord[:, 2] * north_z - north_out * middle[:, 2]
    radius = _curvature_radius_m(np.arcsin(np.clip(middle[:, 2], -1.0, 1.0)), east, north)
    length = np.linalg.norm(chord, axis=-1)
    arc = 2.0 * radius * np.arcsin(np.clip(length / (2.0 * radius), 0.0, 1.0))
    flat_length = np.hypot(east, north)
    stretch = np.where(flat_length > 0.0, arc / np.maximum(flat_length, 1e-12), 0.0)
    return east * stretch, north * stretch


def distances_m(lat_deg: Array, lon_deg: Array) -> Array:
    """Geodesic distance (P-1,) [m] between consecutive points (P,) [deg]. Source: wgs84"""
    return np.hypot(*steps(lat_deg, lon_deg))


def headings_deg(lat_deg: Array, lon_deg: Array) -> Array:
    """Direction of travel (P-1,) between consecutive points: 0 north, 90 east, in [0, 360).

    Taken at the middle of each step. Source: wgs84
    """
    east, north = steps(lat_deg, lon_deg)
    return np.degrees(np.arctan2(east, north)) % 360.0


def distance_between_m(
    from_lat_deg: float, from_lon_deg: float, to_lat_deg: float, to_lon_deg: float
) -> float:
    """Geodesic distance [m] of one pair of points. Source: wgs84"""
    pair = distances_m(np.array([from_lat_deg, to_lat_deg]), np.array([from_lon_deg, to_lon_deg]))
    return float(pair[0])


def unwrapped_deg(lon_deg: Array) -> Array:
    """Longitudes (P,) made continuous over the 180th meridian, for interpolation."""
    return np.unwrap(lon_deg, period=360.0)


def wrapped_deg(lon_deg: Array) -> Array:
    """Longitudes (P,) brought back to [-180, 180)."""
    return (lon_deg + 180.0) % 360.0 - 180.0


def along_m(lat_deg: Array, lon_deg: Array) -> Array:
    """Distance (P,) [m] of the points (P,) along the line, straight from one to the next."""
    return np.concatenate([[0.0], np.cumsum(distances_m(lat_deg, lon_deg))])
