"""``pacing course``: one screen, the same as JSON, a picture, and the right exit status."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest

from pacing.cli.app import main

FIGURES = {
    "schema", "name", "length_m", "length_horizontal_m", "climbing_raw_m", "climbing_m",
    "height_source", "height_noise_m", "gradient_error_pct", "steepest_100m", "steepest_1km",
    "bends", "headings", "pieces", "repairs", "cautions", "reasons", "verdict",
}  # fmt: skip


def _gpx(points, extra=""):
    rows = "\n".join(
        f'<trkpt lat="{lat!r}" lon="{lon!r}">'
        + ("" if ele is None else f"<ele>{ele!r}</ele>")
        + "</trkpt>"
        for lat, lon, ele in points
    )
    return f"<gpx><trk><name>Low Moor</name><trkseg>{rows}</trkseg></trk>{extra}</gpx>"


def _hill(count=300, heights=True):
    """3 km due east along 54° N, up 6 % for the middle kilometre."""
    way = np.arange(count) * 10.0
    height = 100.0 + 0.06 * np.clip(way - 1000.0, 0.0, 1000.0)
    # One degree of longitude at 54° N is 65,578 m on WGS84 (pyproj.Geod).
    return [
        (54.0, -1.0 + float(s) / 65_578.0, float(z) if heights else None)
        for s, z in zip(way, height, strict=True)
    ]


@pytest.fixture
def hill(tmp_path):
    file = tmp_path / "moor.gpx"
    file.write_text(_gpx(_hill()))
    return file


def _run(capsys, *arguments):
    status = main([*map(str, arguments)])
    out, err = capsys.readouterr()
    return status, out, err


def test_the_json_has_every_figure_of_the_course(hill, capsys):
    status, out, err = _run(capsys, "course", hill, "--json")
    assert (status, err) == (0, "")
    found = json.loads(out)
    assert set(found) >= FIGURES
    assert found["schema"] == "course/1"
    assert found["verdict"] == "good"
    assert found["length_horizontal_m"] == pytest.approx(2990.0, rel=1e-4)
    rise = math.hypot(1.0, 0.06)
    assert found["length_m"] == pytest.approx(1990.0 + 1000.0 * rise, rel=2e-4)
    assert found["climbing_m"] == pytest.approx(60.0, abs=1.0)
    assert found["climbing_raw_m"] == pytest.approx(60.0)
    assert found["steepest_1km"]["gradient_pct"] == pytest.approx(6.0, abs=0.3)
    assert found["steepest_1km"]["at_km"] == pytest.approx(1.5, abs=0.05)
    shares = {heading["towards"]: heading["share"] for heading in found["headings"]}
    assert shares["E"] == pytest.approx(1.0)
    assert sum(shares.values()) == pytest.approx(1.0)
    assert found["bends"] == found["repairs"] == found["cautions"] == []
    assert found["pieces"][0]["from_km"] == 0.0
    assert found["pieces"][-1]["to_km"] == pytest.approx(found["length_m"] / 1000.0)


def test_the_report_fits_one_screen(hill, capsys):
    status, out, _ = _run(capsys, "course", hill)
    assert status == 0
    lines = out.splitlines()
    assert len(lines) <= 40
    assert max(map(len, lines)) <= 80
    assert lines[0] == "Low Moor, 2.99 km"
    assert "Verdict: good." in lines


def test_every_recorded_course_fits_one_screen(recorded_courses, capsys):
    for file in sorted(recorded_courses.glob("*.gpx")):
        if file.stem in ("continental_4630km", "truncated_malformed"):
            continue
        _, out, _ = _run(capsys, "course", file)
        assert len(out.splitlines()) <= 50, file.name
        assert max(map(len, out.splitlines()), default=0) <= 80, file.name


@pytest.mark.parametrize(
    ("suffix", "head"), [("png", b"\x89PNG"), ("pdf", b"%PDF"), ("svg", b"<?xml")]
)
def test_the_picture_is_drawn_under_the_name_asked_for(hill, tmp_path, capsys, suffix, head):
    picture = tmp_path / f"moor.{suffix}"
    status, _, err = _run(capsys, "course", hill, "-o", picture)
    assert (status, err) == (0, "")
    assert picture.read_bytes().startswith(head)
    assert sorted(file.name for file in tmp_path.iterdir()) == sorted(["moor.gpx", picture.name])


def test_a_picture_of_another_kind_or_in_no_folder_is_refused_before_any_work(tmp_path, capsys):
    status, out, err = _run(capsys, "course", tmp_path / "gone.gpx", "-o", tmp_path / "a.doc")
    assert (status, out) == (2, "")
    assert err == (
        "pacing: --output: a picture called 'a.doc'; expected a name that ends in .png, .pdf, "
        ".svg.\n"
    )
    status, _, err = _run(capsys, "course", tmp_path / "gone.gpx", "-o", tmp_path / "no/a.png")
    assert status == 2
    assert err == f"pacing: {tmp_path / 'no'}: --output: no such folder. Make the folder first.\n"


def test_an_unusable_course_has_status_2_one_message_and_still_its_json(tmp_path, capsys):
    file = tmp_path / "level.gpx"
    file.write_text(_gpx(_hill(heights=False)))
    status, out, err = _run(capsys, "course", file, "--json")
    assert status == 2
    found = json.loads(out)
    assert found["verdict"] == "unusable"
    assert found["reasons"] == ["no heights at all; expected a height (<ele>) at the points"]
    assert found["climbing_m"] is None
    assert found["steepest_100m"] is None
    assert found["length_m"] == pytest.approx(2990.0, rel=1e-4)
    assert err.startswith(f"pacing: {file}: no heights at all; expected")
    assert err.count("\n") == 1


def test_several_tracks_have_the_json_too_and_one_can_be_chosen(tmp_path, capsys):
    file = tmp_path / "two.gpx"
    far = _gpx([(10.0 + n / 1000, 5.0, 7.0) for n in range(40)]).removeprefix("<gpx>")
    file.write_text(_gpx(_hill()).removesuffix("</gpx>") + far.replace("Low Moor", "Far"))
    status, out, err = _run(capsys, "course", file, "--json")
    assert status == 2
    found = json.loads(out)
    assert found["verdict"] == "unusable"
    assert found["length_m"] is None
    assert "2 tracks that do not join" in found["reasons"][0]
    assert "--track" in err
    status, out, _ = _run(capsys, "course", file, "--json", "--track", "Far")
    assert status == 0
    assert json.loads(out)["length_m"] == pytest.approx(4313.0, abs=2.0)


def test_a_file_that_cannot_be_read_has_no_json(tmp_path, capsys):
    file = tmp_path / "cut.gpx"
    file.write_text("<gpx><trk>")
    status, out, err = _run(capsys, "course", file, "--json")
    assert (status, out) == (2, "")
    assert "the file is cut off inside <trk>" in err
