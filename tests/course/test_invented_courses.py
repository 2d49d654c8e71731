"""The invented courses: files are what their generator writes, and roads are roads."""

from __future__ import annotations

import csv
import re
import sys
from pathlib import Path

import numpy as np
import pytest
from lxml import etree
from pyproj import Geod

sys.path.insert(0, str(Path(__file__).resolve().parents[2] / "courses"))

import make
from recording import gpx_text
from roads import corner, heights_from_sections, line_through, on_earth

GPX = "{http://www.topografix.com/GPX/1/1}"
CORE = {"gpx", "trk", "name", "trkseg", "trkpt", "ele", "time"}
KILOMETRES = {
    "oldermere_flat": (16.0, 0.2),
    "brackenholt_round": (40.0, 0.3),
    "scarnhead_climb": (9.0, 0.1),
    "quillport_lap": (4.4, 0.2),
    "dunsorrel_gorge": (25.6, 0.3),
    "pennick_vale": (12.1, 0.2),
}
LOOPS = ("brackenholt_round", "quillport_lap", "pennick_vale")


NUMBERS = r"(-?\d+\.\d+)"


def written(path):
    return gpx_text(make.files()[path])


@pytest.fixture(scope="module")
def roads():
    return {name: make.true_road(name) for name in make.ROADS}


@pytest.mark.parametrize("path", make.files(), ids=lambda path: path.stem)
def test_a_committed_file_is_what_the_generator_writes(path):
    # Numbers within one in the last digit: other machines may round a sine otherwise.
    kept, made = (re.split(NUMBERS, text) for text in (path.read_text(), written(path)))
    assert kept[::2] == made[::2]
    off = np.abs(np.array(kept[1::2], dtype=float) - np.array(made[1::2], dtype=float))
    last = np.array([10.0 ** -len(number.partition(".")[2]) for number in made[1::2]])
    assert np.all(off <= 1.01 * last)


def test_the_sample_efforts_are_what_the_generator_writes():
    text = (make.STARTER / "efforts.csv").read_text()
    assert text == make.EFFORTS
    rows = list(csv.DictReader(text.splitlines()))
    assert list(rows[0]) == ["duration_s", "power_w", "position"]
    powers = [float(row["power_w"]) for row in rows]
    assert powers == sorted(powers, reverse=True)
    assert float(rows[-1]["duration_s"]) > 900


@pytest.mark.parametrize("path", make.files(), ids=lambda path: path.stem)
def test_a_file_is_small_and_holds_core_elements_of_gpx_1_1_only(path):
    root = etree.fromstring(path.read_bytes())
    assert path.stat().st_size < 600_000
    assert root.get("version") == "1.1"
    assert {element.tag.removeprefix(GPX) for element in root.iter()} <= CORE


@pytest.mark.parametrize("name", make.ROADS)
def test_a_road_is_as_long_as_geodesics_between_its_points_say(name, roads):
    road = roads[name]
    length = Geod(ellps="WGS84").line_length(road.lon_deg, road.lat_deg)
    assert road.length_m == pytest.approx(length, rel=1e-6)
    kilometres, within = KILOMETRES[name]
    assert road.length_m / 1000 == pytest.approx(kilometres, abs=within)


@pytest.mark.parametrize("name", make.ROADS)
def test_a_road_is_steep_and_bent_as_roads_are(name, roads):
    road = roads[name]
    assert np.abs(road.slope).max() < 0.14
    assert road.radius_m.min() >= 4.0
    assert np.diff(road.distance_m).min() > 0


@pytest.mark.parametrize("name", LOOPS)
def test_a_loop_ends_where_it_began(name, roads):
    road = roads[name]
    ends = Geod(ellps="WGS84").inv(
        road.lon_deg[0], road.lat_deg[0], road.lon_deg[-1], road.lat_deg[-1]
    )
    assert ends[2] < 0.1
    assert road.height_m[0] == pytest.approx(road.height_m[-1], abs=1e-6)
    assert road.closed


