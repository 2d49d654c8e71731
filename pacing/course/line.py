"""The line of the road under noisy points: horizontal distance, heading and curvature."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import LinAlgError, cho_solve_banded, cholesky_banded

from pacing.course.geodesy import ECCENTRICITY_SQUARED, ecef_m, headings_deg

Array = NDArray[np.float64]
Index = NDArray[np.intp]

# Points closer than this to the straight between their neighbours say nothing of the line.
_COLLINEAR_M = 0.02
_SAME_PLACE_M = 0.05
# No recorder that is of use for a race course strays further than this, one standard deviation.
_MOST_NOISE_M = 8.0
_ROUNDS = 6
# Degrees of freedom of the changes of direction. So few leave bends and corners alone; chosen for
# the true length of invented roads with 0.5 to 3 m of noise.
_TAIL = 0.5


@dataclass(frozen=True)
class Line:
    """The smoothed line on a uniform grid of N cells, and at the points it was made from.

    ``distance_m``, ``lat_deg``, ``lon_deg``, ``curvature_per_m`` (positive to the right) and
    ``spacing_m`` (between the points that support the line there) are at the nodes (N+1,),
    ``heading_deg`` (0 north, 90 east) in the cells (N,). ``position_noise_m`` is the standard
    deviation of the points from the line in each direction. ``point_distance_m`` (P,) is the
    distance along the line of every point given. Of the knots that carry the line (K,):
    ``knot_distance_m``, and earth-centred places before and after smoothing (K, 3).
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

    @property
    def length_m(self) -> float:
        """Horizontal length of the line."""
        return float(self.distance_m[-1])


class _Smooth(NamedTuple):
    """Smoothed places (K, 3) and the noise (standard deviation in each direction) removed."""

    place_m: Array
    noise_m: float


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
    kept = _telling_points(points)
    if kept.size < 2:
        raise ValueError("all points are at one place")
    smooth = _smoothed(points[kept], _most_noise_m(points, kept))
    chord = np.linalg.norm(np.diff(smooth.place_m, axis=0), axis=1)
    length, bend = _arcs(smooth.place_m, chord, smooth.noise_m)
    knot_distance = np.concatenate(([0.0], np.cumsum(length)))
    cells = max(round(knot_distance[-1] / grid_m), 1)
    distance = np.linspace(0.0, knot_distance[-1], cells + 1)
    nodes = _along_arcs(distance, knot_distance, smooth.place_m, bend)
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
    )


def _beside_chord(points: Array) -> tuple[Array, Array]:
    """How far each inner point (P-2,) lies aside of its neighbours' chord, and its share of it."""
    step = points[1:-1] - points[:-2]
    chord = points[2:] - points[:-2]
    share = np.sum(step * chord, axis=1) / np.maximum(np.sum(chord * chord, axis=1), 1e-12)
    return np.linalg.norm(step - share[:, None] * chord, axis=1), share


def _most_noise_m(points: Array, kept: Index) -> float:
    """Noise that cannot be exceeded, judged before anything is smoothed.

    Where most points lie on straights there is none. Where the points lie closest, noise makes
    the turn change sides from point to point more often than not; a drawn route, which has points
    close together because the road bends there, does not do that.
    """
    apart = np.linalg.norm(np.diff(points, axis=0), axis=1) > _SAME_PLACE_M
    distinct = points[np.concatenate(([True], apart))]
    if distinct.shape[0] < 3 or kept.size < 5:
        return 0.0
    aside, _ = _beside_chord(distinct)
    straight = 6.0 * float(np.quantile(aside, 0.7))
    return min(straight, _noise_from_alternation_m(points[kept]), _MOST_NOISE_M)


