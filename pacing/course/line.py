"""The line of the road under noisy points: horizontal distance, heading and curvature."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.course.geodesy import ECCENTRICITY_SQUARED, ecef_m, headings_deg
from pacing.course.knots import most_noise_m, telling_points
from pacing.course.line_arcs import along_arcs, chord_arcs
from pacing.course.line_noise import smoothed_places

Array = NDArray[np.float64]
Index = NDArray[np.intp]


@dataclass(frozen=True)
class Line:
    """The smoothed line on a uniform grid of N cells, and at the points it was made from.

    ``distance_m``, ``lat_deg``, ``lon_deg``, ``curvature_per_m`` (positive to the right) and
    ``spacing_m`` (between the points that support the line there) are at the nodes (N+1,),
    ``heading_deg`` (0 north, 90 east) in the cells (N,). ``position_noise_m`` is the standard
    deviation of the points from the line in each direction. ``point_distance_m`` (P,) is the
    distance along the line of every point given. Of the knots that carry the line (K,):
    ``knot_distance_m``, earth-centred places after and before smoothing (K, 3), and how strongly
    the road is taken to bend between them (K-1,).
    All distances are horizontal, on the WGS84 ellipsoid.
    """

    distance_m: Array
    lat_deg: Array
    lon_deg: Array
    heading_deg: Array
    curvature_per_m: Array
    position_noise_m: float
    spacing_m: Array
    point_distance_m: Array
    knot_distance_m: Array
    knot_m: Array
    knot_raw_m: Array
    chord_curvature_per_m: Array

    @property
    def length_m(self) -> float:
        """Horizontal length of the line."""
        return float(self.distance_m[-1])


def smooth_line(lat_deg: Array, lon_deg: Array, *, grid_m: float = 10.0) -> Line:
    """The line of the road under points with position noise.

    The noise is judged from the points: white noise makes their changes of direction alternate,
    which a road does not. How much of them to take for noise follows from restricted maximum
    likelihood of a road whose curvature is white noise of locally varying strength.
    Corners and dead turns, where the direction changes far more than around them, stay.

    Parameters
    ----------
    lat_deg, lon_deg : (P,) at least two points in riding order, degrees.
    grid_m : wanted cell length; the true one divides the length into a whole number of cells.

    Raises
    ------
    ValueError
        Fewer than two distinct points, or coordinates that are not finite.

    Source: wahba-1985
    """
    points = ecef_m(np.asarray(lat_deg, dtype=float), np.asarray(lon_deg, dtype=float))
    if points.shape[0] < 2 or not np.all(np.isfinite(points)):
        raise ValueError("at least two points with finite coordinates are needed")
    kept = telling_points(points)
    if kept.size < 2:
        raise ValueError("all points are at one place")
    smooth = smoothed_places(points[kept], most_noise_m(points, kept))
    chord = np.linalg.norm(np.diff(smooth.place_m, axis=0), axis=1)
    length, bend = chord_arcs(smooth.place_m, chord, smooth.noise_m)
    knot_distance = np.concatenate(([0.0], np.cumsum(length)))
    cells = max(round(knot_distance[-1] / grid_m), 1)
    distance = np.linspace(0.0, knot_distance[-1], cells + 1)
    nodes = along_arcs(distance, knot_distance, smooth.place_m, bend)
    lat, lon = _geographic_deg(nodes)
    return Line(
        distance_m=distance,
        lat_deg=lat,
        lon_deg=lon,
        heading_deg=headings_deg(lat, lon),
        curvature_per_m=_node_curvature(nodes, distance),
        position_noise_m=smooth.noise_m,
        spacing_m=np.interp(distance, (knot_distance[1:] + knot_distance[:-1]) / 2, chord),
        point_distance_m=_point_distance(points, kept, knot_distance),
        knot_distance_m=knot_distance,
        knot_m=smooth.place_m,
        knot_raw_m=points[kept],
        chord_curvature_per_m=np.linalg.norm(bend, axis=1),
    )


def chord_headings_rad(line: Line) -> Array:
    """Headings of the chords between knots (K-1,), clockwise from north, unwrapped."""
    step = np.diff(line.knot_m, axis=0)
    up = line.knot_m[:-1] + line.knot_m[1:]
    up /= np.linalg.norm(up, axis=1)[:, None]
    east = np.array([-up[0, 1], up[0, 0], 0.0]) / max(np.hypot(up[0, 0], up[0, 1]), 1e-12)
    first = np.arctan2(step[0] @ east, step[0] @ np.cross(up[0], east))
    right = -np.sum(np.cross(step[:-1], step[1:]) * up[1:], axis=1)
    turn = np.arctan2(right, np.sum(step[:-1] * step[1:], axis=1))
    return np.asarray(first + np.concatenate(([0.0], np.cumsum(turn))))


def _geographic_deg(place: Array) -> tuple[Array, Array]:
    """Latitude and longitude of earth-centred places next to the ellipsoid."""
    out = np.hypot(place[:, 0], place[:, 1])
    lat = np.arctan2(place[:, 2], (1.0 - ECCENTRICITY_SQUARED) * out)
    return np.degrees(lat), np.degrees(np.arctan2(place[:, 1], place[:, 0]))


def _node_curvature(nodes: Array, distance: Array) -> Array:
    """Signed curvature at the nodes (N+1,), positive to the right."""
    curvature = np.zeros(nodes.shape[0])
    if nodes.shape[0] > 2:
        step = np.diff(nodes, axis=0)
        step /= np.linalg.norm(step, axis=1)[:, None]
        cross = np.cross(step[:-1], step[1:])
        up = nodes[1:-1] / np.linalg.norm(nodes[1:-1], axis=1)[:, None]
        angle = np.arctan2(-np.sum(cross * up, axis=1), np.sum(step[:-1] * step[1:], axis=1))
        curvature[1:-1] = angle / ((distance[2:] - distance[:-2]) / 2)
    return curvature


def _point_distance(points: Array, kept: Index, knot_distance: Array) -> Array:
    """Distance along the line of every point given (P,), by its share of the way between knots."""
    step = np.linalg.norm(np.diff(points, axis=0), axis=1)
    way = np.concatenate(([0.0], np.cumsum(step)))
    return np.interp(way, way[kept], knot_distance)
