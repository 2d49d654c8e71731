"""From what the race file says of a course to the Course on its grid."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Course, CourseReport, CourseSpec
from pacing.course.geodesy import distances_m, unwrapped_deg
from pacing.course.heights import HeightProfile, smooth_heights
from pacing.course.lap import Lap, closed_up, on_grid, part_of, rescaled, turned_round
from pacing.course.read import read_track
from pacing.course.repair import repair
from pacing.course.roadside import bends_kept, landmarks, slow_points, stretch_factors
from pacing.course.track import Track
from pacing.errors import UnusableInputError

Array = NDArray[np.float64]

CELL_M = 10.0
LONGEST_M = 1_000_000.0


def load_course(spec: CourseSpec, *, cell_m: float = CELL_M) -> Course:
    """Read, repair and smooth a course file and lay out the ride the race file describes.

    Of one lap, in this order: turned round, cut to its part, rescaled to the official length.
    Every distance the user gives or reads afterwards is along that lap.
    Raises UnusableInputError where the file or a key cannot be used.
    """
    file = Path(spec.file)
    track, repairs = repair(read_track(file, spec.track))
    lap, profile = _lap_of(track, spec, file)
    if spec.reverse:
        lap = turned_round(lap)
    lap = part_of(lap, _metres(spec.from_km), _metres(spec.to_km))
    if spec.laps > 1:
        lap = closed_up(lap)
    lap = rescaled(lap, _metres(spec.official_km))
    _refuse_too_long(lap.length_m * spec.laps, file)
    grid = on_grid(lap, cell_m)
    rolling, wind = stretch_factors(spec, grid.distance_m)
    laps, length = spec.laps, lap.length_m
    bends = bends_kept(lap.bends, spec, length)
    report = CourseReport(
        length_horizontal_m=float(lap.scale * lap.run_m[-1] * laps),
        climbing_raw_m=laps * _climbing_m(lap.raw_elevation_m),
        climbing_m=laps * _climbing_m(grid.elevation_m),
        height_source=profile.source,
        height_noise_m=profile.noise_m,
        gradient_error_pct=profile.gradient_error_pct,
        repairs=(*repairs, *profile.repairs),
        cautions=track.notes,
        raw_distance_m=lap.raw_distance_m,
        raw_elevation_m=lap.raw_elevation_m,
    )
    return Course(
        name=track.name,
        distance_m=np.linspace(0.0, laps * length, laps * len(grid.gradient) + 1),
        lat_deg=_nodes(grid.lat_deg, laps),
        lon_deg=_nodes(grid.lon_deg, laps),
        elevation_m=_nodes(grid.elevation_m, laps),
        gradient=np.tile(grid.gradient, laps),
        heading_deg=np.tile(grid.heading_deg, laps),
        crr_factor=np.tile(rolling, laps),
        wind_share=np.tile(wind, laps),
        lap_length_m=length,
        laps=laps,
        slow_points=slow_points(spec, length),
        bends=tuple(
            replace(bend, at_m=bend.at_m + n * length) for n in range(laps) for bend in bends
        ),
        landmarks=landmarks(spec, length),
        report=report,
    )


def _lap_of(track: Track, spec: CourseSpec, file: Path) -> tuple[Lap, HeightProfile]:
    """The whole line of the file as a smoothed lap."""
    at = np.concatenate([[0.0], np.cumsum(distances_m(track.lat_deg, track.lon_deg))])
    elevation = track.elevation_m
    if not np.isfinite(elevation).any():
        if not spec.flat:
            raise UnusableInputError(
                "no heights at all",
                file=file,
                expected="an elevation (<ele>) at the points",
                mend="add heights with a route planner, or set course.flat = true",
            )
        elevation = np.zeros(len(at))
    _refuse_too_long(at[-1], file)
    nodes = np.linspace(0.0, at[-1], max(1, round(at[-1] / CELL_M)) + 1)
    profile = smooth_heights(
        at,
        elevation,
        grid=nodes,
        source=spec.heights,
        smoothing_m=spec.smoothing_m,
        timed=track.time_s is not None,
    )
    every = np.union1d(nodes, at)
    lap = Lap(
        run_m=every,
        lat_deg=np.interp(every, at, track.lat_deg),
        lon_deg=np.interp(every, at, unwrapped_deg(track.lon_deg)),
        elevation_m=np.interp(every, nodes, profile.elevation_m),
        raw_distance_m=np.empty(0),
        raw_elevation_m=np.empty(0),
    )
    known = np.isfinite(elevation)
    road_at = np.interp(at[known], every, lap.road_m)
    return replace(lap, raw_distance_m=road_at, raw_elevation_m=elevation[known]), profile


def _refuse_too_long(length_m: float, file: Path) -> None:
    if length_m > LONGEST_M:
        raise UnusableInputError(
            f"{length_m / 1000:.0f} km",
            file=file,
            expected=f"a course of at most {LONGEST_M / 1000:.0f} km, all laps included",
            mend="choose a part with course.from_km and course.to_km",
        )


def _metres(km: float | None) -> float | None:
    return None if km is None else 1000.0 * km


def _climbing_m(elevation_m: Array) -> float:
    return float(np.sum(np.maximum(np.diff(elevation_m), 0.0)))


def _nodes(values: Array, laps: int) -> Array:
    """Node values (N+1,) of one lap repeated: the end of a lap is the start of the next."""
    return np.concatenate([*[values[:-1]] * laps, values[-1:]])
