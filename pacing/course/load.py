"""From what the race file says of a course to the Course on its grid."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Course, CourseReport, CourseSpec
from pacing.course.lap import Grid, Lap, closed_up, on_grid, part_of, rescaled, turned_round
from pacing.course.read import read_track
from pacing.course.repair import STOOD, repair
from pacing.course.roadside import bends_kept, landmarks, slow_points, stretch_factors
from pacing.course.verdict import Surveyed, judged
from pacing.course.whole import CELL_M, whole_road
from pacing.errors import UnusableInputError

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Survey:
    """A course, and why it may not be used: ``refusals`` is empty where it may."""

    course: Course
    refusals: tuple[UnusableInputError, ...]


def load_course(spec: CourseSpec, *, cell_m: float = CELL_M) -> Course:
    """Read, repair and smooth a course file and lay out the ride the race file describes.

    Of one lap, in this order: turned round, cut to its part, rescaled to the official length.
    Every distance the user gives or reads afterwards is along that lap. ``cell_m`` is the length
    of a cell, near enough that cells divide the lap. Raises UnusableInputError where the file or
    a key cannot be used.
    """
    survey = survey_course(spec, cell_m=cell_m)
    if survey.refusals:
        raise survey.refusals[0]
    return survey.course


def survey_course(spec: CourseSpec, *, cell_m: float = CELL_M) -> Survey:
    """As ``load_course``, but a course that could be read is returned whatever its verdict."""
    track, repairs = repair(read_track(spec.file, spec.track))
    whole = whole_road(track, repairs, spec)
    lap = _as_ridden(whole.lap, spec)
    ridden = whole.ridden(*_bounds_m(whole.lap.length_m, spec))
    grid = on_grid(lap, cell_m)
    report = CourseReport(
        length_horizontal_m=float(lap.scale * lap.run_m[-1] * spec.laps),
        climbing_raw_m=spec.laps * climbing_m(lap.raw_elevation_m),
        climbing_m=spec.laps * climbing_m(grid.elevation_m),
        height_source=whole.profile.source,
        height_noise_m=whole.profile.noise_m,
        gradient_error_pct=whole.profile.gradient_error_pct,
        repairs=ridden.repairs,
        raw_distance_m=lap.raw_distance_m,
        raw_elevation_m=lap.raw_elevation_m,
    )
    stood_km = sum(r.to_km - r.from_km for r in repairs if r.what == STOOD)
    wandering = stood_km / float(track.read_km()[-1])
    report, refused = judged(Surveyed(spec, ridden.track, wandering, lap, report))
    return Survey(_course(spec, track.name, lap, grid, report), refused)


def climbing_m(elevation_m: Array) -> float:
    """Sum of all rises [m] between consecutive heights (M,) [m]."""
    return float(np.sum(np.maximum(np.diff(elevation_m), 0.0)))


def _bounds_m(length_m: float, spec: CourseSpec) -> tuple[float, float]:
    """From where to where [m] in the direction of the file the lap is ridden."""
    start = 1000.0 * (spec.from_km or 0.0)
    end = length_m if spec.to_km is None else 1000.0 * spec.to_km
    return (length_m - end, length_m - start) if spec.reverse else (start, end)


def _as_ridden(lap: Lap, spec: CourseSpec) -> Lap:
    """One lap turned, cut, closed if it is ridden again, and rescaled, as the race file says."""
    if spec.reverse:
        lap = turned_round(lap)
    lap = part_of(lap, _metres(spec.from_km), _metres(spec.to_km))
    if spec.laps > 1:
        lap = closed_up(lap)
    return rescaled(lap, _metres(spec.official_km))


def _course(spec: CourseSpec, name: str, lap: Lap, grid: Grid, report: CourseReport) -> Course:
    """All laps of the course, with what stands beside the road."""
    laps, length = spec.laps, lap.length_m
    rolling, wind = stretch_factors(spec, grid.distance_m)
    bends = bends_kept(lap.bends, spec, length)
    return Course(
        name=name,
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
            replace(bend, at_m=bend.at_m + lap_number * length)
            for lap_number in range(laps)
            for bend in bends
        ),
        landmarks=landmarks(spec, length),
        report=report,
    )


def _metres(km: float | None) -> float | None:
    return None if km is None else 1000.0 * km


def _nodes(values: Array, laps: int) -> Array:
    """Node values (N+1,) of one lap repeated: the end of a lap is the start of the next."""
    return np.concatenate([*[values[:-1]] * laps, values[-1:]])