def _noise_from_alternation_m(knots: Array) -> float:
    """Bound on the noise from the third of the knots that lie closest: neighbouring deviations.

    White noise alone changes sides in 0.73 of the cases (all but 1/2 + asin(2/3)/pi).
    """
    step = np.linalg.norm(np.diff(knots, axis=0), axis=1)
    up = knots[1:-1] / np.linalg.norm(knots[1:-1], axis=1)[:, None]
    chord = knots[2:] - knots[:-2]
    side = np.sum(np.cross(chord, knots[1:-1] - knots[:-2]) * up, axis=1)
    side /= np.maximum(np.linalg.norm(chord, axis=1), 1e-9)
    share = step[:-1] / (step[:-1] + step[1:])
    product = -side[:-1] * side[1:] / (1.0 + share[:-1] - share[1:])
    close = step[1:-1] <= np.quantile(step[1:-1], 1.0 if step.size < 90 else 1 / 3)
    product = product[close]
    edge = np.quantile(np.abs(product), 0.8)
    variance = max(float(np.mean(np.clip(product, -edge, edge))), 0.0)
    alternating = float(np.mean(product > 0.0))
    # Noise greater than the steps makes the points go back and forth, and the sides meaningless.
    back = np.sum(np.diff(knots, axis=0)[1:] * np.diff(knots, axis=0)[:-1], axis=1)[1:] < 0.0
    alternating += float(np.mean(back[close]))
    bound = 2.5 * np.sqrt(variance) + 0.02 * float(np.median(step[1:-1][close]))
    return float(bound + _MOST_NOISE_M * np.clip((alternating - 0.5) / 0.08, 0.0, 1.0))


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


def _telling_points(points: Array) -> Index:
    """Indices of the points that are neither repeated nor on the straight between neighbours."""
    kept = np.arange(points.shape[0], dtype=np.intp)
    while kept.size > 2:
        aside, share = _beside_chord(points[kept])
        apart = np.linalg.norm(np.diff(points[kept], axis=0), axis=1)
        repeated = apart[:-1] < _SAME_PLACE_M
        idle = repeated | ((aside < _COLLINEAR_M) & (share >= 0.0) & (share <= 1.0))
        # Of a run of idle points every other one goes, then the rest are looked at again.
        first = np.flatnonzero(idle)
        if first.size == 0:
            break
        run = np.cumsum(np.concatenate(([True], np.diff(first) > 1)))
        start = first[np.searchsorted(run, run)]
        kept = np.delete(kept, first[(first - start) % 2 == 0] + 1)
    if kept.size == 2 and np.linalg.norm(points[kept[1]] - points[kept[0]]) < _SAME_PLACE_M:
        return kept[:1]
    return kept


def _smoothed(raw: Array, most_noise_m: float) -> _Smooth:
    """Places with the noise taken off, by weighted penalised changes of direction.

    The weights belong to changes of direction with heavy tails (Student's t), found by expectation
    and maximisation: few where the road bends, hardly any at a corner.
    """
    if raw.shape[0] < 5 or most_noise_m < 0.02:
        return _Smooth(raw, 0.0)
    origin = raw.mean(axis=0)
    raw = raw - origin
    place, noise = raw, 0.0
    weight = np.ones(raw.shape[0] - 2)
    for _ in range(_ROUNDS):
        step = np.linalg.norm(np.diff(place, axis=0), axis=1)
        step = np.maximum(step, 0.1 * np.median(step))
        change = _direction_change(step)
        stiffness = _likeliest_stiffness(raw, change * np.sqrt(weight))
        place, noise = _penalised(raw, change * np.sqrt(weight), stiffness, most_noise_m)
        weight = _weights(_apply(change, place), step, weight, stiffness, noise)
    return _Smooth(place + origin, noise)


def _direction_change(step: Array) -> Array:
    """Coefficients (3, K-2) of the change of direction over the root of the length it takes."""
    over = 1.0 / np.sqrt((step[1:] + step[:-1]) / 2)
    return np.stack([over / step[:-1], -over * (1 / step[:-1] + 1 / step[1:]), over / step[1:]])


def _apply(rows: Array, place: Array) -> Array:
    before, here, after = (row[:, None] for row in rows)
    return np.asarray(before * place[:-2] + here * place[1:-1] + after * place[2:])


