"""A ride laid along its course: laps, out and back, the line passed more than once."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pandas as pd
import pytest

from pacing.course import Course
from pacing.field.debrief_match import match_ride
from pacing.field.recording import recording_of_frame
from pacing.field.recording_check import check

SPEED = 9.0


def course_along(east: Any, north: Any) -> Course:
    """A flat course through points 10 m apart (any number of laps already laid out)."""
    from pacing.course.course import CourseReport

    along = np.concatenate([[0.0], np.cumsum(np.hypot(np.diff(east), np.diff(north)))])
    even = np.linspace(0.0, along[-1], round(along[-1] / 10.0) + 1)
    east, north = np.interp(even, along, east), np.interp(even, along, north)
    step = np.hypot(np.diff(east), np.diff(north))
    distance = np.concatenate([[0.0], np.cumsum(step)])
    cells = step.size
    return Course(
        name="made",
        distance_m=distance,
        lat_deg=46.0 + north / 111_150.0,
        lon_deg=-31.0 + east / (111_320.0 * np.cos(np.radians(46.0))),
        elevation_m=np.zeros(cells + 1),
        gradient=np.zeros(cells),
        heading_deg=np.degrees(np.arctan2(np.diff(east), np.diff(north))) % 360.0,
        crr_factor=np.ones(cells),
        wind_share=np.ones(cells),
        lap_length_m=float(distance[-1]),
        laps=1,
        slow_points=(),
        bends=(),
        landmarks=(),
        report=CourseReport(float(distance[-1]), 0.0, 0.0, "recorded", 0.0, 0.0),
    )


def loop(laps: float) -> tuple[Any, Any]:
    angle = np.arange(0.0, 2 * np.pi * laps, 10.0 / 400.0)
    return 400.0 * (1 - np.cos(angle)), 400.0 * np.sin(angle)


def out_and_back(lane_m: float = 6.0) -> tuple[Any, Any]:
    out = np.arange(0.0, 3000.0, 10.0)
    east = np.concatenate([200.0 * np.sin(out / 500.0), 200.0 * np.sin(out[::-1] / 500.0) + lane_m])
    return east, np.concatenate([out, out[::-1]])


def ride_along(course: Course, *, noise_m: float = 1.5, speed: float = SPEED, seed: int = 1) -> Any:
    """A ride of the course at one speed, positions off by a wandering couple of metres."""
    random = np.random.default_rng(seed)
    time = np.arange(0.0, course.length_m / speed, 1.0)
    at = speed * time
    off = random.standard_normal((2, time.size))
    off = np.apply_along_axis(lambda o: np.convolve(o, np.ones(15) / 15**0.5, "same"), 1, off)
    return pd.DataFrame(
        {
            "time_s": time,
            "lat_deg": np.interp(at, course.distance_m, course.lat_deg)
            + noise_m * off[0] / 111_150.0,
            "lon_deg": np.interp(at, course.distance_m, course.lon_deg)
            + noise_m * off[1] / 77_300.0,
            "speed_m_s": speed,
            "power_w": 180.0,
        }
    )


def matched(ride: pd.DataFrame, course: Course) -> Any:
    return match_ride(check(recording_of_frame(ride)), course)


@pytest.mark.parametrize("shape", [loop(1), loop(3), out_and_back(), out_and_back(0.0)])
def test_every_metre_is_found_on_the_right_pass(shape: Any) -> None:
    course = course_along(*shape)
    found = matched(ride_along(course), course)
    known = np.isfinite(found.at_m)
    truth = SPEED * np.arange(known.size)
    assert known.mean() > 0.99
    assert found.at_m[known] == pytest.approx(truth[known], abs=8.0)
    assert found.from_node == 0
    middle = slice(5, -5)
    assert found.node_s[middle] == pytest.approx(course.distance_m[middle] / SPEED, abs=1.0)


def test_warm_up_laps_are_left_out_and_the_fastest_is_taken() -> None:
    race = course_along(*loop(1))
    slow = ride_along(course_along(*loop(1)), speed=6.0)
    fast = ride_along(course_along(*loop(1)), speed=10.0, seed=2)
    again = ride_along(course_along(*loop(1)), speed=7.0, seed=3)
    for before, after in ((slow, fast), (fast, again)):
        after["time_s"] += before["time_s"].iloc[-1] + 1.0
    found = matched(pd.concat([slow, fast, again], ignore_index=True), race)
    lasted = found.node_s[found.to_node] - found.node_s[found.from_node]
    assert lasted == pytest.approx(race.length_m / 10.0, abs=2.0)


def test_a_detour_is_ridden_and_found_again() -> None:
    course = course_along(*out_and_back())
    ride = ride_along(course)
    off = ride["time_s"].between(100, 130)
    ride.loc[off, "lon_deg"] += 120.0 / 77_300.0
    found = matched(ride, course)
    assert found.at_m[200] == pytest.approx(SPEED * 200, abs=10.0)
    assert found.whole or found.to_node > 0.98 * course.gradient.size


def test_a_longitude_of_180_degrees_makes_no_difference() -> None:
    course = course_along(*loop(1))
    ride = ride_along(course)
    west = replace(course, lon_deg=(course.lon_deg + 31.0 + 180.0 + 180.0) % 360.0 - 180.0)
    ride["lon_deg"] = (ride["lon_deg"] + 31.0 + 180.0 + 180.0) % 360.0 - 180.0
    found = matched(ride, west)
    assert np.nanmax(found.at_m) == pytest.approx(course.length_m, abs=15.0)


def test_a_ride_the_other_way_round_is_refused() -> None:
    from pacing.errors import UnusableInputError

    course = course_along(*loop(1))
    ride = ride_along(course)
    for name in ("lat_deg", "lon_deg"):
        ride[name] = ride[name].to_numpy()[::-1]
    with pytest.raises(UnusableInputError, match="does not follow"):
        matched(ride, course)


def test_without_positions_the_distance_decides() -> None:
    course = course_along(*loop(1))
    ride = ride_along(course).drop(columns=["lat_deg", "lon_deg"])
    ride["distance_m"] = 0.99 * SPEED * ride["time_s"]
    found = matched(ride, course)
    assert np.nanmax(found.at_m) == pytest.approx(course.length_m, abs=20.0)
    assert "by distance" in found.notes[0]
