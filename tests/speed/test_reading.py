"""How long reading a course takes, beside gpxpy's own parse of the same file; printed, not judged.

gpxpy parses with lxml where that is installed, as it is with the test extra.
"""

from __future__ import annotations

import time
import tracemalloc

import gpxpy
import numpy as np
import pytest

from pacing.course import CourseSpec, load_course
from pacing.course.bends import find_bends
from pacing.course.heights import smooth_heights
from pacing.course.line import smooth_line
from pacing.course.read import read_track
from pacing.course.repair import repair

pytestmark = pytest.mark.speed


def _best_s(work, times=3):
    """The shortest of a few runs, and what the last gave."""
    took = []
    for _ in range(times):
        begun = time.perf_counter()
        result = work()
        took.append(time.perf_counter() - begun)
    return min(took), result


def _parsed(file):
    with file.open(encoding="utf-8") as lines:
        return gpxpy.parse(lines)


@pytest.mark.parametrize("name", ["rolling_170km", "flat_coast_175km", "valley_167km_duplicates"])
def test_reading_repairing_and_smoothing_170_km_beside_the_parse_alone(
    recorded_courses, capsys, name
):
    file = recorded_courses / f"{name}.gpx"
    parse_s, _ = _best_s(lambda: _parsed(file))
    read_s, track = _best_s(lambda: read_track(file))
    repair_s, (track, _) = _best_s(lambda: repair(track))
    line_s, line = _best_s(lambda: smooth_line(track.lat_deg, track.lon_deg))
    heights_s, _ = _best_s(
        lambda: smooth_heights(line.point_distance_m, track.elevation_m, grid=line.distance_m)
    )
    bends_s, _ = _best_s(lambda: find_bends(line))
    ours_s = read_s + repair_s + line_s + heights_s
    with capsys.disabled():
        print(
            f"\n{name}: {len(track)} points; gpxpy parse {1e3 * parse_s:.0f} ms; read "
            f"{1e3 * read_s:.0f} + repair {1e3 * repair_s:.0f} + line {1e3 * line_s:.0f} + heights "
            f"{1e3 * heights_s:.0f} = {1e3 * ours_s:.0f} ms, {ours_s / parse_s:.2f} times the "
            f"parse; bends {1e3 * bends_s:.0f} ms more"
        )


def test_41_thousand_points_are_read_and_repaired(recorded_courses, capsys):
    file = recorded_courses / "continental_4630km.gpx"
    parse_s, _ = _best_s(lambda: _parsed(file), 1)

    def read_all():
        return [repair(read_track(file, number))[0] for number in range(1, 6)]

    ours_s, tracks = _best_s(read_all, 1)
    with capsys.disabled():
        print(
            f"\ncontinental_4630km: {sum(map(len, tracks))} points; gpxpy parse {parse_s:.2f} s; "
            f"five times read, each track once repaired {ours_s:.2f} s"
        )


def test_memory_grows_with_the_points(tmp_path, capsys):
    """A winding road of more and more points; the peak of what Python and numpy hold."""
    peaks = {}
    for count in (2_000, 8_000, 32_000):
        way = 20.0 * np.arange(count)
        lat = 50.0 + way / 111_200.0
        lon = 7.0 + 0.01 * np.sin(way / 900.0)
        height = 200.0 + 40.0 * np.sin(way / 1500.0)
        rows = (
            f'<trkpt lat="{a:.7f}" lon="{o:.7f}"><ele>{z:.1f}</ele></trkpt>\n'
            for a, o, z in zip(lat, lon, height, strict=True)
        )
        file = tmp_path / "road.gpx"
        file.write_text("<gpx><trk><trkseg>" + "".join(rows) + "</trkseg></trk></gpx>")
        tracemalloc.start()
        begun = time.perf_counter()
        course = load_course(CourseSpec(file=file))
        took = time.perf_counter() - begun
        peaks[count] = tracemalloc.get_traced_memory()[1] / 1e6
        tracemalloc.stop()
        with capsys.disabled():
            print(
                f"\n{count} points, {course.length_m / 1000:.0f} km: peak {peaks[count]:.0f} MB, "
                f"{took:.1f} s with memory traced"
            )
    # Memory, unlike time, is the same on every machine: four times the points, at most five times.
    assert peaks[32_000] < 5.0 * peaks[8_000]