def _weights(turn: Array, step: Array, weight: Array, stiffness: float, noise_m: float) -> Array:
    """Weights (K-2,) of the changes of direction: low where the road bends more than elsewhere."""
    if noise_m < 1e-4:
        return weight
    typical = noise_m**2 / stiffness
    length = ((step[1:] + step[:-1]) / 2) ** 3
    unknown = np.interp(np.log(stiffness * weight / length), _LOG_STIFF, _UNKNOWN) / weight
    level = np.sum(turn * turn, axis=1) / typical + unknown
    return np.asarray((_TAIL + 1.0) / (_TAIL + level))


def _unknown_share(log_stiffness: Array) -> Array:
    """Share of the prior variance of a change of direction that the points leave unknown.

    For evenly spaced points: the mean over all wavelengths of noise over noise and road.
    """
    wave = (2.0 - 2.0 * np.cos((np.arange(2000) + 0.5) * np.pi / 2000)) ** 2
    ratio = np.exp(log_stiffness)[:, None] * wave
    return np.asarray(np.mean(ratio / (1.0 + ratio), axis=1))


_LOG_STIFF = np.linspace(-20.0, 30.0, 101)
_UNKNOWN = _unknown_share(_LOG_STIFF)


def _normal_bands(rows: Array) -> Array:
    """Upper bands (3, K) of the matrix of the penalty."""
    count = rows.shape[1] + 2
    bands = np.zeros((3, count))
    bands[2, :-2] += rows[0] ** 2
    bands[2, 1:-1] += rows[1] ** 2
    bands[2, 2:] += rows[2] ** 2
    bands[1, 1:-1] += rows[0] * rows[1]
    bands[1, 2:] += rows[1] * rows[2]
    bands[0, 2:] += rows[0] * rows[2]
    return bands


def _solve(bands: Array, stiffness: float, raw: Array) -> tuple[Array, float]:
    """Smoothed places, and the log determinant of the system."""
    system = stiffness * bands
    system[2] += 1.0
    root = cholesky_banded(system, check_finite=False)
    return (
        cho_solve_banded((root, False), raw, check_finite=False),
        2.0 * float(np.sum(np.log(root[2]))),
    )


def _likeliest_stiffness(raw: Array, rows: Array) -> float:
    """Stiffness (m³ scale) with the greatest restricted likelihood."""
    bands = _normal_bands(rows)
    free = int(raw.shape[0]) - 2

    def unlikely(log_stiffness: float) -> float:
        try:
            place, log_determinant = _solve(bands, float(np.exp(log_stiffness)), raw)
        except LinAlgError:
            return np.inf
        left = max(float(np.sum(raw * (raw - place))), 1e-9)
        return free * (float(np.log(left)) - log_stiffness) + log_determinant

    scale = -np.log(np.median(bands[2]))
    grid = scale + np.log(10.0) * np.arange(-3.0, 9.0)
    values = [unlikely(float(at)) for at in grid]
    best = int(np.argmin(values))
    low, high = grid[max(best - 1, 0)], grid[min(best + 1, len(grid) - 1)]
    golden = (np.sqrt(5.0) - 1) / 2
    for _ in range(10):
        left, right = high - golden * (high - low), low + golden * (high - low)
        if unlikely(float(left)) < unlikely(float(right)):
            high = right
        else:
            low = left
    return float(np.exp((low + high) / 2))


def _penalised(
    raw: Array, rows: Array, stiffness: float, most_noise_m: float
) -> tuple[Array, float]:
    """Smoothed places and the noise; stiffness is lessened where the noise would be absurd."""
    bands = _normal_bands(rows)
    while True:
        place, _ = _solve(bands, stiffness, raw)
        noise = _noise_across(raw, place)
        if noise <= most_noise_m:
            return place, noise
        stiffness *= 0.3


