"""Invented roads, known exactly: bends with clothoid ramps, gradients joined by vertical curves.

A road is a list of points about a metre apart, laid in the open ocean so that no real road is
meant. What a rider's recorder makes of it is in ``recording.py``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

WGS84_A_M = 6378137.0
WGS84_E2 = 6.69437999014e-3


@dataclass(frozen=True)
class Road:
    """A road as built. Arrays (N,), ``distance_m`` horizontal, ``radius_m`` inf where straight."""

    name: str
    distance_m: Array
    lat_deg: Array
    lon_deg: Array
    height_m: Array
    radius_m: Array
    closed: bool = False

    @property
    def length_m(self) -> float:
        """Horizontal length."""
        return float(self.distance_m[-1])

    @property
    def slope(self) -> Array:
        """Rise over horizontal run at the points (N,)."""
        return np.gradient(self.height_m, self.distance_m)


def corner(turn_rad: float, radius_m: float, ramp_m: float, step_m: float = 1.0) -> Array:
    """Curvature along a bend of two clothoids and an arc between (N,), 1/m, turning ``turn_rad``.

    ``ramp_m`` is shortened where the whole turn has no room for it.
    """
    turn = abs(turn_rad)
    ramp = min(ramp_m, 0.8 * turn * radius_m)
    total = turn * radius_m + ramp
    count = max(int(np.ceil(total / step_m)), 4)
    at = (np.arange(count) + 0.5) * total / count
    shape = np.minimum(np.minimum(at, total - at) / ramp, 1.0)
    return np.asarray(np.sign(turn_rad) * shape * turn / (shape.sum() * total / count))


def _walk(heading_rad: float, curvature: Array, length_m: float) -> tuple[Array, Array]:
    """End points of cells of equal length along given curvature: offsets (N, 2), headings (N,)."""
    cell = length_m / len(curvature)
    after = heading_rad + np.cumsum(curvature) * cell
    middle = after - curvature * cell / 2
    steps = cell * np.column_stack([np.cos(middle), np.sin(middle)])
    return np.cumsum(steps, axis=0), after


def line_through(
    vertices_m: Array, radii_m: Array, *, closed: bool = False, ramp_m: float = 25.0
) -> tuple[Array, Array]:
    """Straight legs through ``vertices_m`` (K, 2), every corner rounded.

    A closed line starts in the middle of its first leg. Radii are lessened where the legs are too
    short for them. Returns points about a metre apart (N, 2) and the radius there (N,).
    """
    corners = np.asarray(vertices_m, dtype=float)
    if closed:
        start = (corners[0] + corners[1]) / 2
        corners = np.vstack([start, corners[1:], corners[:1], start])
        radii_m = np.concatenate([[np.inf], radii_m[1:], radii_m[:1], [np.inf]])
    legs = np.diff(corners, axis=0)
    lengths = np.hypot(legs[:, 0], legs[:, 1])
    headings = np.arctan2(legs[:, 1], legs[:, 0])
    points, radii, at = [corners[:1]], [np.array([np.inf])], corners[0]
    for i in range(1, len(corners) - 1):
        turn = float((headings[i] - headings[i - 1] + np.pi) % (2 * np.pi) - np.pi)
        room = 0.48 * min(lengths[i - 1], lengths[i])
        curvature, length, tangent = _fitted_corner(turn, float(radii_m[i]), ramp_m, room)
        entry = corners[i] - tangent * np.array([np.cos(headings[i - 1]), np.sin(headings[i - 1])])
        leg, leg_radii = _straight(at, entry)
        offsets, _ = _walk(headings[i - 1], curvature, length)
        points += [leg, entry + offsets]
        radii += [leg_radii, 1.0 / np.maximum(np.abs(curvature), 1e-9)]
        at = entry + offsets[-1]
    leg, leg_radii = _straight(at, corners[-1])
    return np.vstack([*points, leg]), np.concatenate([*radii, leg_radii])


def _straight(start: Array, end: Array) -> tuple[Array, Array]:
    count = max(int(np.ceil(np.hypot(*(end - start)))), 1)
    share = (np.arange(count) + 1.0)[:, None] / count
    return start + share * (end - start), np.full(count, np.inf)


def _fitted_corner(
    turn_rad: float, radius_m: float, ramp_m: float, room_m: float
) -> tuple[Array, float, float]:
    """Curvature, length and tangent length of a corner that needs at most ``room_m`` a side."""
    radius = min(radius_m, 1e4)
    while True:
        ramp = min(ramp_m, 0.8 * abs(turn_rad) * radius)
        curvature = corner(turn_rad, radius, ramp)
        length = abs(turn_rad) * radius + ramp
        offsets, _ = _walk(0.0, curvature, length)
        across, along = offsets[-1, 1], offsets[-1, 0]
        tangent = along - across / np.tan(turn_rad)
        if tangent <= room_m:
            return curvature, length, float(tangent)
        radius, ramp_m = 0.9 * radius, 0.9 * ramp_m


def out_and_back(points_m: Array, radius_m: Array, lane_m: float) -> tuple[Array, Array]:
    """There on one lane, a dead turn around a cone, back on the other: points and radii."""
    along = np.gradient(points_m, axis=0)
    along /= np.hypot(along[:, 0], along[:, 1])[:, None]
    aside = np.column_stack([along[:, 1], -along[:, 0]]) * lane_m / 2
    count = int(np.ceil(np.pi * lane_m / 2))
    angle = np.pi * (np.arange(count) + 0.5) / count
    around = points_m[-1] + np.cos(angle)[:, None] * aside[-1]
    around += np.sin(angle)[:, None] * along[-1] * lane_m / 2
    line = np.vstack([points_m + aside, around, (points_m - aside)[::-1]])
    return line, np.concatenate([radius_m, np.full(count, lane_m / 2), radius_m[::-1]])


def on_earth(points_m: Array, lat_deg: float, lon_deg: float) -> tuple[Array, Array, Array]:
    """Latitudes, longitudes and horizontal distance of points given east and north of a place.

    Distances are by the local radii of curvature of WGS84, summed over the short steps.
    """
    meridian, _ = _radii_m(np.array([lat_deg]))
    lat = lat_deg + np.degrees(points_m[:, 1] / meridian)
    _, parallel = _radii_m(lat)
    lon = lon_deg + np.degrees(points_m[:, 0] / parallel)
    meridian_mid, parallel_mid = _radii_m((lat[1:] + lat[:-1]) / 2)
    steps = np.hypot(
        np.radians(np.diff(lat)) * meridian_mid, np.radians(np.diff(lon)) * parallel_mid
    )
    return lat, lon, np.concatenate([[0.0], np.cumsum(steps)])


def _radii_m(lat_deg: Array) -> tuple[Array, Array]:
    """Radius of curvature along the meridian, and radius of the parallel."""
    sine = np.sin(np.radians(lat_deg))
    root = np.sqrt(1 - WGS84_E2 * sine**2)
    meridian = WGS84_A_M * (1 - WGS84_E2) / root**3
    return meridian, WGS84_A_M / root * np.cos(np.radians(lat_deg))


def heights_from_sections(
    distance_m: Array,
    sections: list[tuple[float, float]],
    *,
    start_m: float,
    curve_m: float = 80.0,
    net_m: float | None = None,
    undulation: tuple[np.random.Generator, float] | None = None,
) -> Array:
    """Heights (N,) of a road of given (length in m, gradient in %), scaled to the road's length.

    Neighbouring gradients are joined by parabolic vertical curves of ``curve_m``; ``net_m`` sets
    the rise from start to finish by the same small gradient everywhere; ``undulation`` adds what no
    builder levels: a random gradient of given standard deviation (%) that changes over some 60 m.
    """
    ends = np.cumsum([0.0] + [length for length, _ in sections])
    ends *= distance_m[-1] / ends[-1]
    fine = np.arange(0.0, distance_m[-1] + 1.0)
    index = np.clip(np.searchsorted(ends, fine, side="right") - 1, 0, len(sections) - 1)
    slope = np.array([gradient for _, gradient in sections])[index] / 100
    slope = _averaged(_averaged(slope, curve_m), curve_m / 3)
    if undulation is not None:
        rng, spread_pct = undulation
        waves = _averaged(_averaged(rng.normal(0.0, 1.0, len(fine)), 60.0), 60.0)
        slope = slope + waves * spread_pct / 100 / waves.std()
    height = np.concatenate([[0.0], np.cumsum((slope[1:] + slope[:-1]) / 2)])
    height = np.interp(distance_m, fine, height)
    if net_m is not None:
        height += (net_m - height[-1]) * distance_m / distance_m[-1]
    return np.asarray(start_m + height)


def _averaged(values: Array, width: float) -> Array:
    half = max(int(width / 2), 1)
    padded = np.pad(values, half, mode="edge")
    total = np.cumsum(np.concatenate([[0.0], padded]))
    return np.asarray((total[2 * half + 1 :] - total[: -2 * half - 1]) / (2 * half + 1))


def random_sections(
    rng: np.random.Generator,
    length_m: float,
    *,
    spread_pct: float,
    steepest_pct: float,
    lengths_m: tuple[float, float] = (150.0, 900.0),
) -> list[tuple[float, float]]:
    """Rolling country: sections of random length and gradient filling ``length_m``."""
    sections: list[tuple[float, float]] = []
    while sum(length for length, _ in sections) < length_m:
        gradient = float(np.clip(rng.normal(0.0, spread_pct), -steepest_pct, steepest_pct))
        sections.append((float(rng.uniform(*lengths_m)), gradient))
    return sections
