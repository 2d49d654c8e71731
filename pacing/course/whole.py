"""The whole line of a file as one smoothed road, before anything is turned or cut."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import CourseSpec, Repair
from pacing.course.extent import refuse_short
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
    """The smoothed road, how its heights were found, and the repairs along it."""

    lap: Lap
    profile: HeightProfile
    repairs: tuple[Repair, ...]


def whole_road(track: Track, repairs: tuple[Repair, ...], spec: CourseSpec) -> WholeRoad:
    """Smooth the line and the heights of a repaired track.

    Where finish and start are one place passed in one direction, the road is a loop and its
    heights join. Raises UnusableInputError for a line too short to smooth.
    """
    too_short = refuse_short(float(along_m(track.lat_deg, track.lon_deg)[-1]), spec.file)
    if too_short is not None:
        raise too_short
    line = smooth_line(track.lat_deg, track.lon_deg, grid_m=CELL_M)
    profile = _profile(track, line, spec)
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
        replace(lap, raw_distance_m=point_road[known], raw_elevation_m=track.elevation_m[known]),
        profile,
        (
            *_moved(repairs, track.read_km(), point_road),
            *_moved(profile.repairs, lap.run_m / 1000.0, lap.road_m),
        ),
    )


def _profile(track: Track, line: Line, spec: CourseSpec) -> HeightProfile:
    """The heights on the line's grid; level where the user says so or none can be made out."""
    grid = line.distance_m
    if spec.flat or refuse_missing_heights(track, spec.file):
        known = track.elevation_m[np.isfinite(track.elevation_m)]
        height = float(known.mean()) if known.size else 0.0
        return HeightProfile(
            distance_m=grid,
            elevation_m=np.full(len(grid), height),
            source=LEVEL if spec.flat else UNKNOWN,
            noise_m=0.0,
            gradient_error_pct=0.0,
            smoothing_m=0.0,
        )
    return smooth_heights(
        line.point_distance_m,
        track.elevation_m,
        grid=grid,
        source=spec.heights,
        smoothing_m=spec.smoothing_m,
        timed=track.time_s is not None,
        closed=is_loop(line),
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
