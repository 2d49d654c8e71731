"""The verdict: good, usable with which cautions, unusable for which reasons.

The limits are this program's own; nothing outside it fixes them.
"""

from __future__ import annotations

import numpy as np
import pytest

from pacing.course import CourseSpec
from pacing.course.load import survey_course

METRES = 1.0 / 111_200.0


def _road(spacing_m=20.0, length_m=5000.0, height=lambda way: 100.0 + 10.0 * np.sin(way / 400.0)):
    """Points of a road to the north with gentle waves."""
    way = np.arange(0.0, length_m + 1.0, spacing_m)
    lat, lon = 52.0 + way * METRES, 1.0 + 40.0 * METRES * np.sin(way / 600.0)
    return [(float(a), float(o), float(z)) for a, o, z in zip(lat, lon, height(way), strict=True)]


@pytest.fixture
def survey(write, gpx):
    def of(points, **keys):
        found = survey_course(CourseSpec(file=write(gpx(points)), **keys))
        report = found.course.report
        assert bool(found.refusals) == bool(report.reasons) == (report.verdict == "unusable")
        return report

    return of


def test_a_plain_road_is_good(survey):
    report = survey(_road())
    assert (report.verdict, report.cautions, report.repairs) == ("good", (), ())


def test_points_far_apart_are_a_caution(survey):
    report = survey(_road(spacing_m=250.0, length_m=10_000.0))
    assert report.verdict == "usable"
    assert "points 250 m apart: bends and short hills between are not known" in report.cautions


def test_a_very_steep_road_is_a_caution_and_a_wall_a_refusal(survey):
    def ramp(percent):
        return lambda way: 100.0 + percent / 100.0 * np.clip(way - 2000.0, 0.0, 600.0)

    report = survey(_road(height=ramp(24.0)), heights="recorded")
    assert report.verdict == "usable"
    assert "100 m of 24 %" in report.cautions[0]
    report = survey(_road(height=ramp(45.0)), heights="recorded")
    assert report.verdict == "unusable"
    # Smoothing lifts the middle of so short a wall by a point.
    assert report.reasons[0].startswith(("a gradient of 45 %", "a gradient of 46 %"))


def test_some_missing_heights_are_a_caution(survey):
    points = [
        (lat, lon, None if 100 <= n < 130 else ele) for n, (lat, lon, ele) in enumerate(_road())
    ]
    report = survey(points)
    assert report.verdict == "usable"
    # 31 steps of 20 m along the road, and the little it winds.
    assert report.cautions[0] == (
        "heights missing on 12 % of the way, up to 621 m at a stretch, are interpolated"
    )


def test_heights_of_zero_everywhere_are_asked_about(survey):
    report = survey(_road(height=np.zeros_like))
    assert report.cautions == ("every height in the file is 0 m: is the course level?",)


def test_an_official_length_far_from_the_line_is_a_caution(survey):
    assert survey(_road(), official_km=5.05).verdict == "good"
    report = survey(_road(), official_km=5.3)
    assert report.cautions == ("the official length is +5.9 % from the file's line",)


def test_gaps_are_a_caution_wide_ones_a_refusal_and_outside_the_part_no_matter(survey):
    points = _road(length_m=12_000.0)
    small = [point for n, point in enumerate(points) if not 200 < n < 240]
    report = survey(small)
    assert report.verdict == "usable"
    assert report.cautions[0].startswith("1 gap bridged by a straight line, the widest 8")
    wide = [point for n, point in enumerate(points) if not 200 < n < 320]
    report = survey(wide)
    assert report.verdict == "unusable"
    assert report.reasons[0].startswith("a gap of 2.4 km at km 4.0; expected points along")
    assert survey(wide, to_km=3.5).verdict == "good"
    assert survey(wide, reverse=True, from_km=8.5).verdict == "good"


def test_many_small_gaps_are_refused_together(survey):
    points = _road(length_m=30_000.0, spacing_m=10.0)
    kept = [point for n, point in enumerate(points) if n % 300 < 200 or n < 300]
    report = survey(kept)
    assert report.verdict == "unusable"
    assert "9 gaps, 9.1 km in all" in report.reasons[0]
    assert "at most 25 % of the course in gaps" in report.reasons[0]
