"""Points as the file gives them: every GPX dialect, several lines, tables.

The independent reader is gpxpy.
"""

from __future__ import annotations

import codecs

import gpxpy
import numpy as np
import pytest

from pacing.course.read import read_track
from pacing.errors import UnusableInputError

POINTS = [(50.0, 7.0, 100.0), (50.001, 7.001, 101.5), (50.002, 7.001, None), (50.003, 7.0, 99.0)]


def _same_points(track, points=POINTS):
    lat, lon, ele = (np.array(part, dtype=float) for part in zip(*points, strict=True))
    assert track.lat_deg.tolist() == lat.tolist()
    assert track.lon_deg.tolist() == lon.tolist()
    assert track.elevation_m.tolist() == pytest.approx(ele.tolist(), nan_ok=True)


@pytest.mark.parametrize("version", ["1.0", "1.1"])
@pytest.mark.parametrize("kind", ["trk", "rte"])
def test_tracks_and_routes_of_both_versions_are_read(write, gpx, version, kind):
    track = read_track(write(gpx(POINTS, kind=kind, version=version, name="Low Moor")))
    _same_points(track)
    assert track.name == "Low Moor"
    assert track.time_s is None


def test_a_file_without_namespace_and_one_with_prefixes_are_read(write, gpx):
    plain = gpx(POINTS).replace(' xmlns="http://www.topografix.com/GPX/1/1"', "")
    _same_points(read_track(write(plain)))
    prefixed = (
        gpx(POINTS)
        .replace("xmlns=", "xmlns:g=")
        .replace("<gpx", "<g:gpx")
        .replace("</gpx", "</g:gpx")
        .replace("<trk", "<g:trk")
        .replace("</trk", "</g:trk")
        .replace("<ele>", "<g:ele>")
        .replace("</ele>", "</g:ele>")
    )
    _same_points(read_track(write(prefixed)))


@pytest.mark.parametrize(
    ("declared", "encoding", "mark"),
    [
        ("UTF-8", "utf-8", codecs.BOM_UTF8),
        ("UTF-8", "utf-8", b"\n\n  "),
        ("ISO-8859-1", "latin-1", b""),
        ("windows-1252", "cp1252", b""),
        ("Shift_JIS", "shift_jis", b""),
        ("UTF-16", "utf-16-le", codecs.BOM_UTF16_LE),
        ("UTF-16", "utf-16-be", codecs.BOM_UTF16_BE),
        ("UTF-8", "utf-16-le", codecs.BOM_UTF16_LE),
        ("UTF-16", "utf-8", b""),
        ("UTF-32", "utf-32-le", codecs.BOM_UTF32_LE),
        ("UTF-8", "latin-1", b""),
    ],
)
def test_byte_order_marks_and_other_encodings_are_read(write, gpx, declared, encoding, mark):
    name = "日本" if declared == "Shift_JIS" else "Übersee" if "8" not in encoding else "Moor"
    text = gpx(POINTS, name=name).replace("UTF-8", declared)
    track = read_track(write(mark + text.encode(encoding)))
    _same_points(track)
    assert track.name == name


def test_times_are_kept_and_those_that_cannot_be_read_are_missing(write, gpx):
    timed = gpx(POINTS).replace("</trkpt>", "<time>2024-05-01T08:00:00Z</time></trkpt>", 1)
    timed = timed.replace("<ele>99.0</ele>", "<ele>99.0</ele><time>soon</time>")
    track = read_track(write(timed))
    # 2024-05-01T08:00:00Z is 1714550400 s after 1970 (date -u -d).
    assert track.time_s[0] == 1714550400.0
    assert np.isnan(track.time_s[1:]).all()


def test_extensions_do_not_pass_for_heights_or_names(write, gpx):
    text = gpx(POINTS, name="Moor").replace(
        "<ele>100.0</ele>",
        "<ele>100.0</ele><extensions><x:ele>7</x:ele><x:name>no</x:name></extensions>",
    )
    track = read_track(write(text))
    _same_points(track)
    assert track.name == "Moor"