def test_the_climb_has_ramps_of_12_percent_and_hairpins(roads):
    road = roads["scarnhead_climb"]
    assert 0.115 < road.slope.max() < 0.13
    assert road.height_m[-1] - road.height_m[0] > 600
    assert road.radius_m.min() < 15


def test_the_flat_course_turns_dead_round_a_cone_and_comes_back_beside_itself(roads):
    road = roads["oldermere_flat"]
    turn = int(np.argmin(road.radius_m))
    assert road.distance_m[turn] == pytest.approx(road.length_m / 2, rel=0.01)
    there, back = 1000, len(road.lat_deg) - 1001
    gap = Geod(ellps="WGS84").inv(
        road.lon_deg[there], road.lat_deg[there], road.lon_deg[back], road.lat_deg[back]
    )[2]
    assert gap == pytest.approx(8.0, abs=1.0)


@pytest.mark.parametrize("name", [name for name in make.ROADS if name not in make.PLANNED])
def test_a_recording_is_off_by_metres_as_recorders_are(name, roads):
    road, recording = roads[name], make.recorded(name)
    true_lat = np.interp(recording.true_distance_m, road.distance_m, road.lat_deg)
    off = 111200 * (recording.lat_deg - true_lat)
    assert 0.6 < off.std() < 2.0
    height = np.interp(recording.true_distance_m, road.distance_m, road.height_m)
    assert 0.15 < (recording.elevation_m - height).std() < 3.0
    spacing = np.diff(recording.true_distance_m)
    assert 4 < np.median(spacing) < 25


def test_the_planned_course_has_no_times_and_terrain_over_its_tunnels(roads):
    road, route = roads["dunsorrel_gorge"], make.recorded("dunsorrel_gorge")
    off = route.elevation_m - np.interp(route.true_distance_m, road.distance_m, road.height_m)
    assert route.time_s is None
    assert off.max() > 50
    assert off.min() < -10
    assert np.median(np.abs(off)) < 2.0


@pytest.mark.parametrize("turn_deg", [-170.0, -60.0, 25.0, 90.0, 160.0])
def test_a_corner_turns_as_far_as_it_is_told_at_its_radius(turn_deg):
    curvature = corner(np.radians(turn_deg), 40.0, 25.0)
    ramp = min(25.0, 0.8 * np.radians(abs(turn_deg)) * 40.0)
    length = np.radians(abs(turn_deg)) * 40.0 + ramp
    cell = length / len(curvature)
    assert np.degrees(curvature.sum() * cell) == pytest.approx(turn_deg, rel=1e-9)
    assert 1 / np.abs(curvature).max() == pytest.approx(40.0, rel=0.03)


def test_a_line_passes_through_straights_and_keeps_its_radii():
    points, radius = line_through(
        np.array([[0.0, 0.0], [500.0, 0.0], [500.0, 400.0]]), np.array([0.0, 60.0, 0.0])
    )
    assert points[-1] == pytest.approx([500.0, 400.0], abs=1e-6)
    assert radius.min() == pytest.approx(60.0, rel=0.03)
    step = np.hypot(*np.diff(points, axis=0).T)
    heading = np.unwrap(np.arctan2(*np.diff(points, axis=0).T[::-1]))
    drawn = np.abs(np.diff(heading)) / step[1:]
    assert drawn.max() == pytest.approx(1 / 60.0, rel=0.05)


def test_sections_have_the_gradients_they_are_told():
    distance = np.arange(0.0, 2001.0)
    height = heights_from_sections(distance, [(1000, 5.0), (1000, -3.0)], start_m=10.0)
    slope = 100 * np.diff(height)
    assert slope[300] == pytest.approx(5.0, abs=1e-6)
    assert slope[1700] == pytest.approx(-3.0, abs=1e-6)
    assert np.abs(np.diff(slope)).max() < 0.2


def test_places_on_earth_are_as_far_apart_as_they_are_told():
    lat, lon, distance = on_earth(np.array([[0.0, 0.0], [0.5, 0.0], [0.5, 0.5]]), 47.0, -30.0)
    assert distance == pytest.approx([0.0, 0.5, 1.0], rel=1e-4)
    assert (lat[0], lon[0]) == (47.0, -30.0)
