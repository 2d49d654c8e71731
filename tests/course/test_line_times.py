"""The same road from dense and from sparse points is as long to ride."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest

from pacing.course import CourseSpec, load_course
from pacing.motion import simulate_motion
from pacing.motion.limits import speed_limits_m_s

sys.path.insert(0, str(Path(__file__).resolve().parent))

from drawn import recorded, winding


def ride_s(course, make_road):
    """Time of a ride at 260 W with its bends taken and braked for as planned, dry."""
    road = make_road(
        course.gradient,
        cell_m=course.cell_length_m,
        limit_m_s=speed_limits_m_s(course, max_speed_m_s=None, dry=True),
    )
    return simulate_motion(road, np.full(road.cell_m.size, 260.0), start_speed_m_s=4.0).total_s


def course_from(road, spacing_m, folder):
    """The course read from points along the road, on hills of some 2 % and 1.5 km."""
    lat, lon = recorded(road, spacing_m, 0.0, 5)
    way = np.linspace(0.0, road.length_m, lat.size)
    height = 100.0 + 10.0 * np.sin(way / 240.0) + 0.004 * way
    file = folder / f"{spacing_m:.0f}.csv"
    rows = zip(lat, lon, height, strict=True)
    lines = [f"{a:.7f},{b:.7f},{c:.2f}" for a, b, c in rows]
    file.write_text("\n".join(["lat_deg,lon_deg,elevation_m", *lines]))
    return load_course(CourseSpec(file=file))


@pytest.mark.parametrize(
    ("radii_m", "spacings_m"),
    [
        ((70.0, 300.0), (20.0, 80.0)),
        ((100.0, 500.0), (20.0, 80.0)),
        # Of bends as tight as this nothing is left to see 80 m apart.
        ((20.0, 120.0), (10.0, 20.0)),
    ],
)
@pytest.mark.parametrize("seed", [1003, 1004])
def test_sparse_points_give_the_times_of_dense_ones_within_half_a_percent(
    seed, radii_m, spacings_m, tmp_path, make_road
):
    # The dense points are 5 m apart; no constant was chosen on these seeds.
    road = winding(seed, 30, radii_m, legs_m=(150.0, 700.0))
    dense = ride_s(course_from(road, 5.0, tmp_path), make_road)
    for spacing in spacings_m:
        sparse = ride_s(course_from(road, spacing, tmp_path), make_road)
        assert sparse == pytest.approx(dense, rel=0.005)
