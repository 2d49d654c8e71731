"""Whether a course file carries a plan: what to know before using it, what forbids it."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import CourseReport, CourseSpec
from pacing.course.extent import refuse_long
from pacing.course.gaps import BRIDGED, refuse_wide_gaps
from pacing.course.geodesy import distances_m
from pacing.course.lap import Lap
from pacing.course.missing import missing_share, refuse_missing_heights
from pacing.course.repair import OFF_THE_LINE, STOOD
from pacing.course.summary import steepest_stretch
from pacing.course.track import Track
from pacing.errors import UnusableInputError

Array = NDArray[np.float64]

MOST_PLACES_THROWN = 10
MOST_WANDERING = 0.10
MANY_STANDSTILLS = 3
STEEPEST_BELIEVED = 0.30
STEEP = 0.20
UNCERTAIN_PCT = 2.0
MUCH_BRIDGED = 0.015
SPARSE_M = 100.0
SAME_PLACE_M = 30.0
DRIFT_M = 5.0


@dataclass(frozen=True)
class Surveyed:
    """What the verdict is made from: the repaired points of the ridden part, the lap, the report.

    ``wandering`` is the share of the file's line that was drawn while standing still.
    """

    spec: CourseSpec
    track: Track
    wandering: float
    lap: Lap
    report: CourseReport


def refusals(found: Surveyed) -> tuple[UnusableInputError, ...]:
    """Why the course cannot be planned, the plainest reason first; empty if it can."""
    file = found.spec.file
    length = found.lap.length_m
    return tuple(
        reason
        for reason in (
            refuse_long(length * found.spec.laps, file),
            None if found.spec.flat else refuse_missing_heights(found.track, file),
            refuse_wide_gaps(found.report.repairs, length, file),
            _refuse_scattered_points(found),
            _refuse_walls(found),
        )
        if reason is not None
    )


def _refuse_scattered_points(found: Surveyed) -> UnusableInputError | None:
    thrown = sum(repair.what == OFF_THE_LINE for repair in found.report.repairs)
    if thrown <= MOST_PLACES_THROWN and found.wandering <= MOST_WANDERING:
        return None
    return UnusableInputError(
        f"the line is thrown far off at {thrown} places, and {100 * found.wandering:.0f} % of it "
        "wanders on the spot",
        file=found.spec.file,
        expected=f"at most {MOST_PLACES_THROWN} places and {100 * MOST_WANDERING:.0f} %",
        mend="draw the course in a route planner, or bring a recording with clear reception",
    )


def _refuse_walls(found: Surveyed) -> UnusableInputError | None:
    wall = steepest_stretch(found.lap.road_m, found.lap.elevation_m, 100.0)
    at, gradient = wall.middle_m, wall.gradient
    if abs(gradient) <= STEEPEST_BELIEVED:
        return None
    return UnusableInputError(
        f"a gradient of {100 * gradient:.0f} % over 100 m at km {at / 1000:.1f}",
        file=found.spec.file,
        expected=f"heights of a road, no steeper than {100 * STEEPEST_BELIEVED:.0f} %",
        mend="bring the course with heights from another source, say which in course.heights",
    )


def cautions(found: Surveyed) -> tuple[str, ...]:
    """What a user should know before riding by this course; empty if there is nothing."""
    return (
        *_cautions_on_line(found),
        *([_level(found)] if found.spec.flat else _cautions_on_heights(found)),
    )


def _level(found: Surveyed) -> str:
    return f"ridden as level, at {found.lap.elevation_m[0]:.0f} m: course.flat is set"


def _cautions_on_line(found: Surveyed) -> list[str]:
    words = []
    gaps = [repair for repair in found.report.repairs if repair.what == BRIDGED]
    if gaps:
        widest = max(gaps, key=lambda gap: gap.to_km - gap.from_km)
        words.append(
            f"{len(gaps)} gap{'s' * (len(gaps) > 1)} bridged by a straight line, the widest "
            f"{widest.amount} at km {widest.from_km:.1f}: bends and hills there are not known"
        )
    thrown = [repair for repair in found.report.repairs if repair.what == OFF_THE_LINE]
    if thrown:
        words.append(
            f"points thrown off the line at km {thrown[0].from_km:.1f}"
            f"{f' and {len(thrown) - 1} more places' if len(thrown) > 1 else ''} are left out "
            f"({thrown[0].amount}): check that the course is whole"
        )
    stood = sum(repair.what == STOOD for repair in found.report.repairs)
    if stood >= MANY_STANDSTILLS:
        words.append(
            f"the recorder stood still at {stood} places: bends close to them may be its wandering"
        )
    spacing = float(np.median(np.diff(1000.0 * found.track.read_km())))
    if spacing > SPARSE_M:
        words.append(f"points {spacing:.0f} m apart: bends and short hills between are not known")
    if found.spec.official_km is not None and abs(found.lap.scale - 1.0) > 0.02:
        words.append(
            f"the official length is {100 * (found.lap.scale - 1.0):+.1f} % from the file's line"
        )
    return words


def _cautions_on_heights(found: Surveyed) -> list[str]:
    words = []
    track, report = found.track, found.report
    gone = ~np.isfinite(track.elevation_m)
    if gone.any() and not gone.all():
        share, longest = missing_share(1000.0 * track.read_km(), gone)
        if share > 0.02 or longest > 300.0:
            words.append(
                f"heights missing on {100 * share:.0f} % of the way, up to {longest:.0f} m at a "
                "stretch, are interpolated"
            )
    bridged = [repair for repair in report.repairs if "no road has" in repair.what]
    way_km = sum(repair.to_km - repair.from_km for repair in bridged)
    if 1000.0 * way_km > MUCH_BRIDGED * found.lap.length_m:
        largest = max(bridged, key=lambda repair: repair.to_km - repair.from_km)
        words.append(
            f"humps and dips that no road has are bridged over {way_km:.1f} km, the longest at "
            f"km {largest.from_km:.1f}: is there really no such hill?"
        )
    if report.gradient_error_pct > UNCERTAIN_PCT:
        words.append(f"gradients over 100 m are known to {report.gradient_error_pct:.1f} % only")
    wall = steepest_stretch(found.lap.road_m, found.lap.elevation_m, 100.0)
    at, gradient = wall.middle_m, wall.gradient
    if STEEP < abs(gradient) <= STEEPEST_BELIEVED:
        words.append(
            f"100 m of {100 * gradient:.0f} % at km {at / 1000:.1f}: is the road really so steep?"
        )
    drift = _drift_m(found.track)
    if abs(drift) > DRIFT_M:
        side = "higher" if drift > 0 else "lower"
        words.append(
            f"the finish is where the start was, but {abs(drift):.0f} m {side}: the heights drifted"
        )
    height = found.lap.raw_elevation_m
    if height.size and not height.any():
        words.append("every height in the file is 0 m: is the course level?")
    return words


def _drift_m(track: Track) -> float:
    """How much higher [m] the heights end than they began at the same place; 0 elsewhere.

    Of the points within ``SAME_PLACE_M`` of either end the middle height counts.
    """
    ends = [0, -1]
    if distances_m(track.lat_deg[ends], track.lon_deg[ends])[0] > SAME_PLACE_M:
        return 0.0
    along = 1000.0 * track.read_km()
    near = (along <= along[0] + SAME_PLACE_M, along >= along[-1] - SAME_PLACE_M)
    first, last = (track.elevation_m[part & np.isfinite(track.elevation_m)] for part in near)
    return float(np.median(last) - np.median(first)) if first.size and last.size else 0.0


def judged(found: Surveyed) -> tuple[CourseReport, tuple[UnusableInputError, ...]]:
    """The report with its cautions, reasons and verdict, and the refusals themselves."""
    refused = refusals(found)
    warned = cautions(found)
    report = replace(
        found.report,
        cautions=warned,
        reasons=tuple(f"{reason.found}; expected {reason.expected}" for reason in refused),
        verdict="unusable" if refused else "usable" if warned else "good",
    )
    return report, refused
