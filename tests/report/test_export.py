"""Files for other programs, read back by other programs."""

from __future__ import annotations

import json
from pathlib import Path

import gpxpy
import numpy as np
import pandas as pd
import pytest
from gpxpy.geo import distance as geo_distance
from lxml import etree

from pacing.report import export
from pacing.report.output_set import PLAN_OUTPUT


@pytest.fixture(scope="module")
def gpx_schema() -> etree.XMLSchema:
    return etree.XMLSchema(etree.parse(Path(__file__).with_name("gpx-1.1.xsd")))


def test_gpx_follows_the_gpx_1_1_schema(make_plan, gpx_schema):
    for shape in ("rolling", "out and back", "laps"):
        document = etree.fromstring(export.cues_gpx(make_plan(shape=shape)).encode())
        gpx_schema.assertValid(document)


def test_the_schema_refuses_what_gpx_1_1_does_not_have(make_plan, gpx_schema):
    text = export.cues_gpx(make_plan(cues=2))
    for wrong in (
        text.replace('version="1.1"', 'version="1.0"'),
        text.replace("<name>", "<power>", 1).replace("</name>", "</power>", 1),
        text.replace(' lon="', ' lng="', 1),
    ):
        assert not gpx_schema.validate(etree.fromstring(wrong.encode()))


def test_gpxpy_reads_back_the_course_and_the_same_cues(make_plan):
    plan = make_plan(cues=24)
    read = gpxpy.parse(export.cues_gpx(plan))
    assert [point.name for point in read.waypoints] == [f"{w} W" for w in plan.cues["power_w"]]
    points = read.tracks[0].segments[0].points
    assert len(points) == plan.race.course.distance_m.size
    assert points[0].latitude == pytest.approx(plan.race.course.lat_deg[0], abs=1e-7)
    assert points[-1].elevation == pytest.approx(plan.race.course.elevation_m[-1], abs=0.06)


def test_waypoints_stand_a_little_before_the_change_in_the_order_ridden(make_plan):
    plan = make_plan(cues=40)
    places = np.array(export.waypoint_places_m(plan))
    starts = plan.cues["from_m"].to_numpy()
    assert places[0] == starts[0]
    before = starts[1:] - places[1:]
    assert (before >= export.LEAST_LEAD_M - 1e-9).all()
    assert (before <= export.MOST_LEAD_M + 1e-9).all()
    assert (np.diff(places) > 0).all()


def test_a_faster_rider_is_told_earlier():
    assert export.lead_m(5.0) <= export.lead_m(10.0) <= export.lead_m(20.0)
    assert export.lead_m(12.0) == 48.0
    assert export.lead_m(0.0) == export.LEAST_LEAD_M


def test_waypoints_lie_on_the_course(make_plan):
    plan = make_plan(shape="climb", length_m=9_000.0)
    read = gpxpy.parse(export.cues_gpx(plan))
    points = read.tracks[0].segments[0].points
    for mark in read.waypoints:
        nearest = min(
            geo_distance(mark.latitude, mark.longitude, None, p.latitude, p.longitude, None)
            for p in points
        )
        assert nearest < 8.0


def test_a_course_over_the_date_line_stays_within_the_schemas_longitudes(make_plan, gpx_schema):
    plan = make_plan(cues=6, length_m=5_000.0)
    course = plan.race.course
    shifted = (course.lon_deg - course.lon_deg[0] + 179.99 + 180.0) % 360.0 - 180.0
    object.__setattr__(course, "lon_deg", shifted)
    text = export.cues_gpx(plan)
    gpx_schema.assertValid(etree.fromstring(text.encode()))
    read = gpxpy.parse(text)
    lengths = [
        geo_distance(a.latitude, a.longitude, None, b.latitude, b.longitude, None)
        for a, b in zip(read.waypoints, read.waypoints[1:], strict=False)
    ]
    assert max(lengths) < 5_000.0


def test_hostile_names_are_only_names(make_plan, gpx_schema):
    name = "<script>&\"'\x00\x0b]]> ü山\ud800"
    plan = make_plan(name=name, cues=4)
    plan.cues["landmark"] = name
    document = etree.fromstring(export.cues_gpx(plan).encode())
    gpx_schema.assertValid(document)
    assert document.findtext(".//{*}trk/{*}name") == "<script>&\"']]> ü山"


def test_cues_csv_has_the_promised_columns_and_numbers(make_plan, tmp_path):
    plan = make_plan()
    (tmp_path / "cues.csv").write_text(export.cues_csv(plan), encoding="utf-8")
    read = pd.read_csv(tmp_path / "cues.csv")
    assert list(read.columns) == [
        "from_km", "to_km", "landmark", "position", "power_w", "speed_kmh", "clock",
        "w_balance_kj",
    ]  # fmt: skip
    assert read["from_km"].to_numpy() == pytest.approx(plan.cues["from_km"], abs=5e-4)
    assert read["power_w"].tolist() == plan.cues["power_w"].tolist()
    assert read["clock"].tolist() == plan.cues["clock"].tolist()


def test_trace_csv_keeps_the_columns_and_enough_digits_to_add_up(make_plan, tmp_path):
    plan = make_plan()
    (tmp_path / "trace.csv").write_text(export.trace_csv(plan), encoding="utf-8")
    read = pd.read_csv(tmp_path / "trace.csv")
    assert list(read.columns) == list(plan.trace.columns)
    assert read["time_s"].sum() == pytest.approx(plan.time_s, abs=0.005)
    assert np.isinf(read["speed_limit_to_m_s"]).any()
    mean = 0.5 * (read["speed_from_m_s"] + read["speed_to_m_s"])
    length = (read["to_m"] - read["from_m"]).to_numpy()
    assert (length / mean).sum() == pytest.approx(plan.time_s, abs=0.01)


def test_tables_hold_no_negative_zero_and_no_long_tails_of_digits(make_plan):
    text = export.trace_csv(make_plan())
    fields = [field for row in text.splitlines()[1:] for field in row.split(",")]
    assert not {"-0", "nan", "NaN"} & set(fields)
    assert max(map(len, fields)) <= 12


def test_plan_json_is_strict_and_says_its_schema_first(make_plan):
    text = export.plan_json(make_plan())

    def refuse(name: str) -> None:
        raise AssertionError(name)

    document = json.loads(text, parse_constant=refuse)
    assert next(iter(document)) == "schema"
    assert document["schema"] == "plan/1"
    assert document["solver"]["kkt_residual"] is None
    assert document["cues"][0]["power_w"] == 325


def test_the_folder_holds_the_whole_set_and_the_same_bytes_twice(make_plan, tmp_path):
    export.write_plan(make_plan(), tmp_path / "out")
    first = {file.name: file.read_bytes() for file in (tmp_path / "out").iterdir()}
    assert set(first) == PLAN_OUTPUT.names - {"report.html", "positions.png"}
    export.write_plan(make_plan(), tmp_path / "out")
    assert first == {file.name: file.read_bytes() for file in (tmp_path / "out").iterdir()}