def test_every_recorded_file_reads_as_gpxpy_reads_it(recorded_courses):
    compared = 0
    for file in sorted(recorded_courses.glob("*.gpx")):
        try:
            peer = gpxpy.parse(file.read_text(encoding="utf-8-sig"))
        except gpxpy.gpx.GPXException:
            continue
        lines = [
            [point for segment in track.segments for point in segment.points]
            for track in peer.tracks
        ]
        lines = [line for line in [*lines, *(route.points for route in peer.routes)] if line]
        for number, line in enumerate(lines, 1):
            ours = read_track(file, number)
            assert ours.lat_deg.tolist() == [point.latitude for point in line]
            assert ours.lon_deg.tolist() == [point.longitude for point in line]
            theirs = [np.nan if p.elevation is None else p.elevation for p in line]
            assert np.array_equal(ours.elevation_m, theirs, equal_nan=True)
            compared += 1
    assert compared >= 25


def _with_two(gpx, first, second, *, kinds=("trk", "trk"), names=("One", "Two")):
    one = gpx(first, kind=kinds[0], name=names[0]).replace("</gpx>", "")
    return one + gpx(second, kind=kinds[1], name=names[1]).split(">\n", 2)[2]


FAR = [(51.0, 8.0, 10.0), (51.01, 8.0, 11.0)]
ON = [(50.0031, 7.0, 99.0), (50.01, 7.0, 98.0)]


def test_among_several_tracks_one_is_chosen_by_name_or_number(write, gpx):
    file = write(_with_two(gpx, POINTS, FAR))
    for choice in ("Two", 2, "2"):
        _same_points(read_track(file, choice), FAR)
    _same_points(read_track(file, "One"))


def test_several_tracks_that_do_not_join_are_refused_with_a_list(write, gpx):
    file = write(_with_two(gpx, POINTS, FAR))
    with pytest.raises(UnusableInputError) as refused:
        read_track(file)
    assert str(refused.value) == (
        f"{file}: 2 tracks that do not join: 1 track 'One' 0.4 km, 2 track 'Two' 1.1 km; "
        "expected one course. Choose one with course.track in the race file, or with --track."
    )


def test_a_track_that_is_not_there_is_refused_with_the_nearest_name(write, gpx):
    file = write(_with_two(gpx, POINTS, FAR, names=("North loop", "South loop")))
    with pytest.raises(UnusableInputError) as refused:
        read_track(file, "Nort loop")
    assert str(refused.value) == (
        f"{file}: course.track: no track is called 'Nort loop': 1 track 'North loop' 0.4 km, "
        "2 track 'South loop' 1.1 km; expected a name or a number of these. "
        "Did you mean 'North loop'?"
    )


def test_tracks_that_join_end_to_end_are_read_as_one_and_said_so(write, gpx):
    track = read_track(write(_with_two(gpx, POINTS, ON)))
    _same_points(track, [*POINTS, *ON])
    assert track.segment.tolist() == [0, 0, 0, 0, 1, 1]
    assert track.notes == (("tracks that join end to end read as one", "2 tracks"),)


def test_the_track_is_taken_before_the_route_and_said_so(write, gpx):
    track = read_track(write(_with_two(gpx, POINTS, FAR, kinds=("trk", "rte"))))
    _same_points(track)
    assert track.notes == (("the only track taken", "1 other left out"),)


def test_an_empty_route_beside_the_track_is_no_matter(write, gpx):
    track = read_track(write(_with_two(gpx, POINTS, [], kinds=("trk", "rte"))))
    _same_points(track)
    assert track.notes == ()


def test_segments_are_numbered(write, gpx):
    track = read_track(write(gpx(POINTS[:2], [], POINTS[2:])))
    _same_points(track)
    assert track.segment.tolist() == [0, 0, 1, 1]


def test_a_table_is_read_with_columns_in_any_order_and_empty_heights_missing(write):
    text = "\ufefflon_deg,elevation_m, lat_deg,note\r\n7.0,100,50.0,start\r\n\r\n7.001,,50.001,\r\n"
    track = read_track(write(text, "Low Moor.csv"))
    _same_points(track, [(50.0, 7.0, 100.0), (50.001, 7.001, None)])
    assert track.name == "Low Moor"


def test_a_table_without_heights_has_none(write):
    track = read_track(write("lat_deg,lon_deg\n50,7\n50.1,7\n", "c.CSV"))
    assert np.isnan(track.elevation_m).all()


def test_the_name_falls_back_to_the_file_and_then_the_file_name(write, gpx):
    inside = gpx(POINTS).replace("<trk>", "<metadata><name>Whole file</name></metadata><trk>")
    assert read_track(write(inside)).name == "Whole file"
    assert read_track(write(gpx(POINTS), "Moor.gpx")).name == "Moor"
