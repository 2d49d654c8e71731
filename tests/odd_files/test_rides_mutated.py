"""Ride files changed at random, or simply strange: masked data or one sentence, no traceback."""

from __future__ import annotations

import random
from pathlib import Path
from time import perf_counter
from typing import Any

import numpy as np
import pandas as pd
import pytest

import pacing
from pacing.errors import PacingError, UnusableInputError
from pacing.field.drag_fit import fit_drag
from pacing.field.recording_check import check
from pacing.field.recording_read import read_recording

CELLS = (
    "", "nan", "inf", "-inf", "-1", "1e308", "9" * 30, "abc", '"', "0", "1,5", "  7  ", "\x00",
    "2031-05-04T08:00:00Z", "99:99", "±3", "1_000", "0x1F", "-0.0", "1e-320",
)  # fmt: skip
CSV = "time_s,lat_deg,lon_deg,elevation_m,distance_m,speed_m_s,power_w,cadence_rpm,lap,position\n"


def ride_rows(seconds: int = 240) -> list[str]:
    return [
        f"{t},{46 + 8e-5 * t:.6f},-31.0,{100 + 0.01 * t:.1f},{8.9 * t:.1f},8.9,{200 + t % 9},90,"
        f"{1 + t // 120},low"
        for t in range(seconds)
    ]


def gpx_text(seconds: int = 120) -> str:
    points = "\n".join(
        f'<trkpt lat="{46 + 8e-5 * t:.6f}" lon="-31.0"><ele>{100 + t % 5}</ele>'
        f"<time>2031-05-04T08:{t // 60:02d}:{t % 60:02d}Z</time>"
        f"<extensions><power>{180 + t % 7}</power></extensions></trkpt>"
        for t in range(seconds)
    )
    return f'<gpx version="1.1" creator="t"><trk><trkseg>{points}</trkseg></trk></gpx>'


@pytest.fixture(scope="module")
def race(tmp_path_factory: pytest.TempPathFactory) -> Any:
    folder = tmp_path_factory.mktemp("race")
    rows = "\n".join(f"{46 + 8e-5 * i:.6f},-31.0,100" for i in range(300))
    (folder / "course.csv").write_text(f"lat_deg,lon_deg,elevation_m\n{rows}\n", encoding="utf-8")
    (folder / "race.toml").write_text(
        '[course]\nfile = "course.csv"\n[rider]\nmass_kg = 70\ncritical_power_w = 250\n'
        'w_prime_kj = 18\n[[rider.positions]]\nname = "low"\ncda_m2 = 0.3\n[bike]\nmass_kg = 9\n'
        "crr = 0.005\n[air]\ntemperature_c = 15\npressure_hpa = 1013\nwind_speed_m_s = 1\n"
        "wind_from_deg = 200\n",
        encoding="utf-8",
    )
    return pacing.load_race(folder / "race.toml")


def mutated_csv(chance: random.Random) -> str:
    lines = [CSV.strip(), *ride_rows()]
    for _ in range(chance.randint(1, 12)):
        at = chance.randrange(len(lines))
        match chance.randrange(9):
            case 0:
                del lines[at]
            case 1:
                lines.insert(at, chance.choice(lines))
            case 2:
                cells = lines[at].split(",")
                cells[chance.randrange(len(cells))] = chance.choice(CELLS)
                lines[at] = ",".join(cells)
            case 3:
                column = chance.randrange(10)
                word = chance.choice(CELLS)
                for k in range(1, len(lines)):
                    cells = lines[k].split(",")
                    if column < len(cells):
                        cells[column] = word
                    lines[k] = ",".join(cells)
            case 4:
                lines[at] = lines[at][: chance.randrange(len(lines[at]) + 1)]
            case 5:
                place = chance.randrange(len(lines[at]) + 1)
                lines[at] = f"{lines[at][:place]}{chr(chance.randrange(1, 400))}{lines[at][place:]}"
            case 6:
                end = min(at + chance.randrange(60), len(lines))
                lines[at:end] = lines[at:end][::-1]
            case 7:
                lines = [line.replace(",", ";") for line in lines]
            case _:
                lines = lines[: max(at, 1)]
        lines = lines or [""]
    return chance.choice(("\n", "\r\n")).join(lines)


def mutated_gpx(chance: random.Random) -> str:
    text = gpx_text()
    for _ in range(chance.randint(1, 3)):
        at = chance.randrange(len(text))
        end = min(at + chance.randrange(1, 90), len(text))
        match chance.randrange(5):
            case 0:
                text = text[:at] + text[end:]
            case 1:
                text = text[:at] + chr(chance.randrange(32, 400)) + text[at:]
            case 2:
                text = text[:end] + text[at:]
            case 3:
                old = chance.choice(("power", "time", "lat", "trkpt", "8e", "T08", "46."))
                text = text.replace(old, chance.choice(CELLS), chance.randrange(1, 40))
            case _:
                text = text[:at]
    return text


