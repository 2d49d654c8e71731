"""``pacing plan``: its options, its output folder, its JSON."""

from __future__ import annotations

import json
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from pacing.cli.app import main

Write = Callable[..., Path]
WRITTEN = {
    "plan.json",
    "cues.csv",
    "trace.csv",
    "cue-sheet.pdf",
    "cue-sheet.png",
    "profile.png",
    "map.png",
    "cues.gpx",
}


def names(folder: Path) -> set[str]:
    return {file.name for file in folder.iterdir()}


def refuse_constants(name: str) -> None:
    raise AssertionError(f"{name} is not JSON")


def read(text: str) -> dict[str, Any]:
    document = json.loads(text, parse_constant=refuse_constants)
    assert isinstance(document, dict)
    return document


def test_the_plan_stands_beside_the_race_by_default(
    write_race: Write, capsys: pytest.CaptureFixture[str]
) -> None:
    race = write_race()
    assert main(["plan", str(race)]) == 0
    folder = race.with_name("race-plan")
    assert names(folder) == WRITTEN
    out, err = capsys.readouterr()
    assert err == ""
    assert out.endswith(f"\n\nThe sheet for the bars and all files: {folder}\n")
    assert main(["plan", str(race)]) == 0
    assert names(race.parent) == {"race.toml", "course.gpx", "race-plan"}


def test_json_is_the_plan_and_every_option_takes_effect(
    write_race: Write, small_race: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    day = write_race(small_race[small_race.index("[air]") :].replace("18.0", "4.0"), "day.toml")
    out = tmp_path / "deep" / "out"
    arguments = ["plan", str(write_race()), "-o", str(out), "--json"]
    assert main([*arguments, "--air", str(day), "--start", "14:05", "--cues", "3"]) == 0
    printed, err = capsys.readouterr()
    assert err == ""
    document = read(printed)
    assert document == read((out / "plan.json").read_text(encoding="utf-8"))
    assert document["schema"] == "plan/1"
    inputs = document["inputs"]
    assert inputs["air"]["temperature_c"] == 4.0
    assert (inputs["plan"]["start"], inputs["plan"]["max_cues"]) == ("14:05", 3)
    assert 1 <= len(document["cues"]) <= 3


def test_a_folder_that_is_not_ours_is_refused_before_the_work(
    write_race: Write,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.setattr("pacing.plan.plan_race", lambda _: pytest.fail("planned all the same"))
    out = tmp_path / "out"
    out.mkdir()
    (out / "notes.txt").write_text("mine")
    assert main(["plan", str(write_race()), "-o", str(out)]) == 2
    assert capsys.readouterr().err == (
        f"pacing: {out}: holds files that are not ours (notes.txt); expected a new or empty "
        "folder, or one from an earlier run. Choose another with -o.\n"
    )
    assert names(out) == {"notes.txt"}


@pytest.mark.skipif(not Path("/proc/version").is_file(), reason="needs a place nobody may write")
def test_a_folder_that_cannot_be_written_is_told(
    write_race: Write, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["plan", str(write_race()), "-o", "/proc/out"]) == 2
    assert capsys.readouterr().err == (
        "pacing: /proc/out: cannot be written (No such file or directory); "
        "expected a folder that can be written. Choose another with -o.\n"
    )


def test_a_race_that_cannot_be_ridden_ends_with_1_and_leaves_nothing(
    write_race: Write, small_race: str, capsys: pytest.CaptureFixture[str]
) -> None:
    race = write_race(small_race + "[plan]\nreserve_kj = 19\n")
    assert main(["plan", str(race)]) == 1
    assert capsys.readouterr() == (
        "",
        f"pacing: {race}, line 24: plan.reserve_kj: 19 kJ cannot be kept: "
        "W′ is 18 kJ from the start; expected at most 18.\n",
    )
    race = write_race(small_race + "[plan]\nmin_power_w = 390\nmax_power_w = 400\n")
    assert main(["plan", str(race)]) == 1
    out, err = capsys.readouterr()
    assert out == ""
    assert err.startswith("pacing: The reserve of 2.5 kJ cannot be kept")
    assert names(race.parent) == {"race.toml", "course.gpx"}


def test_a_rider_who_stalls_is_told_where_and_what_it_takes(
    write_race: Write, small_race: str, capsys: pytest.CaptureFixture[str]
) -> None:
    race = write_race(small_race.replace("304.0", "60").replace("18.0\n\n[[", "3.0\n\n[["))
    race.with_name("course.gpx").write_text(_steep(), encoding="utf-8")
    assert main(["plan", str(race)]) == 1
    out, err = capsys.readouterr()
    assert out == ""
    found = re.fullmatch(
        r"pacing: The rider stalls on the climb at km (\d\.\d\d): \d+ W is not enough\. "
        r"Riding it at 5 km/h takes (\d+) W; allow more with plan\.max_power_w, or check the "
        r"course's heights and the masses\.\n",
        err,
    )
    assert found
    # The ramp of 15 % begins at 0.6 km; 82.6 kg up it at 5 km/h: m g sin(atan 0.15) v, and about
    # 5 W of rolling, by hand.
    assert 0.59 < float(found[1]) < 0.75
    assert float(found[2]) == pytest.approx(82.6 * 9.80665 * 0.1483 * 5 / 3.6 + 5, rel=0.15)
    assert names(race.parent) == {"race.toml", "course.gpx"}


def _steep() -> str:
    points = "".join(
        f'<trkpt lat="{46.4 + 0.00018 * i:.5f}" lon="-31.7"><ele>{60 + 3.0 * max(0, i - 30)}</ele>'
        "</trkpt>"
        for i in range(90)
    )
    return (
        '<gpx version="1.1" creator="a test" xmlns="http://www.topografix.com/GPX/1/1">'
        f"<trk><trkseg>{points}</trkseg></trk></gpx>"
    )
