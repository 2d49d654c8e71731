"""One road, written down with more or fewer points, is one ride: times at a fixed power."""

from __future__ import annotations

import tempfile
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from pyproj import Geod
from scipy.interpolate import CubicSpline

from pacing.course import CourseSpec, load_course
from pacing.motion.road import road_for
from pacing.motion.simulate import simulate_motion

GEOD = Geod(ellps="WGS84")
STEP_M = 1.0


def _heading_deg(kind, way):
    """Heading along the road: sweeping turns, or straights between right angles of 25 m radius."""
    if kind == "sweeping":
        return 40.0 + 70.0 * np.sin(way / 900.0) + 20.0 * np.sin(way / 260.0)
    turn = np.zeros_like(way)
    for number, at in enumerate(np.arange(1200.0, way[-1] - 500.0, 1500.0)):
        share = np.clip((way - at) / (np.pi / 2 * 25.0), 0.0, 1.0)
        turn += (90.0 if number % 2 else -90.0) * share
    return 30.0 + turn


def _road(kind, length_m=12_000.0):
    """Distance, latitude, longitude and height of a road every metre."""
    way = np.arange(0.0, length_m + STEP_M, STEP_M)
    heading = np.radians(_heading_deg(kind, way))
    east = np.concatenate([[0.0], np.cumsum(np.sin(heading[:-1]) * STEP_M)])
    north = np.concatenate([[0.0], np.cumsum(np.cos(heading[:-1]) * STEP_M)])
    azimuth, distance = np.degrees(np.arctan2(east, north)), np.hypot(east, north)
    lon, lat, _ = GEOD.fwd(np.full(len(way), 9.0), np.full(len(way), 48.0), azimuth, distance)
    height = 300.0 + 40.0 * np.sin(way / 1100.0) + 8.0 * np.sin(way / 310.0)
    return way, lat, lon, height


def _time_s(kind, spacing_m, make_race):
    way, *columns = _road(kind)
    at = np.append(np.arange(0.0, way[-1], spacing_m), way[-1])
    lat, lon, ele = (CubicSpline(way, column)(at) for column in columns)
    rows = "".join(
        f'<trkpt lat="{a:.7f}" lon="{o:.7f}"><ele>{z:.2f}</ele></trkpt>'
        for a, o, z in zip(lat, lon, ele, strict=True)
    )
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "road.gpx"
        file.write_text(f"<gpx><trk><trkseg>{rows}</trkseg></trk></gpx>")
        course = load_course(CourseSpec(file=file))
    race = replace(
        make_race(np.zeros(10), air__wind_speed_m_s=3.0, air__wind_from_deg=240.0), course=course
    )
    road = road_for(race)
    return simulate_motion(road, np.full(len(course.gradient), 270.0), start_speed_m_s=0.0).total_s


@pytest.mark.parametrize(
    ("kind", "spacings_m"),
    [
        ("sweeping", (5.0, 20.0, 80.0)),
        # Of a corner of 25 m radius, 39 m long, points 20 m apart do not tell the speed.
        ("right angles", (5.0, 8.0)),
    ],
)
def test_a_road_sampled_closely_and_coarsely_takes_the_same_time(kind, spacings_m, make_race):
    times = [_time_s(kind, spacing, make_race) for spacing in spacings_m]
    assert times == pytest.approx([times[0]] * len(times), rel=5e-3)
