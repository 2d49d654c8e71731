"""Bends of recorded courses: as many slow ones as a rider would expect, looked at on the map."""

from __future__ import annotations

import numpy as np
import pytest

from pacing.course import CourseSpec, load_course

# Bends planned below 30 km/h on a dry road (24 m), in a hundred kilometres, from looking at the
# line drawn with its bends: hairpins on the climbs, streets and roundabouts in the towns.
SLOW_PER_100_KM = {
    "ridge_climb_48km_no_time": (15, 60),
    "rolling_170km": (25, 75),
    "flat_coast_175km": (35, 95),
    "alpine_113km_tunnel_spikes": (50, 120),
    "coast_road_123km_very_noisy": (8, 35),
    "valley_167km_duplicates": (60, 130),
}


@pytest.mark.parametrize("name", SLOW_PER_100_KM)
def test_a_recorded_course_has_a_believable_number_of_slow_bends(name, recorded_courses):
    course = load_course(CourseSpec(file=recorded_courses / f"{name}.gpx"))
    planned = [bend.planning_radius_m for bend in course.bends]
    slow = sum(radius is not None and radius < 24.0 for radius in planned)
    least, most = SLOW_PER_100_KM[name]
    assert least <= slow / course.length_m * 1e5 <= most
    assert np.all(np.diff([bend.at_m for bend in course.bends]) >= 0.0)


def test_the_hairpins_of_a_mountain_road_are_hairpins(recorded_courses):
    course = load_course(CourseSpec(file=recorded_courses / "alpine_113km_tunnel_spikes.gpx"))
    hairpins = [bend for bend in course.bends if 140.0 < abs(bend.turn_deg) < 230.0]
    known = [bend.radius_m for bend in hairpins if bend.radius_m is not None]
    assert len(known) >= 40
    # Common practice, no source: mountain hairpins are built with 8 to 25 m along the middle.
    assert 8.0 <= np.median(known) <= 25.0


def test_a_straight_flat_coast_is_mostly_free_of_bends(recorded_courses):
    course = load_course(CourseSpec(file=recorded_courses / "flat_coast_175km.gpx"))
    slowed = sum(bend.length_m for bend in course.bends if bend.planning_radius_m is not None)
    assert slowed < 0.06 * course.length_m
