"""Broken course files, each with the message that tells what was found and how to mend it.

The expected texts are this program's promise; nothing outside it fixes them.
"""

from __future__ import annotations

import socket
import tracemalloc
from pathlib import Path

import pytest

from pacing.course import CourseSpec, gpx, load_course, read, table
from pacing.errors import UnusableInputError

HEAD = '<?xml version="1.0"?>\n<gpx version="1.1" creator="t">\n<trk><trkseg>\n'
FOOT = "</trkseg></trk>\n</gpx>\n"
GOOD = '<trkpt lat="50.0" lon="7.0"><ele>1</ele></trkpt>\n'
AGAIN = "Export the course again as GPX."
IS_GPX = "a GPX file (XML whose outermost element is <gpx>)"
TWO = "expected a track or a route with at least two points"

CASES = {
    "empty": (b"", "the file is empty; expected a GPX or CSV course file."),
    "blank": (b"  \n\t\n", "the file is empty; expected a GPX or CSV course file."),
    "not XML": (b"lat,lon\n1,2\n", f"line 1: not XML; expected {IS_GPX}. {AGAIN}"),
    "binary": (bytes(range(1, 120)), f"line 1: not XML; expected {IS_GPX}. {AGAIN}"),
    "XML that is not GPX": (
        b'<?xml version="1.0"?>\n<kml><Document/></kml>',
        f"line 2: XML that is not GPX: its outermost element is <kml>; expected <gpx>. {AGAIN}",
    ),
    "cut off in a tag": (
        (HEAD + GOOD + '<trkpt lat="50.1" lo').encode(),
        "line 5: the file is cut off inside <trkseg>; expected a complete file that ends with "
        "</gpx>. Download or copy it again.",
    ),
    "cut off between tags": (
        (HEAD + GOOD).encode(),
        "line 5: the file is cut off inside <trkseg>; expected a complete file that ends with "
        "</gpx>. Download or copy it again.",
    ),
    "tags crossed": (
        (HEAD + GOOD.replace("<ele>", "") + FOOT).encode(),
        f"line 4: not well-formed XML (mismatched tag); expected {IS_GPX}. {AGAIN}",
    ),
    "no points": (
        (HEAD + FOOT).encode(),
        f"no points; {TWO}. Export the course again as a track.",
    ),
    "waypoints only": (
        b'<gpx><wpt lat="1" lon="2"/></gpx>',
        f"no points; {TWO}. Export the course again as a track.",
    ),
    "one point": (
        (HEAD + GOOD + FOOT).encode(),
        f"only one point; {TWO}. Export the course again as a track.",
    ),
    "no heights": (
        (HEAD + "".join(f'<trkpt lat="50.{n:03d}" lon="7"/>\n' for n in range(9)) + FOOT).encode(),
        "no heights at all; expected a height (<ele>) at the points. Add heights with a route "
        "planner, or set course.flat = true if the course is level.",
    ),
    "latitude not a number": (
        (HEAD + GOOD + GOOD.replace("50.0", "NaN") + FOOT).encode(),
        f"line 5: lat is 'NaN'; expected lat as a number between -90 and 90. {AGAIN}",
    ),
    "latitude out of range": (
        (HEAD + GOOD.replace("50.0", "90.01") + FOOT).encode(),
        f"line 4: lat is '90.01'; expected lat as a number between -90 and 90. {AGAIN}",
    ),
    "longitude out of range": (
        (HEAD + GOOD.replace("7.0", "-200") + FOOT).encode(),
        f"line 4: lon is '-200'; expected lon as a number between -180 and 180. {AGAIN}",
    ),
    "longitude infinite": (
        (HEAD + GOOD.replace("7.0", "inf") + FOOT).encode(),
        f"line 4: lon is 'inf'; expected lon as a number between -180 and 180. {AGAIN}",
    ),
    "decimal comma": (
        (HEAD + GOOD.replace("50.0", "50,0") + FOOT).encode(),
        f"line 4: lat is '50,0'; expected lat as a number between -90 and 90. {AGAIN}",
    ),
    "longitude absent": (
        (HEAD + GOOD.replace(' lon="7.0"', "") + FOOT).encode(),
        "line 4: <trkpt> has no lon; expected lon as a number between -180 and 180. " + AGAIN,
    ),
    "height not a number": (
        (HEAD + GOOD.replace(">1<", ">high<") + FOOT).encode(),
        f"line 4: <ele> is 'high'; expected a height in metres. {AGAIN}",
    ),
    "points in one place": (
        (HEAD + GOOD * 5 + FOOT).encode(),
        "0 m of road; expected a course of at least 100 m. Export the whole course.",
    ),
    "unknown encoding": (
        b'<?xml version="1.0" encoding="klingon"?><gpx/>',
        "line 1: unknown encoding 'klingon'. Save the file as UTF-8.",
    ),
    "nested without end": (
        b"<gpx>" + b"<a>" * 100,
        f"line 1: elements nested deeper than 64; expected GPX. {AGAIN}",
    ),
}

