"""A ride laid along the course: where on it the rider was at every sample."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import uniform_filter1d
from scipy.spatial import cKDTree

from pacing.course.course import Course
from pacing.course.geodesy import unwrapped_deg
from pacing.errors import UnusableInputError
from pacing.field.debrief_track import Line, follow
from pacing.field.recording_check import Ride
from pacing.field.recording_place import on_plane_m

Array = NDArray[np.float64]

NEAR_M = 35.0
SAME_WAY_DEG = 70.0
MOST_TRIED = 8
LEAST_COVERED_M = 500.0
FEWEST_CELLS = 5
AT_THE_LINE_M = 5.0
SMOOTH_SAMPLES = 21
LENGTHS_ALIKE = 0.04


@dataclass(frozen=True)
class Matched:
    """Where a ride was along the course.

    ``at_m`` (n,) is the distance along the course at every sample, never falling, NaN before and
    after it; ``node_s`` (N+1,) when each node was passed, NaN outside ``from_node`` to
    ``to_node``. ``off_m`` is how far off the line it usually was.
    """

    at_m: Array
    node_s: Array
    from_node: int
    to_node: int
    off_m: float
    notes: tuple[str, ...] = ()

    @property
    def whole(self) -> bool:
        """Whether the course was ridden from start to finish."""
        return self.from_node == 0 and self.to_node == self.node_s.size - 1


def match_ride(ride: Ride, course: Course) -> Matched:
    """Lay a ride along the course by position, laps and out-and-back included.

    A ride may begin before the line and go on beyond the finish; where it passes the start
    several times the pass that covers most is taken, of equals the fastest. Without positions
    the distances are compared. Raises `UnusableInputError` where they have nothing in common.
    """
    if not ride.placed:
        return _by_distance(ride, course)
    line = _line(ride, course)
    best: _Pass | None = None
    for first, at in _beginnings(line, ride):
        found = _ridden_from(line, ride, first, at)
        if found is not None and (best is None or found.better_than(best)):
            best = found
    if best is None or best.covered_m < min(LEAST_COVERED_M, 0.5 * course.length_m):
        raise _refusal(ride, course)
    matched = _matched(ride, course, best)
    if matched.to_node - matched.from_node < FEWEST_CELLS:
        raise _refusal(ride, course)
    return matched


def _refusal(ride: Ride, course: Course) -> UnusableInputError:
    return UnusableInputError(
        "the ride does not follow the course",
        file=ride.recording.name,
        expected=f"a ride within {NEAR_M:.0f} m of {course.name or 'the course'}",
        mend="check course.file, course.reverse and course.laps in the race file",
    )


class _Pass(NamedTuple):
    """Samples followed along the course from one beginning; NaN where off it."""

    along_m: Array
    off_m: float
    covered_m: float
    lasted_s: float

    def better_than(self, other: _Pass) -> bool:
        """More of the course, or as much of it (within 1 %) in less time."""
        if abs(self.covered_m - other.covered_m) > 0.01 * other.covered_m:
            return self.covered_m > other.covered_m
        return self.lasted_s < other.lasted_s


def _line(ride: Ride, course: Course) -> Line:
    """Course and ride on one plane."""
    lon = unwrapped_deg(course.lon_deg)
    origin = (float(course.lat_deg[0]), float(lon[0]))
    east, north = on_plane_m(course.lat_deg, lon, *origin)
    recording = ride.recording
    thrown = ~np.isfinite(ride.east_m)
    ride_lon = np.where(thrown, np.nan, recording.lon_deg)
    ride_lon = origin[1] + (ride_lon - origin[1] + 180.0) % 360.0 - 180.0
    x, y = on_plane_m(np.where(thrown, np.nan, recording.lat_deg), ride_lon, *origin)
    return Line(course.distance_m, east, north, course.heading_deg, x, y)


def _beginnings(line: Line, ride: Ride) -> list[tuple[int, float]]:
    """Samples (and distances along the course) from which the ride may follow the course.

    Every pass of the start in the right direction; without any, the first place in common.
    """
    known = np.isfinite(line.ride_east_m)
    near = known & (
        np.hypot(line.ride_east_m - line.east_m[0], line.ride_north_m - line.north_m[0]) < NEAR_M
    )
    near &= ride.stopped | _same_way(ride.heading_deg, line.heading_deg[0])
    found: list[tuple[int, float]] = []
    change = np.diff(np.concatenate([[0], near.astype(np.int8), [0]]))
    for a, b in zip(np.flatnonzero(change == 1), np.flatnonzero(change == -1), strict=True):
        off = np.hypot(
            line.ride_east_m[a:b] - line.east_m[0], line.ride_north_m[a:b] - line.north_m[0]
        )
        # Of a wait at the line its end: the last of the samples that are about as near as any.
        closest = np.flatnonzero(off <= np.min(off) + AT_THE_LINE_M)[-1]
        found.append((int(a + closest), 0.0))
    return found[:MOST_TRIED] + _anywhere(line, ride, known)[: MOST_TRIED if not found else 2]


def _anywhere(line: Line, ride: Ride, known: NDArray[np.bool_]) -> list[tuple[int, float]]:
    """Places of the course near the first samples that are on it."""
    tree = cKDTree(np.column_stack([line.east_m[:-1], line.north_m[:-1]]))
    moving = np.flatnonzero(known & ~ride.stopped)
    thin = moving[:: max(1, moving.size // 400)]
    for sample in thin.tolist():
        here = (line.ride_east_m[sample], line.ride_north_m[sample])
        cells = np.array(sorted(tree.query_ball_point(here, NEAR_M)), dtype=int)
        if cells.size == 0:
            continue
        cells = cells[_same_way(line.heading_deg[cells], ride.heading_deg[sample])]
        if cells.size == 0:
            continue
        parts = np.split(cells, np.flatnonzero(np.diff(cells) > 10) + 1)
        off = np.hypot(line.east_m - here[0], line.north_m - here[1])
        nearest = [int(part[np.argmin(off[part])]) for part in parts]
        return [(sample, float(line.distance_m[cell])) for cell in nearest]
    return []


def _same_way(heading_deg: Array, other_deg: Array | float) -> NDArray[np.bool_]:
    turn = np.abs((np.asarray(heading_deg) - other_deg + 180.0) % 360.0 - 180.0)
    return np.asarray(turn <= SAME_WAY_DEG)


def _ridden_from(line: Line, ride: Ride, first: int, at_m: float) -> _Pass | None:
    along, off = follow(line, ride.travelled_m, ride.time_s, first, at_m, near_m=NEAR_M)
    good = np.flatnonzero(np.isfinite(along))
    if good.size < 3:
        return None
    covered = float(np.max(along[good]) - np.min(along[good]))
    lasted = float(ride.time_s[good[-1]] - ride.time_s[good[0]])
    return _Pass(along, off, covered, lasted)


def _matched(ride: Ride, course: Course, found: _Pass) -> Matched:
    """Smooth places along the course, tie the start, read off when the nodes were passed."""
    length = course.length_m
    good = np.isfinite(found.along_m)
    index = np.flatnonzero(good)
    inner = index[(found.along_m[index] > 1.0) & (found.along_m[index] < length - 1.0)]
    inner = inner if inner.size >= 3 else index
    offset = found.along_m[inner] - ride.travelled_m[inner]
    wide = min(SMOOTH_SAMPLES, inner.size if inner.size % 2 else inner.size - 1)
    smooth = uniform_filter1d(offset, wide, mode="nearest")
    offset = _unbent_ends(offset, smooth, wide)
    # A sample or two beyond either end, so that passing the line can be told between samples.
    samples = np.arange(ride.time_s.size)
    reach = slice(max(int(inner[0]) - 60, 0), int(inner[-1]) + 61)
    along = np.full(samples.size, np.nan)
    along[reach] = ride.travelled_m[reach] + np.interp(samples[reach], inner, offset)
    along[reach] = np.maximum.accumulate(along[reach])
    time, place = ride.time_s[reach], along[reach]
    node_s = np.full(course.distance_m.size, np.nan)
    inside = (course.distance_m >= place[0] - 1.0) & (course.distance_m <= place[-1] + 1.0)
    rising = np.concatenate([[True], np.diff(place) > 1e-9])
    node_s[inside] = np.interp(course.distance_m[inside], place[rising], time[rising])
    nodes = np.flatnonzero(inside)
    first, last = int(nodes[0]), int(nodes[-1])
    if first == 0:
        node_s[0] = _start_s(ride, along, float(node_s[0]))
    along = np.where((along < -1.0) | (along > length + 1.0), np.nan, np.clip(along, 0.0, length))
    notes = []
    if not (first == 0 and last == node_s.size - 1):
        from_km, to_km = course.distance_m[first] / 1000.0, course.distance_m[last] / 1000.0
        notes.append(f"the ride covers km {from_km:.1f} to {to_km:.1f} of the course only")
    return Matched(along, node_s, first, last, found.off_m, tuple(notes))


def _unbent_ends(offset: Array, smooth: Array, wide: int) -> Array:
    """Running means near the ends over what is there on both sides alike."""
    half = wide // 2
    result = smooth.copy()
    for k in range(min(half, offset.size // 2)):
        result[k] = offset[: 2 * k + 1].mean()
        result[-1 - k] = offset[offset.size - 1 - 2 * k :].mean()
    return result


def _start_s(ride: Ride, along: Array, passed_s: float) -> float:
    """When the ride set off: from a standstill at the line, else when the line was passed."""
    near = np.isfinite(along) & (np.abs(along) <= AT_THE_LINE_M) & ride.stopped
    if not near.any():
        return passed_s
    return float(ride.time_s[np.flatnonzero(near)[-1]])


def _by_distance(ride: Ride, course: Course) -> Matched:
    """A ride without positions, from its first metre on, stretched to the course's length."""
    travelled = ride.travelled_m - ride.travelled_m[0]
    ratio = course.length_m / max(float(travelled[-1]), 1.0)
    if ratio > 1.0 + LENGTHS_ALIKE:
        ratio = 1.0
    elif ratio < 1.0 - LENGTHS_ALIKE:
        raise UnusableInputError(
            f"{travelled[-1] / 1000:.1f} km without positions",
            file=ride.recording.name,
            expected=f"the {course.length_m / 1000:.1f} km of the course, or a ride with positions",
        )
    along = np.minimum(ratio * travelled, course.length_m)
    rising = np.concatenate([[True], np.diff(along) > 1e-9])
    node_s = np.interp(course.distance_m, along[rising], ride.time_s[rising])
    last = int(np.searchsorted(course.distance_m, along[-1] + 1.0, side="right")) - 1
    node_s[last + 1 :] = np.nan
    if last < FEWEST_CELLS:
        raise _refusal(ride, course)
    notes = (f"no positions: laid along the course by distance, stretched by {ratio:.4f}",)
    return Matched(along, node_s, 0, last, 0.0, notes)
