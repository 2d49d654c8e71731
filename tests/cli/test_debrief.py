"""``pacing debrief``: folder, season log, prediction, errors."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest

import pacing
from pacing.cli.app import main

RACE = """\
[course]
file = "course.csv"
[rider]
mass_kg = 70.0
critical_power_w = 260.0
w_prime_kj = 17.0
[[rider.positions]]
name = "low"
cda_m2 = 0.28
[bike]
mass_kg = 8.5
crr = 0.0045
[air]
temperature_c = 16.0
pressure_hpa = 1014.0
wind_speed_m_s = 1.0
wind_from_deg = 90.0
surroundings = "open field"
[plan]
max_cues = 3
"""


@pytest.fixture(scope="module")
def raced(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, Path]:
    """A race file of 4 km and a ride of its plan, a little late."""
    folder = tmp_path_factory.mktemp("raced")
    at = np.arange(0.0, 4001.0, 10.0)
    lat = 46.0 + at / 111_150.0
    height = 50.0 + 15.0 * np.sin(at / 640.0)
    rows = "\n".join(f"{a:.7f},-31.0,{h:.2f}" for a, h in zip(lat, height, strict=True))
    (folder / "course.csv").write_text(f"lat_deg,lon_deg,elevation_m\n{rows}\n", encoding="utf-8")
    race = folder / "race.toml"
    race.write_text(RACE, encoding="utf-8")
    plan = pacing.plan_race(pacing.load_race(race))
    trace = plan.trace
    clock = np.concatenate([[0.0], np.cumsum(trace["time_s"])])
    time = np.arange(0.0, clock[-1] + 1.0)
    where = np.interp(time, clock, plan.race.course.distance_m)
    speed = np.append(trace["speed_from_m_s"], trace["speed_to_m_s"].iloc[-1])
    course = plan.race.course
    frame = pd.DataFrame(
        {
            "time_s": 1.01 * time,
            "lat_deg": np.interp(where, course.distance_m, course.lat_deg),
            "lon_deg": -31.0,
            "elevation_m": np.interp(where, course.distance_m, course.elevation_m),
            "speed_m_s": np.interp(time, clock, speed) / 1.01,
            "power_w": np.interp(time, clock[1:], trace["power_w"]),
        }
    )  # fmt: skip
    ride = folder / "ride.csv"
    frame.to_csv(ride, index=False)
    return race, ride


def test_the_folder_holds_the_set_and_the_log_grows_by_one(
    raced: tuple[Path, Path], capsys: pytest.CaptureFixture[str]
) -> None:
    race, ride = raced
    for _ in range(2):
        assert main(["debrief", str(race), str(ride)]) == 0
    text = capsys.readouterr().out
    assert max(map(len, text.splitlines())) <= 100
    for said in ("Where the time went", "By cue", "By kilometre", "Numbers to bring up to date",
                 "Checked against 1 race"):  # fmt: skip
        assert said in text
    folder = race.with_name("race-debrief")
    assert {file.name for file in folder.iterdir()} == {
        "debrief.json", "debrief.png", "cues.csv", "splits.csv",
    }  # fmt: skip
    assert len(race.with_name("season.csv").read_text(encoding="utf-8").splitlines()) == 2


def test_json_has_the_promised_keys_and_parts_that_add_up(
    raced: tuple[Path, Path], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    race, ride = raced
    log = tmp_path / "log.csv"
    out = ["-o", str(tmp_path / "out"), "--season", str(log), "--json"]
    assert main(["debrief", str(race), str(ride), *out]) == 0
    document = json.loads(capsys.readouterr().out)
    promised = (
        "schema planned_s ridden_s difference_s parts_s cues best_with_hindsight_s updates masked"
    )
    assert set(promised.split()) <= set(document)
    assert document["schema"] == "debrief/1"
    assert set(document["parts_s"]) == {
        "power", "air_and_rolling", "limits_and_braking", "stops", "unexplained",
    }  # fmt: skip
    assert sum(document["parts_s"].values()) == pytest.approx(document["difference_s"], abs=0.1)
    assert all({"key", "value", "se"} <= set(update) for update in document["updates"])
    written = json.loads((tmp_path / "out" / "debrief.json").read_text(encoding="utf-8"))
    assert written == document
    assert log.exists()


def test_predict_only_checks_the_model(
    raced: tuple[Path, Path], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    race, ride = raced
    before = {file.name for file in race.parent.iterdir()}
    assert main(["debrief", str(race), str(ride), "--predict", "--json"]) == 0
    document: dict[str, Any] = json.loads(capsys.readouterr().out)
    assert document["schema"] == "prediction/1"
    assert document["error_pct"] == pytest.approx(-1.0, abs=0.6)
    assert document["drag_factor"] > 1.0
    assert {file.name for file in race.parent.iterdir()} == before
    out = tmp_path / "check"
    assert main(["debrief", str(race), str(ride), "--predict", "-o", str(out)]) == 0
    assert "% of time" in capsys.readouterr().out
    assert {file.name for file in out.iterdir()} == {
        "prediction.json", "prediction.png", "speed.csv",
    }  # fmt: skip


def test_a_folder_of_other_files_and_a_log_of_other_things_are_refused_before_long_work(
    raced: tuple[Path, Path], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    race, ride = raced
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "letter.txt").write_text("dear", encoding="utf-8")
    assert main(["debrief", str(race), str(ride), "-o", str(tmp_path / "mine")]) == 2
    assert "not ours" in capsys.readouterr().err
    log = tmp_path / "list.csv"
    log.write_text("milk,eggs\n1,2\n", encoding="utf-8")
    out = ["-o", str(tmp_path / "out"), "--season", str(log)]
    assert main(["debrief", str(race), str(ride), *out]) == 2
    assert "season log" in capsys.readouterr().err
    assert log.read_text(encoding="utf-8") == "milk,eggs\n1,2\n"
    assert not (tmp_path / "out").exists()


@pytest.mark.parametrize(
    ("ride", "words"), [("none.csv", "no such file"), ("course.csv", "no column time_s or time")]
)
def test_a_ride_that_is_none_is_one_message(
    raced: tuple[Path, Path], capsys: pytest.CaptureFixture[str], ride: str, words: str
) -> None:
    race, _ = raced
    assert main(["debrief", str(race), str(race.with_name(ride)), "--predict"]) == 2
    found = capsys.readouterr()
    assert words in found.err
    assert found.out == ""
