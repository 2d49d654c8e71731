"""Every recorded course file ends in the verdict a coach would give it.

Lengths: the sum of WGS84 geodesics between the points (pyproj) where the line is clean; for the
phone in the city that sum after a Gaussian of 5 m along the line; where points are thrown far off,
without them.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import pytest

from pacing.course import CourseSpec, load_course
from pacing.course.load import survey_course
from pacing.course.summary import steepest_stretch
from pacing.errors import UnusableInputError


class Expected(NamedTuple):
    """What a file must come to: verdict, km, repairs and words of the cautions or the refusal."""

    verdict: str
    km: float
    repairs: tuple[tuple[str, str], ...] = ()
    says: tuple[str, ...] = ()
    track: int | None = None
    within: float = 0.005
    why: str = ""


MERGED, GAP, THROWN = "repeated points merged", "gap bridged", "points far off the line left out"
STOOD, SEGMENTS = "wandering at a standstill", "segments joined"
COURSES = {
    "ridge_climb_48km_no_time": Expected(
        "good", 48.26, ((MERGED, "3 points"),), why="planned on a map, clean"
    ),
    "rolling_170km": Expected(
        "good", 170.34, ((MERGED, "5 points"),), why="dense and clean; the finish really is steep"
    ),
    "flat_coast_175km": Expected(
        "good", 174.72, ((MERGED, "5 points"),), why="below sea level is no fault there"
    ),
    "valley_167km_duplicates": Expected(
        "good", 167.26, ((MERGED, "154 points"),), why="the same point twice costs nothing"
    ),
    "out_back_13km_track_and_route": Expected(
        "good", 12.82, why="one track; the route beside it is empty"
    ),
    "rolling_87km_partial_elevation": Expected(
        "good", 17.98, track=2, why="its second track is whole"
    ),
    "alpine_113km_tunnel_spikes": Expected(
        "usable",
        113.42,
        (("hump no road has, as over a tunnel", "above the road"),),
        ("humps and dips that no road has are bridged",),
        why="tunnels and gorges were guessed to be level: one should look",
    ),
    "city_circuit_54km_jumps": Expected(
        "usable",
        54.21,
        ((MERGED, "35 points"), (GAP, "540 m"), (GAP, "436 m")),
        ("2 gaps", "540 m"),
        why="the road of two jumps is not known",
    ),
    "coast_road_123km_very_noisy": Expected(
        "usable", 123.06, ((MERGED, "89 points"),), why="height cliffs and spikes of a bad recorder"
    ),
    "southern_coast_98km_duplicates": Expected(
        "usable",
        97.89,
        ((MERGED, "583 points"), (GAP, "1.6 km"), (GAP, "1.1 km")),
        ("2 gaps", "1.6 km"),
        why="two gaps of more than a kilometre, and coarse heights",
    ),
    "railtrail_out_back_28km": Expected(
        "usable", 27.73, ((STOOD, "23 points"),), why="a hand-held logger's heights"
    ),
    "city_12km_gpx10_duplicates": Expected(
        "usable",
        11.44,
        ((MERGED, "205 points"), (STOOD, "49 points")),
        ("stood still at 22 places",),
        why="many stops at lights, drawn as knots",
    ),
    "valley_gps_spikes_123km": Expected(
        "usable",
        1.88,
        ((THROWN, "1 point, up to 60.4 km off"),),
        ("thrown off the line",),
        within=0.04,  # a walk round corners: a Gaussian of 2 m gives 1.95 km, one of 5 m 1.81
        why="but for two points in another town this is a walk of 2 km",
    ),
    "loop_11km_route_only": Expected(
        "usable", 11.20, says=("points 244 m apart",), why="46 points say nothing of its bends"
    ),
    "alps_1442km_route_only": Expected(
        "unusable",
        1442.16,
        says=("km of road", "at most 1,000 km"),
        within=0.01,  # points 119 m apart: the bends between may or may not be cut
        why="no race is so long",
    ),
    "plains_1599km_32_segments": Expected(
        "unusable",
        1639.0,
        ((SEGMENTS, "32 segments, up to 12.8 km apart"),),
        ("at most 1,000 km", "a gap of 12.8 km at km 997"),
        why="too long, and gaps of 12.8 km; length with the gaps bridged",
    ),
    "flat_41km_no_elevation": Expected(
        "unusable", 40.84, says=("no heights at all",), why="a plan needs heights, or a word"
    ),
    "metropolis_51km_noisy": Expected(
        "unusable",
        np.nan,
        ((THROWN, "22 points, up to 3.2 km off"), (GAP, "2.1 km")),
        ("a gap of 2.1 km", "thrown far off at 20 places"),
        why="underground and among towers there is no line to trust, nor a length",
    ),
}
REFUSED = {
    "continental_4630km": "5 tracks that do not join: 1 track 1530.7 km,",
    "rolling_87km_partial_elevation": "2 tracks that do not join: 1 track 94.2 km,",
    "truncated_malformed": "line 4: the file is cut off inside <wpt>;",
}


@pytest.fixture(scope="module")
def surveyed(recorded_courses):
    """Surveys a file once for all tests of this module."""
    done = {}

    def survey(name, **keys):
        key = (name, tuple(keys.items()))
        if key not in done:
            file = recorded_courses / f"{name}.gpx"
            done[key] = survey_course(CourseSpec(file=file, **keys))
        return done[key]

    return survey


def test_every_recorded_file_is_in_the_table(recorded_courses):
    assert {file.stem for file in recorded_courses.glob("*.gpx")} == {*COURSES, *REFUSED}


@pytest.mark.parametrize("name", COURSES)
def test_a_recorded_course_ends_in_its_verdict_with_its_length_and_repairs(surveyed, name):
    expected = COURSES[name]
    survey = surveyed(name, track=expected.track)
    report = survey.course.report
    assert report.verdict == expected.verdict, (report.reasons, report.cautions)
    assert bool(survey.refusals) == (expected.verdict == "unusable")
    if np.isfinite(expected.km):
        measured = report.length_horizontal_m / 1000.0
        assert measured == pytest.approx(expected.km, rel=expected.within)
    found = [(repair.what, repair.amount) for repair in report.repairs]
    for what, amount in expected.repairs:
        assert any(w.startswith(what) and amount in a for w, a in found), (what, amount, found)
    words = " ".join((*report.reasons, *report.cautions))
    for said in expected.says:
        assert said in words


@pytest.mark.parametrize("name", REFUSED)
def test_a_recorded_file_without_one_course_in_it_is_refused(surveyed, name):
    with pytest.raises(UnusableInputError) as refused:
        surveyed(name)
    assert REFUSED[name] in str(refused.value)


def test_a_track_with_a_gap_of_25_km_is_refused_with_place_and_size(recorded_courses):
    file = recorded_courses / "rolling_87km_partial_elevation.gpx"
    survey = survey_course(CourseSpec(file=file, track=1))
    assert any("a gap of 25.3 km at km 32" in reason for reason in survey.course.report.reasons)


def test_a_part_without_the_gap_can_be_ridden(recorded_courses):
    file = recorded_courses / "rolling_87km_partial_elevation.gpx"
    course = load_course(CourseSpec(file=file, track=1, from_km=60.0))
    # The second segment is 36.1 km long; the gap ends at km 58.1.
    assert course.length_m == pytest.approx(94_210.0 - 60_000.0, rel=5e-3)
    assert np.ptp(course.elevation_m) > 50.0


def test_the_course_without_heights_can_be_ridden_as_level(recorded_courses):
    course = load_course(
        CourseSpec(file=recorded_courses / "flat_41km_no_elevation.gpx", flat=True)
    )
    assert course.report.verdict == "usable"
    assert not course.gradient.any()


def _steepest_pct(course, length_m=100.0):
    return 100.0 * abs(steepest_stretch(course.distance_m, course.elevation_m, length_m).gradient)


def test_tunnels_and_gorges_leave_no_wall_on_the_alpine_road(surveyed):
    assert _steepest_pct(surveyed("alpine_113km_tunnel_spikes", track=None).course) <= 16.0


def test_the_steep_finish_of_the_rolling_stage_survives(surveyed):
    course = surveyed("rolling_170km", track=None).course
    end = course.distance_m > course.length_m - 2000.0
    last = steepest_stretch(
        course.distance_m[end] - course.distance_m[end][0], course.elevation_m[end], 100.0
    )
    assert 100.0 * last.gradient >= 15.0


STEEPEST_PCT = {
    # Common practice, no source: what roads of such country do over 100 m and over 1 km.
    "ridge_climb_48km_no_time": (8.0, 20.0, 12.0),
    "rolling_170km": (15.0, 18.0, 12.0),
    "flat_coast_175km": (1.0, 5.0, 2.0),
    "valley_167km_duplicates": (12.0, 18.0, 14.5),
    "alpine_113km_tunnel_spikes": (11.0, 16.0, 12.0),
    "city_circuit_54km_jumps": (6.0, 13.0, 9.0),
}


@pytest.mark.parametrize("name", STEEPEST_PCT)
def test_the_steepest_parts_are_those_of_a_road(surveyed, name):
    course = surveyed(name, track=None).course
    least, most, most_over_a_km = STEEPEST_PCT[name]
    assert least <= _steepest_pct(course) <= most
    assert _steepest_pct(course, 1000.0) <= most_over_a_km


@pytest.mark.parametrize(
    "name", [name for name, e in COURSES.items() if e.verdict != "unusable" and e.track is None]
)
def test_a_recorded_course_ridden_backwards_is_as_long_and_falls_what_it_rose(surveyed, name):
    there = surveyed(name, track=None).course
    back = surveyed(name, track=None, reverse=True).course
    assert back.length_m == pytest.approx(there.length_m, rel=1e-9)
    net = there.elevation_m[-1] - there.elevation_m[0]
    fallen = there.report.climbing_m - net
    assert back.report.climbing_m == pytest.approx(fallen, rel=1e-6, abs=1e-3)
