"""Roads drawn from straights and arcs, whose true length and radii are known on paper."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from pyproj import Transformer

STRAIGHT = float("inf")


@dataclass(frozen=True)
class Drawn:
    """Points (M, 2) half a metre apart, east and north; the true length from the drawing."""

    points_m: np.ndarray
    length_m: float


def draw(*parts: tuple[float, float], heading_deg: float = 0.0) -> Drawn:
    """A road of parts (length of a straight, inf) or (turn in degrees, radius), right positive."""
    at, heading, points, total = np.zeros(2), np.radians(heading_deg), [np.zeros((1, 2))], 0.0
    for amount, radius in parts:
        if radius == STRAIGHT:
            steps = np.linspace(0.0, amount, max(int(2 * amount), 1) + 1)[1:]
            leg = at + steps[:, None] * [np.sin(heading), np.cos(heading)]
            length = amount
        else:
            turn = np.radians(amount)
            length = abs(turn) * radius
            angle = np.linspace(0.0, turn, max(int(2 * length), 8) + 1)[1:]
            side = np.sign(turn) * radius
            centre = at + side * np.array([np.cos(heading), -np.sin(heading)])
            way = heading + angle
            leg = centre - side * np.stack([np.cos(way), -np.sin(way)], axis=1)
            heading += turn
        points.append(leg)
        at, total = leg[-1], total + length
    return Drawn(np.concatenate(points), total)


def winding(seed: int, bends: int, radii_m: tuple[float, float], legs_m=(60.0, 500.0)) -> Drawn:
    """A road of random bends of 15 to 110 degrees between random straights."""
    rng = np.random.default_rng(seed)
    parts = []
    for _ in range(bends):
        parts.append((float(rng.uniform(*legs_m)), STRAIGHT))
        turn = float(rng.choice([-1, 1]) * rng.uniform(15.0, 110.0))
        parts.append((turn, float(rng.uniform(*radii_m))))
    return draw(*parts, (300.0, STRAIGHT))


def recorded(
    road: Drawn, spacing_m: float, noise_m: float, seed: int, *, lat_deg=48.0, lon_deg=10.0
) -> tuple[np.ndarray, np.ndarray]:
    """Latitudes and longitudes of points along the road, independent noise in each direction.

    The points are about evenly spaced, as a recorder leaves them, the last at the end.
    """
    rng = np.random.default_rng(seed)
    step = np.hypot(*np.diff(road.points_m, axis=0).T)
    way = np.concatenate([[0.0], np.cumsum(step)])
    at = np.arange(0.0, way[-1] - 0.3 * spacing_m, spacing_m)
    at[1:] += rng.uniform(-0.1, 0.1, at.size - 1) * spacing_m
    at = np.append(at, way[-1])
    points = np.stack([np.interp(at, way, axis) for axis in road.points_m.T], axis=1)
    return on_earth(points + rng.normal(0.0, noise_m, points.shape), lat_deg, lon_deg)


def on_earth(points_m: np.ndarray, lat_deg: float, lon_deg: float) -> tuple[np.ndarray, np.ndarray]:
    """Points (P, 2) east and north [m] of a place, by an azimuthal equidistant projection.

    It stretches lengths by less than one part in a million within 10 km of the place.
    """
    plane = f"+proj=aeqd +lat_0={lat_deg} +lon_0={lon_deg} +ellps=WGS84 +units=m"
    lon, lat = Transformer.from_crs(plane, "EPSG:4326", always_xy=True).transform(*points_m.T)
    return np.asarray(lat), np.asarray(lon)
