"""The whole line of a file as one smoothed road, before anything is turned or cut."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.course.bends import find_bends
from pacing.course.course import CourseSpec, Repair
from pacing.course.extent import NoCourseError, refuse_long, refuse_short
from pacing.course.gaps import refuse_wide_gaps
from pacing.course.geodesy import along_m, distance_between_m, unwrapped_deg
from pacing.course.heights import HeightProfile, smooth_heights
from pacing.course.lap import Lap
from pacing.course.line import Line, smooth_line
from pacing.course.missing import refuse_missing_heights
from pacing.course.track import Track

Array = NDArray[np.float64]

CELL_M = 10.0
LOOP_WITHIN_M = 30.0
LOOP_TURN_DEG = 90.0
LEVEL, UNKNOWN = "level", "none"


@dataclass(frozen=True)
class WholeRoad:
    """The smoothed road, how its heights were found, its points and the repairs along it.

    ``point_road_m`` (P,) is the road distance of the points of ``track``.
    """

    lap: Lap
    profile: HeightProfile
    track: Track
    point_road_m: Array
    repairs: tuple[Repair, ...]

    def ridden(self, from_m: float, to_m: float) -> WholeRoad:
        """The same with only the points and the repairs of a part of the road."""
        inside = (self.point_road_m >= from_m - 1.0) & (self.point_road_m <= to_m + 1.0)
        if inside.all() or inside.sum() < 2:
            return self
        km = (from_m / 1000.0, to_m / 1000.0)
        return replace(
            self,
            track=self.track.kept(inside),
            point_road_m=self.point_road_m[inside],
            repairs=tuple(r for r in self.repairs if r.to_km >= km[0] and r.from_km <= km[1]),
        )


def whole_road(track: Track, repairs: tuple[Repair, ...], spec: CourseSpec) -> WholeRoad:
    """Smooth the line and the heights of a repaired track.

    Where finish and start are one place passed in one direction, the road is a loop and its
    heights join. Raises NoCourseError for a line too short to smooth or too long for a grid.
    """
    length = float(along_m(track.lat_deg, track.lon_deg)[-1])
    no_course = refuse_short(length, spec.file) or refuse_long(length, spec.file)
    if isinstance(no_course, NoCourseError):
        raise no_course
    whole = spec.from_km is None and spec.to_km is None
    hopeless = (
        refuse_long(length, spec.file)
        or refuse_wide_gaps(repairs, length, spec.file)
        or refuse_missing_heights(track, spec.file)
    )
    line = smooth_line(track.lat_deg, track.lon_deg, grid_m=CELL_M)
    # A line that is refused anyhow, and may be of any length, is not worth heights and bends.
    profile = _profile(track, line, spec, read=not (whole and hopeless))
    lap = Lap(
        run_m=line.distance_m,
        lat_deg=line.lat_deg,
        lon_deg=unwrapped_deg(line.lon_deg),
        elevation_m=profile.elevation_m,
        raw_distance_m=np.empty(0),
        raw_elevation_m=np.empty(0),
    )
    point_road = np.interp(line.point_distance_m, lap.run_m, lap.road_m)
    known = np.isfinite(track.elevation_m) & (profile.source not in (LEVEL, UNKNOWN))
    return WholeRoad(
        lap=replace(
            lap,
            raw_distance_m=point_road[known],
            raw_elevation_m=track.elevation_m[known],
            bends=tuple(
                replace(bend, at_m=float(np.interp(bend.at_m, lap.run_m, lap.road_m)))
                for bend in (() if whole and hopeless else find_bends(line))
            ),
        ),
        profile=profile,
        track=track,
        point_road_m=point_road,
        repairs=(
            *_moved(repairs, track.read_km(), point_road),
            *_moved(profile.repairs, lap.run_m / 1000.0, lap.road_m),
        ),
    )


def _profile(track: Track, line: Line, spec: CourseSpec, *, read: bool) -> HeightProfile:
    """The heights on the line's grid; level where the user says so or none can be made out."""
    grid = line.distance_m
    known = track.elevation_m[np.isfinite(track.elevation_m)]
    if spec.flat or not read or known.size < 2:
        height = float(known.mean()) if known.size else 0.0
        return HeightProfile(
            distance_m=grid,
            elevation_m=np.full(len(grid), height),
            source=LEVEL if spec.flat else UNKNOWN,
            noise_m=0.0,
            gradient_error_pct=0.0,
            smoothing_m=0.0,
        )
    # Beyond the first and the last height known the road is taken as level.
    at = line.point_distance_m[np.isfinite(track.elevation_m)]
    first = int(np.searchsorted(grid, at[0], side="right")) - 1
    last = max(int(np.searchsorted(grid, at[-1])), first + 1)
    inside = slice(first, last + 1)
    profile = smooth_heights(
        line.point_distance_m,
        track.elevation_m,
        grid=grid[inside],
        source=spec.heights,
        smoothing_m=spec.smoothing_m,
        timed=track.time_s is not None,
        closed=is_loop(line) and last - first == len(grid) - 1,
    )
    return replace(
        profile,
        distance_m=grid,
        elevation_m=np.interp(grid, grid[inside], profile.elevation_m),
    )


def is_loop(line: Line) -> bool:
    """Whether the line ends where it began and passes on in the direction it set out."""
    gap = distance_between_m(line.lat_deg[-1], line.lon_deg[-1], line.lat_deg[0], line.lon_deg[0])
    turn = abs((line.heading_deg[0] - line.heading_deg[-1] + 180.0) % 360.0 - 180.0)
    return gap <= LOOP_WITHIN_M and bool(turn <= LOOP_TURN_DEG)


def _moved(repairs: tuple[Repair, ...], km: Array, road_m: Array) -> tuple[Repair, ...]:
    """Repairs from kilometres of one kind (M,) to the road distance (M,) [m] of the lap."""
    return tuple(
        replace(
            repair,
            from_km=float(np.interp(repair.from_km, km, road_m)) / 1000.0,
            to_km=float(np.interp(repair.to_km, km, road_m)) / 1000.0,
        )
        for repair in repairs
    )