def _noise_across(raw: Array, place: Array) -> float:
    """Standard deviation of the points across the line (along it, the step absorbs the noise)."""
    off = raw - place
    along = place[2:] - place[:-2]
    along /= np.maximum(np.linalg.norm(along, axis=1), 1e-9)[:, None]
    aside = off[1:-1] - np.sum(off[1:-1] * along, axis=1)[:, None] * along
    whole = float(np.sum(raw * off)) / max(float(np.sum(off * off)), 1e-12)
    return float(np.sqrt(np.sum(aside * aside) / (raw.shape[0] - 2) * max(whole, 1.0)))


def _arcs(place: Array, chord: Array, noise_m: float) -> tuple[Array, Array]:
    """Length (K-1,) of the road over each chord, and its curvature vector (K-1, 3).

    The road bulges where both ends of a chord turn the same way. A turn belongs to the chord
    beyond which the road turns on: within an even bend half of it to either side, at the end of a
    bend none to the straight. Where two turns stand alone the road between may be an even arc
    or a corner that fell between the points: the length is the mean of the two.
    """
    if chord.size == 1:
        return chord, np.zeros((1, 3))
    direction = np.diff(place, axis=0) / chord[:, None]
    change = np.diff(direction, axis=0)
    side = np.cross(direction[:-1], direction[1:])
    side = np.sum(side * place[1:-1], axis=1)
    reach = (chord[1:] + chord[:-1]) / 2
    # What the noise left in the places may make of a straight is not road.
    squared = np.sum(change * change, axis=1) - 2.0 * (noise_m / reach) ** 2
    turn = np.sign(side) * np.sqrt(np.maximum(squared, 0.0))
    curve = turn / reach
    # Two more at either end: beyond the first and the last point the road is straight.
    turn, curve = np.pad(turn, 2), np.pad(curve, 2)
    length = np.pad(chord, 1, mode="edge")
    way = np.sign(turn[1:-2])
    same = turn[1:-2] * turn[2:-1] > 0.0
    at_start = length[1:-1] * np.abs(curve[2:-1])
    at_start /= at_start + length[:-2] * np.maximum(way * curve[:-3], 0.0) + 1e-12
    at_end = length[1:-1] * np.abs(curve[1:-2])
    at_end /= at_end + length[2:] * np.maximum(way * curve[3:], 0.0) + 1e-12
    first = np.where(same, at_start * np.abs(turn[1:-2]), 0.0)
    last = np.where(same, at_end * np.abs(turn[2:-1]), 0.0)
    # More than a radian or two within a chord is a corner; a chord far longer than the next is a
    # straight, whose points were left out because they lay on it.
    trust = np.clip((2.0 - first - last) / 0.8, 0.0, 1.0)
    trust *= np.clip(2.5 - chord / np.minimum(length[:-2], length[2:]), 0.0, 1.0)
    first, last = trust * first, trust * last
    alone = np.clip((at_start * at_end - 0.25) / 0.75, 0.0, 1.0) / 2
    # First and last over the chord: an even arc has a third of the triangle's excess.
    excess = first * last / 2 * ((1 - alone) / 3 + alone)
    inward = np.concatenate((change[:1], change)) + np.concatenate((change, change[-1:]))
    inward -= np.sum(inward * direction, axis=1)[:, None] * direction
    size = (first + last) / chord / np.maximum(np.linalg.norm(inward, axis=1), 1e-12)
    return chord * (1.0 + excess), size[:, None] * inward


def _along_arcs(distance: Array, knot_distance: Array, place: Array, bend: Array) -> Array:
    """Places (N+1, 3) at given distances: on each chord, set out by its parabola."""
    k = np.clip(np.searchsorted(knot_distance, distance, side="right") - 1, 0, bend.shape[0] - 1)
    length = knot_distance[k + 1] - knot_distance[k]
    share = ((distance - knot_distance[k]) / length)[:, None]
    chord = place[k + 1] - place[k]
    squared = np.sum(chord * chord, axis=1)[:, None]
    return np.asarray(place[k] + share * chord - share * (1 - share) * squared / 2 * bend[k])


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
