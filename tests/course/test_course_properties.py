"""What must not change the course: how its points are written down.

The roads are drawn at random by hypothesis; each is compared with itself written another way.
"""

from __future__ import annotations

import tempfile
from dataclasses import replace
from pathlib import Path

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from pacing.course import CourseSpec, load_course
from pacing.course.lap import Lap, turned_round

EARTH_M_PER_DEG = 111_195.0


@st.composite
def roads(draw, closed=False):
    """Points (P, 3) of a smooth road of 1 to 6 km anywhere on the globe: degrees and metres."""
    seed = draw(st.integers(0, 10_000))
    spacing = draw(st.floats(8.0, 60.0))
    length = draw(st.floats(1000.0, 6000.0))
    lat_0 = draw(st.sampled_from([0.0, 47.0, -45.0, 71.0, 84.0]))
    lon_0 = draw(st.floats(-179.0, 179.0))
    random = np.random.default_rng(seed)
    count = max(int(length / spacing), 20)
    way = np.linspace(0.0, 2 * np.pi, count + 1)
    waves = random.normal(0.0, 1.0, (3, 4)) / np.arange(1, 5) ** 2
    phase = random.uniform(0.0, 6.0, (3, 4))
    shape = [
        sum(w * np.sin(k * way + p) for k, (w, p) in enumerate(zip(*part, strict=True), 1))
        for part in zip(waves, phase, strict=True)
    ]
    x, y = np.cos(way) + 0.15 * shape[0], np.sin(way) + 0.15 * shape[1]
    if not closed:
        cut = count // 5
        x, y, shape[2] = x[cut:], y[cut:], shape[2][cut:]
    size = length / np.sum(np.hypot(np.diff(x), np.diff(y)))
    lat = lat_0 + size * y / EARTH_M_PER_DEG
    lon = lon_0 + size * x / EARTH_M_PER_DEG / np.cos(np.radians(lat_0))
    heights = 200.0 + 0.006 * length * shape[2]
    return np.stack([lat, (lon + 180.0) % 360.0 - 180.0, heights], axis=1)


def _load(points, segments=(), **keys):
    cuts = {0, *segments}
    rows = [
        ("</trkseg><trkseg>" if n in cuts and n else "")
        + f'<trkpt lat="{lat!r}" lon="{lon!r}"><ele>{ele!r}</ele></trkpt>'
        for n, (lat, lon, ele) in enumerate(points.tolist())
    ]
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "c.gpx"
        file.write_text("<gpx><trk><trkseg>" + "".join(rows) + "</trkseg></trk></gpx>")
        return load_course(CourseSpec(file=file, **keys))


def _same(one, other, *, length=1e-9, height_m=1e-6, heading_deg=1e-6):
    assert abs(other.length_m / one.length_m - 1.0) <= length
    share = np.linspace(0.0, 1.0, 200)
    for course in (one, other):
        assert course.distance_m[0] == 0.0
    heights = [np.interp(share * c.length_m, c.distance_m, c.elevation_m) for c in (one, other)]
    assert np.max(np.abs(heights[0] - heights[1])) <= height_m
    if len(one.heading_deg) == len(other.heading_deg):
        turn = (one.heading_deg - other.heading_deg + 180.0) % 360.0 - 180.0
        assert np.max(np.abs(turn)) <= heading_deg


@settings(max_examples=25, deadline=None)
@given(roads(), st.data())
def test_points_written_twice_change_nothing(points, data):
    again = data.draw(st.lists(st.integers(0, len(points) - 1), min_size=1, max_size=30))
    _same(_load(points), _load(np.repeat(points, 1 + np.bincount(again, minlength=len(points)), 0)))


@settings(max_examples=25, deadline=None)
@given(roads(), st.data())
def test_splitting_into_segments_changes_nothing(points, data):
    cuts = data.draw(st.lists(st.integers(1, len(points) - 1), min_size=1, max_size=10))
    _same(_load(points), _load(points, segments=cuts))


@settings(max_examples=25, deadline=None)
@given(roads(), st.floats(-360.0, 360.0))
def test_shifting_the_longitude_over_the_180th_meridian_changes_nothing(points, shift):
    moved = points.copy()
    moved[:, 1] = (points[:, 1] + shift + 180.0) % 360.0 - 180.0
    here, there = _load(points), _load(moved)
    _same(here, there, length=1e-7, height_m=1e-3, heading_deg=1e-3)
    turn = (there.lon_deg - here.lon_deg - shift + 180.0) % 360.0 - 180.0
    assert np.max(np.abs(turn)) < 1e-6


@settings(max_examples=25, deadline=None)
@given(roads(), st.data())
def test_points_on_the_straight_between_two_others_change_next_to_nothing(points, data):
    many = data.draw(st.integers(1, 3))
    legs = data.draw(st.lists(st.integers(0, len(points) - 2), min_size=1, max_size=20))
    written = []
    for n in range(len(points) - 1):
        here, on = points[n].copy(), points[n + 1].copy()
        on[1] = here[1] + (on[1] - here[1] + 180.0) % 360.0 - 180.0
        pieces = many + 1 if n in legs else 1
        written += [here + (on - here) * k / pieces for k in range(pieces)]
    written.append(points[-1])
    inserted = np.array(written)
    inserted[:, 1] = (inserted[:, 1] + 180.0) % 360.0 - 180.0
    _same(_load(points), _load(inserted), length=2e-4, height_m=0.5, heading_deg=3.0)


@settings(max_examples=25, deadline=None)
@given(roads(closed=True), st.integers(2, 5))
def test_more_laps_have_as_many_times_the_length_and_the_climbing(points, laps):
    one, more = _load(points), _load(points, laps=laps)
    assert abs(more.length_m / (laps * one.length_m) - 1.0) < 1e-4
    climbing = laps * one.report.climbing_m
    assert abs(more.report.climbing_m - climbing) <= 0.005 * climbing + 0.05 * laps


@settings(max_examples=25, deadline=None)
@given(roads())
def test_reversing_twice_is_the_identity(points):
    course = _load(points)
    run = np.sqrt(np.diff(course.distance_m) ** 2 - np.diff(course.elevation_m) ** 2)
    lap = Lap(
        run_m=np.concatenate([[0.0], np.cumsum(run)]),
        lat_deg=course.lat_deg,
        lon_deg=course.lon_deg,
        elevation_m=course.elevation_m,
        raw_distance_m=course.report.raw_distance_m,
        raw_elevation_m=course.report.raw_elevation_m,
        bends=course.bends,
    )
    twice = turned_round(turned_round(lap))
    for name in ("run_m", "lat_deg", "lon_deg", "elevation_m", "raw_distance_m"):
        assert np.allclose(getattr(twice, name), getattr(lap, name), rtol=0.0, atol=1e-7)
    assert [b.turn_deg for b in twice.bends] == [b.turn_deg for b in lap.bends]
    backwards = _load(points[::-1], reverse=True)
    _same(course, backwards, length=1e-5, height_m=0.05, heading_deg=0.5)


@settings(max_examples=15, deadline=None)
@given(roads(), st.floats(0.2, 0.4), st.floats(0.6, 0.8))
def test_a_part_has_the_length_asked_for(points, start, end):
    whole = _load(points)
    keys = {"from_km": start * whole.length_m / 1e3, "to_km": end * whole.length_m / 1e3}
    part = _load(points, **keys)
    assert abs(part.length_m - (end - start) * whole.length_m) < 1e-6 * whole.length_m
    assert replace(part.report, repairs=()).verdict == whole.report.verdict
