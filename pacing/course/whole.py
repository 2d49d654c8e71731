"""The whole line of a file as one smoothed road, before anything is turned or cut."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import CourseSpec, Repair
from pacing.course.extent import NoCourseError, refuse_long, refuse_short
from pacing.course.gaps import refuse_wide_gaps
from pacing.course.geodesy import along_m, unwrapped_deg
from pacing.course.heights import HeightProfile, smooth_heights
from pacing.course.lap import Lap
from pacing.course.line import Line, smooth_line
from pacing.course.loop import bends_of, ends_together, is_loop
from pacing.course.missing import refuse_missing_heights
from pacing.course.track import Track

Array = NDArray[np.float64]

CELL_M = 10.0
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
    worthwhile = not _is_hopeless(track, repairs, spec, length)
    line = smooth_line(track.lat_deg, track.lon_deg, grid_m=CELL_M)
    profile = _profile(track, line, spec, read=worthwhile)
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
                for bend in (bends_of(track, line) if worthwhile else ())
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


def _is_hopeless(
    track: Track, repairs: tuple[Repair, ...], spec: CourseSpec, length_m: float
) -> bool:
    """Whether the line, which may be of any length, is refused whatever its heights and bends."""
    return (spec.from_km is None and spec.to_km is None) and bool(
        refuse_long(length_m, spec.file)
        or refuse_wide_gaps(repairs, length_m, spec.file)
        or (not spec.flat and refuse_missing_heights(track, spec.file))
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
        returns=ends_together(line) and last - first == len(grid) - 1,
    )
    return replace(
        profile,
        distance_m=grid,
        elevation_m=np.interp(grid, grid[inside], profile.elevation_m),
    )


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