@pytest.mark.parametrize(("make", "suffix"), [(mutated_csv, "csv"), (mutated_gpx, "gpx")])
def test_hundreds_of_mutated_rides_are_masked_or_refused(
    tmp_path: Path, make: Any, suffix: str
) -> None:
    file = tmp_path / f"ride.{suffix}"
    chance, read, refused = random.Random(5), 0, 0
    for _ in range(400):
        file.write_text(make(chance), encoding="utf-8", errors="replace", newline="")
        try:
            ride = check(read_recording(file))
        except PacingError as problem:
            assert isinstance(problem, UnusableInputError)
            assert len(str(problem)) < 700
            refused += 1
            continue
        read += 1
        assert np.all(np.diff(ride.time_s) > 0.0)
        assert np.isfinite(ride.travelled_m).all()
        assert np.isfinite(ride.speed_m_s[:-1][ride.whole]).all()
        assert np.isfinite(ride.power_w[:-1][ride.whole]).all()
    assert read > 20
    assert refused > 20


def test_mutated_rides_go_through_fit_and_debrief_without_a_traceback(
    tmp_path: Path, race: Any
) -> None:
    from pacing.field.debrief_predict import predict

    file = tmp_path / "ride.csv"
    chance, fitted = random.Random(17), 0
    for _ in range(60):
        file.write_text(mutated_csv(chance), encoding="utf-8", errors="replace", newline="")
        for use in (
            lambda: fit_drag(file, race=race),
            lambda: predict(check(read_recording(file)), race),
        ):
            try:
                use()
                fitted += 1
            except PacingError:
                continue
    assert fitted > 5


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "the file is empty"),
        ("time_s,power_w\n0,100\n1,100\n", "neither lat_deg and lon_deg nor distance_m"),
        ("power_w,distance_m\n100,0\n", "no column time_s or time"),
        ("time_s,distance_m\n0,1\n1,2\n", "no column power_w"),
        ("time_s,distance_m,power_w\n0,1,200\n", "fewer than two samples"),
        ("time_s,distance_m,power_w\n0,1,\n1,2,\n", "no power was recorded"),
        ("time_s,distance_m,power_w\nx,1,200\ny,2,200\n", "line 2: time_s: 'x'"),
        ("<gpx><trk></trk></gpx>", "no track points with a time"),
        ("<kml></kml>", "not GPX"),
        ("<gpx><trk>", "not well-formed XML"),
        ("<!DOCTYPE gpx><gpx></gpx>", "document type declaration"),
    ],
)
def test_a_ride_that_is_none_says_why(tmp_path: Path, text: str, words: str) -> None:
    file = tmp_path / "ride.csv"
    file.write_text(text, encoding="utf-8")
    with pytest.raises(UnusableInputError) as problem:
        read_recording(file)
    assert words in str(problem.value)
    assert "ride.csv" in str(problem.value)


def test_a_folder_and_a_missing_file_are_told(tmp_path: Path) -> None:
    for path, words in ((tmp_path, "a folder"), (tmp_path / "none.csv", "no such file")):
        with pytest.raises(UnusableInputError, match=words):
            read_recording(path)


def test_six_hours_at_one_sample_a_second_take_seconds(tmp_path: Path, race: Any) -> None:
    # no timed assertion: the figure is printed; 21,600 samples of laps with noise
    random_ = np.random.default_rng(2)
    time = np.arange(21_600.0)
    angle = 2 * np.pi * 8.5 * time / 7000.0
    speed = 8.5 + 1.5 * np.sin(2 * angle) + 0.05 * random_.standard_normal(time.size)
    frame = pd.DataFrame(
        {
            "time_s": time,
            "lat_deg": 46 + 1100 * np.sin(angle) / 111_150,
            "lon_deg": -31 + 1100 * np.cos(angle) / 77_300,
            "elevation_m": 100 + 20 * np.sin(3 * angle) + 0.2 * random_.standard_normal(time.size),
            "speed_m_s": speed,
            "power_w": 210 + 60 * np.sin(2 * angle) + 10 * random_.standard_normal(time.size),
        }
    )
    file = tmp_path / "long.csv"
    frame.to_csv(file, index=False)
    began = perf_counter()
    ride = check(read_recording(file))
    fit_drag(file, race=race)
    print(f"\nsix hours: {perf_counter() - began:.1f} s", end="")
    assert ride.time_s.size == 21_600