TABLES = {
    "columns missing": (
        "lat,lon\n1,2\n",
        "line 1: no column lat_deg and lon_deg among: lat, lon; expected a header line with "
        "lat_deg, lon_deg and elevation_m. Name the columns so, separated by commas.",
    ),
    "latitude empty": (
        "lat_deg,lon_deg,elevation_m\n50,7,1\n,7,1\n",
        "line 3: lat_deg is ''; expected a number between -90 and 90.",
    ),
    "latitude not a number": (
        "lat_deg,lon_deg,elevation_m\nnan,7,1\n",
        "line 2: lat_deg is 'nan'; expected a number between -90 and 90.",
    ),
    "height not a number": (
        "lat_deg,lon_deg,elevation_m\n50,7,x\n",
        "line 2: elevation_m is 'x'; expected a height in metres.",
    ),
    "no rows": (
        "lat_deg,lon_deg,elevation_m\n",
        f"no points; {TWO}. Export the course again as a track.",
    ),
}


def _message(file: Path, **keys) -> str:
    with pytest.raises(UnusableInputError) as refused:
        load_course(CourseSpec(file=file, **keys))
    assert refused.value.exit_status == 2
    text = str(refused.value)
    assert text.startswith(str(file))
    return text[len(str(file)) :].lstrip(":, ")


@pytest.mark.parametrize("case", CASES)
def test_a_broken_gpx_file_is_refused_in_plain_words(tmp_path, case):
    content, message = CASES[case]
    file = tmp_path / "course.gpx"
    file.write_bytes(content)
    assert _message(file) == message


@pytest.mark.parametrize("case", TABLES)
def test_a_broken_table_is_refused_in_plain_words(tmp_path, case):
    content, message = TABLES[case]
    file = tmp_path / "course.csv"
    file.write_text(content)
    assert _message(file) == message


def test_a_file_that_is_not_there_is_named(tmp_path):
    assert _message(tmp_path / "gone.gpx") == "no such file; expected a GPX or CSV course file."


def test_a_folder_is_not_a_course(tmp_path):
    assert _message(tmp_path) == "a folder; expected a GPX or CSV file."


BILLION_LAUGHS = (
    '<?xml version="1.0"?>\n<!DOCTYPE gpx [\n<!ENTITY a "'
    + "ha" * 50
    + '">\n'
    + "".join(f'<!ENTITY {b} "{f"&{a};" * 10}">\n' for a, b in zip("abcdefgh", "bcdefghi"))  # noqa: B905
    + "]>\n<gpx><trk><name>&i;</name></trk></gpx>"
)
EXTERNAL = (
    '<?xml version="1.0"?>\n<!DOCTYPE gpx [<!ENTITY x SYSTEM "http://127.0.0.1:9/x">]>\n'
    "<gpx><trk><name>&x;</name></trk></gpx>"
)
REFUSED_DOCTYPE = (
    "line 2: a document type declaration, which can define entities that expand without end; "
    "expected GPX without <!DOCTYPE>. Remove the declaration, or export the course again from a "
    "source you trust."
)


@pytest.mark.parametrize("content", [BILLION_LAUGHS, EXTERNAL])
def test_entities_are_refused_before_they_expand_and_nothing_is_fetched(
    tmp_path, monkeypatch, content
):
    def no_network(*_, **__):
        raise AssertionError("the reader went to the network")

    monkeypatch.setattr(socket.socket, "connect", no_network)
    file = tmp_path / "course.gpx"
    file.write_text(content)
    tracemalloc.start()
    assert _message(file) == REFUSED_DOCTYPE
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < 5_000_000


def test_more_points_than_memory_should_hold_are_refused(tmp_path, monkeypatch):
    monkeypatch.setattr(gpx, "MOST_POINTS", 3)
    monkeypatch.setattr(table, "MOST_POINTS", 3)
    rest = (
        "more than 3 points; expected a course with fewer. Thin out the points or cut the course "
        "into parts."
    )
    file = tmp_path / "course.gpx"
    file.write_text(HEAD + GOOD * 4 + FOOT)
    assert _message(file) == f"line 7: {rest}"
    file = tmp_path / "course.csv"
    file.write_text("lat_deg,lon_deg\n" + "50,7\n" * 4)
    assert _message(file) == rest


def test_a_file_too_large_is_refused_before_it_is_read(tmp_path, monkeypatch):
    monkeypatch.setattr(read, "MOST_BYTES", 10)
    file = tmp_path / "course.gpx"
    file.write_text(HEAD + GOOD * 4 + FOOT)
    assert _message(file) == (
        "0 MB; expected a course file of at most 0 MB. Thin out the points or cut the course "
        "into parts."
    )


def test_more_kilometres_than_a_race_has_are_refused(tmp_path):
    file = tmp_path / "course.gpx"
    points = (f'<trkpt lat="{n / 10}" lon="7"><ele>1</ele></trkpt>' for n in range(100))
    file.write_text(HEAD + "\n".join(points) + FOOT)
    assert _message(file) == (
        "1,095 km of road; expected a course of at most 1,000 km, all laps included. Choose a "
        "part with course.from_km and course.to_km."
    )
