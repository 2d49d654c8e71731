"""The course as ridden: laps, direction, parts, official length, what stands beside the road."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from pyproj import Geod

from pacing.course import CourseSpec, load_course
from pacing.errors import UnusableInputError

GEOD = Geod(ellps="WGS84")


def road(shape="loop", length_m=6000.0, spacing_m=15.0):
    """Points of an invented road: a circle, or a straight to the north-east."""
    way = np.arange(0.0, length_m + 1e-6, spacing_m)
    if shape == "loop":
        radius = length_m / (2 * np.pi)
        azimuth = 360.0 * way / length_m
        count = len(way)
        lon, lat, _ = GEOD.fwd([-2.0] * count, [53.0] * count, azimuth, [radius] * count)
    else:
        lon, lat, _ = GEOD.fwd([-2.0] * len(way), [53.0] * len(way), [45.0] * len(way), way)
    height = 80.0 + 25.0 * np.sin(2 * np.pi * way / length_m) + 6.0 * np.sin(way / 190.0)
    if shape == "loop":
        height = 80.0 + 25.0 * np.sin(2 * np.pi * way / length_m)
    return list(zip(map(float, lat), map(float, lon), map(float, height), strict=True))


@pytest.fixture
def straight(write, gpx):
    return CourseSpec(file=write(gpx(road("straight")), "straight.gpx"))


@pytest.fixture
def loop(write, gpx):
    return CourseSpec(file=write(gpx(road("loop")), "loop.gpx"))


def test_the_grid_is_uniform_and_its_arrays_fit_together(straight):
    course = load_course(straight)
    cells = course.cell_length_m
    assert len(cells) == round(course.length_m / 10.0)
    assert cells == pytest.approx(course.length_m / len(cells))
    for nodes in (course.lat_deg, course.lon_deg, course.elevation_m):
        assert nodes.shape == course.distance_m.shape
    for values in (course.gradient, course.heading_deg, course.crr_factor, course.wind_share):
        assert values.shape == cells.shape


def test_road_distance_includes_the_rise(write, gpx):
    # 3 km of geodesic at 12 %: the hypotenuse is sqrt(1 + 0.12²) longer.
    count = 301
    lon, lat, _ = GEOD.fwd([6.0] * count, [45.0] * count, [10.0] * count, np.arange(count) * 10.0)
    points = [(float(a), float(o), 1.2 * n) for n, (a, o) in enumerate(zip(lat, lon, strict=True))]
    course = load_course(CourseSpec(file=write(gpx(points))))
    assert course.length_m == pytest.approx(3000.0 * np.hypot(1.0, 0.12), rel=1e-5)
    assert course.report.length_horizontal_m == pytest.approx(3000.0, rel=1e-5)
    assert course.gradient == pytest.approx(0.12, rel=1e-3)
    assert course.heading_deg == pytest.approx(10.0, abs=0.05)
    assert course.report.climbing_m == pytest.approx(360.0, rel=1e-3)


def test_a_reversed_course_is_the_course_from_its_end(straight):
    there, back = load_course(straight), load_course(replace(straight, reverse=True))
    assert back.elevation_m == pytest.approx(there.elevation_m[::-1])
    assert back.gradient == pytest.approx(-there.gradient[::-1])
    assert back.lat_deg == pytest.approx(there.lat_deg[::-1])
    turned = (back.heading_deg - there.heading_deg[::-1]) % 360.0
    assert turned == pytest.approx(180.0, abs=1e-6)


def test_reversing_a_course_written_backwards_gives_the_course(write, gpx):
    points = road("straight")
    there = load_course(CourseSpec(file=write(gpx(points), "a.gpx")))
    again = load_course(CourseSpec(file=write(gpx(points[::-1]), "b.gpx"), reverse=True))
    assert again.length_m == pytest.approx(there.length_m, rel=1e-6)
    assert again.elevation_m == pytest.approx(there.elevation_m, abs=0.05)
    assert again.heading_deg == pytest.approx(there.heading_deg, abs=0.05)


def test_laps_repeat_length_climbing_headings_and_what_stands_beside(loop):
    spec = replace(
        loop,
        slow_points=(
            {"at_km": 1.0, "speed_kmh": 18.0, "note": "gate"},
            {"at_km": 7.5, "speed_kmh": 36.0, "every_lap": False, "length_m": 40.0},
        ),
        landmarks=({"at_km": 2.0, "name": "mill"},),
        stretches=({"from_km": 3.0, "to_km": 4.0, "crr_factor": 1.3, "wind_share": 0.5},),
    )
    one = load_course(replace(spec, slow_points=spec.slow_points[:1]))
    three = load_course(replace(spec, laps=3))
    assert three.length_m == pytest.approx(3 * one.length_m, rel=1e-9)
    assert three.lap_length_m == pytest.approx(one.length_m)
    assert three.report.climbing_m == pytest.approx(3 * one.report.climbing_m)
    for name in ("gradient", "heading_deg", "crr_factor", "wind_share"):
        assert getattr(three, name) == pytest.approx(np.tile(getattr(one, name), 3))
    lap = one.length_m
    assert [(p.at_m, p.speed_m_s, p.length_m, p.note) for p in three.slow_points] == [
        (pytest.approx(1000.0), pytest.approx(5.0), 15.0, "gate"),
        (pytest.approx(1000.0 + lap), pytest.approx(5.0), 15.0, "gate"),
        (7500.0, pytest.approx(10.0), 40.0, ""),
        (pytest.approx(1000.0 + 2 * lap), pytest.approx(5.0), 15.0, "gate"),
    ]
    assert [m.at_m for m in three.landmarks] == pytest.approx(
        [2000.0, 2000.0 + lap, 2000.0 + 2 * lap]
    )


def test_a_loop_joins_smoothly_in_height(loop):
    course = load_course(replace(loop, laps=2))
    cells = len(course.gradient) // 2
    assert course.elevation_m[cells] == pytest.approx(course.elevation_m[0], abs=1e-9)
    jump = np.abs(np.diff(course.gradient))
    assert jump[cells - 1] <= 3 * np.median(jump) + 1e-4


def test_a_drifting_recorder_does_not_leave_a_step_between_laps(write, gpx):
    points = [(lat, lon, ele + 8.0 * n / 400) for n, (lat, lon, ele) in enumerate(road("loop"))]
    course = load_course(CourseSpec(file=write(gpx(points)), laps=2))
    assert course.elevation_m[-1] == pytest.approx(course.elevation_m[0], abs=1e-6)
    assert np.max(np.abs(course.gradient)) < 0.03
    told = {repair.what: repair.amount for repair in course.report.repairs}
    assert told["start and finish brought to one height"].startswith("+8 m at the finish")
    # The middle of the heights within 30 m of either end, on a slope that takes 0.8 m off.
    assert course.report.cautions == (
        "the finish is where the start was, but 7 m higher: the heights drifted",
    )


def test_more_laps_of_a_course_that_does_not_close_are_refused(straight):
    with pytest.raises(UnusableInputError) as refused:
        load_course(replace(straight, laps=2))
    assert str(refused.value) == (
        "course.laps: more than one lap of a course whose finish is 6.00 km from its start; "
        "expected a closed course, its ends within 100 m. Cut one lap out with course.from_km "
        "and course.to_km, or set course.laps = 1."
    )


def test_a_part_of_the_course_keeps_its_heights_and_headings(straight):
    whole, part = load_course(straight), load_course(replace(straight, from_km=1.0, to_km=3.5))
    assert part.length_m == pytest.approx(2500.0, rel=1e-9)
    at = np.array([0.0, 800.0, 2500.0])
    assert np.interp(at, part.distance_m, part.elevation_m) == pytest.approx(
        np.interp(at + 1000.0, whole.distance_m, whole.elevation_m), abs=0.02
    )
    assert part.heading_deg == pytest.approx(45.0, abs=0.1)
    assert np.max(part.report.raw_distance_m) <= 2500.0


def test_a_part_counts_in_the_ridden_direction(straight):
    whole = load_course(straight)
    part = load_course(replace(straight, reverse=True, to_km=1.0))
    end = whole.length_m
    assert part.elevation_m[[0, -1]] == pytest.approx(
        np.interp([end, end - 1000.0], whole.distance_m, whole.elevation_m), abs=0.02
    )


@pytest.mark.parametrize(
    ("keys", "message"),
    [
        (
            {"from_km": 7.0},
            "course.from_km: 7; expected a place on the lap, 0 to 6.00 km.",
        ),
        (
            {"to_km": 6.5},
            "course.to_km: 6.5; expected a place on the lap, 0 to 6.00 km.",
        ),
        (
            {"from_km": 4.0, "to_km": 3.0},
            "course.from_km, course.to_km: 4 to 3 km; expected a part of at least 0.1 km, its "
            "start before its end.",
        ),
        (
            {"official_km": 7.0},
            "course.official_km: 7; expected within a tenth of the 6.00 km of one lap of the "
            "file. Give the measured length of one lap, or choose the part with course.from_km "
            "and course.to_km.",
        ),
        (
            {"surface": "gravel"},
            "course.surface: 'gravel'; expected one of smooth, average, coarse.",
        ),
        (
            {"slow_points": ({"at_km": 6.2, "speed_kmh": 10},)},
            "course.slow_points[0].at_km: 6.2; expected a place on the road, 0 to 6.00 km.",
        ),
        (
            {"landmarks": ({"at_km": -1.0, "name": "inn"},)},
            "course.landmarks[0].at_km: -1; expected a place on the road, 0 to 6.00 km.",
        ),
        (
            {"stretches": ({"from_km": 2.0, "to_km": 1.0, "wind_share": 0.5},)},
            "course.stretches[0]: 2 to 1 km; expected from_km below to_km.",
        ),
        (
            {"ignore_bends_km": (3.0,)},
            "course.ignore_bends[0]: no bend near km 3; expected the kilometre of a bend, within "
            "100 m. `pacing course` lists the bends.",
        ),
    ],
)
def test_a_key_that_does_not_fit_the_road_is_refused_in_plain_words(straight, keys, message):
    with pytest.raises(UnusableInputError) as refused:
        load_course(replace(straight, **keys))
    assert str(refused.value) == message


def test_the_official_length_rescales_distance_and_gradient_alike(straight):
    measured, official = load_course(straight), load_course(replace(straight, official_km=6.1))
    assert official.length_m == pytest.approx(6100.0, rel=1e-9)
    assert official.elevation_m[[0, -1]] == pytest.approx(measured.elevation_m[[0, -1]])
    assert official.report.climbing_m == pytest.approx(measured.report.climbing_m, rel=1e-3)
    assert np.max(official.gradient) == pytest.approx(
        np.max(measured.gradient) * measured.length_m / 6100.0, rel=1e-2
    )


def test_surface_and_stretches_set_rolling_and_wind_and_split_cells_in_proportion(straight):
    spec = replace(
        straight,
        surface="coarse",
        stretches=(
            {"from_km": 1.0, "to_km": 1.205, "crr_factor": 2.0},
            {"from_km": 2.0, "to_km": 3.0, "wind_share": 0.25},
        ),
    )
    course = load_course(spec)
    middle = (course.distance_m[1:] + course.distance_m[:-1]) / 2
    assert course.crr_factor[middle < 990.0] == pytest.approx(1.4)
    assert course.crr_factor[(middle > 1010.0) & (middle < 1190.0)] == pytest.approx(2.0)
    extra = float(np.sum((course.crr_factor - 1.4) * course.cell_length_m))
    assert extra == pytest.approx(0.6 * 205.0, rel=1e-6)
    assert course.wind_share[(middle > 2010.0) & (middle < 2990.0)] == pytest.approx(0.25)
    assert float(np.sum((1.0 - course.wind_share) * course.cell_length_m)) == pytest.approx(750.0)


def test_a_level_course_needs_no_heights_and_says_so(write, gpx):
    file = write(gpx([(lat, lon, None) for lat, lon, _ in road("straight")]))
    course = load_course(CourseSpec(file=file, flat=True))
    assert not course.gradient.any()
    assert course.report.verdict == "usable"
    assert course.report.cautions == ("ridden as level, at 0 m: course.flat is set",)


def test_the_net_height_from_start_to_finish_is_kept(straight):
    course = load_course(straight)
    first, last = road("straight")[0], road("straight")[-1]
    assert course.elevation_m[-1] - course.elevation_m[0] == pytest.approx(
        last[2] - first[2], abs=0.01
    )


def test_a_corner_at_the_start_line_is_met_on_every_lap(write, gpx):
    # A square of 1 km sides with corners of 20 m radius; the file begins in the middle of one.
    side, radius = 1000.0, 20.0
    way = np.arange(0.0, 4 * (side + np.pi / 2 * radius), 4.0)
    turn = np.zeros_like(way)
    for n in range(4):
        begun = n * (side + np.pi / 2 * radius) + side
        turn += 90.0 * np.clip((way - begun) / (np.pi / 2 * radius), 0.0, 1.0)
    heading = np.radians(turn)
    north, east = (
        np.concatenate([[0.0], np.cumsum(4.0 * f(heading[:-1]))]) for f in (np.cos, np.sin)
    )
    first = int(np.argmin(np.abs(turn - 45.0)))
    azimuth, distance = np.degrees(np.arctan2(east, north)), np.hypot(east, north)
    lon, lat, _ = GEOD.fwd(np.full(len(way), 3.0), np.full(len(way), 51.0), azimuth, distance)
    points = [(float(a), float(o), 20.0) for a, o in zip(lat, lon, strict=True)]
    points = [*points[first:], *points[: first + 1]]
    course = load_course(CourseSpec(file=write(gpx(points)), laps=3))
    lap = course.lap_length_m
    over_the_line = [b for b in course.bends if abs((b.at_m + lap / 2) % lap - lap / 2) < 30.0]
    assert len(over_the_line) == 3
    assert all(b.radius_m == pytest.approx(20.0, rel=0.25) for b in over_the_line)
    assert len(course.bends) == 12
