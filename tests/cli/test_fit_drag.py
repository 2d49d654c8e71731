"""``pacing fit-drag``: text, JSON, picture, positions, errors."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from pacing.cli.app import main


@pytest.fixture(scope="module")
def frame() -> pd.DataFrame:
    """Forty minutes on a hilly loop by a rider of CdA 0.30 m², speeds prescribed, noise added."""
    noise = np.random.default_rng(8)
    time = np.arange(2400.0)
    angle = 2 * np.pi * time / 480.0
    speed = 9.0 + 3.0 * np.sin(2 * angle)
    at = np.concatenate([[0.0], np.cumsum(0.5 * (speed[1:] + speed[:-1]))])
    heading = 2 * np.pi * at / 4300.0
    radius = 4300.0 / (2 * np.pi)
    # most of what is gained in speed is lost in height, so that nobody has to brake
    height = 100.0 - 0.9 * 0.5 * speed**2 / 9.81
    force = 0.5 * 1.21 * 0.30 * speed**2 + 0.005 * 83.0 * 9.81
    gain = 84.4 * np.gradient(0.5 * speed**2) + 83.0 * 9.81 * np.gradient(height)
    power = (force * speed + gain) / 0.976
    return pd.DataFrame(
        {
            "time_s": time,
            "lat_deg": 46.4 + radius * np.sin(heading) / 111_150.0,
            "lon_deg": -31.7 - radius * np.cos(heading) / 76_800.0,
            "elevation_m": height + 0.15 * noise.standard_normal(time.size),
            "speed_m_s": speed + 0.05 * noise.standard_normal(time.size),
            "Watts": np.maximum(power, 0.0),
            "lap": 1.0 + time // 1200.0,
        }
    )


@pytest.fixture
def session(frame: pd.DataFrame, tmp_path: Path, write_race: Callable[..., Path]) -> list[str]:
    """A ride whose power column has another name, and its race."""
    ride = tmp_path / "laps.csv"
    frame.to_csv(ride, index=False)
    race = write_race()
    return [str(ride), "--race", str(race), "--columns", "power_w=Watts"]


def test_the_text_fits_the_screen_and_says_everything(
    session: list[str], capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["fit-drag", *session]) == 0
    text = capsys.readouterr().out
    assert max(map(len, text.splitlines())) <= 100
    for said in ("drag area CdA", "rolling Crr", "95 %", "energy balance", "share of variance",
                 "To paste into a race file", "[[rider.positions]]", "quiet roads"):  # fmt: skip
        assert said in text


def test_json_has_the_promised_keys_and_nothing_else_is_printed(
    session: list[str], capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["fit-drag", *session, "--json"]) == 0
    document = json.loads(capsys.readouterr().out)
    promised = (
        "schema cda_m2 cda_low_m2 cda_high_m2 crr crr_low crr_high separable method wind masked"
        " warnings fragment"
    )
    assert set(promised.split()) <= set(document)
    assert document["schema"] == "drag-fit/1"
    assert document["cda_low_m2"] < document["cda_m2"] < document["cda_high_m2"]
    assert document["cda_m2"] == pytest.approx(0.30, abs=0.03)
    assert all({"from_s", "to_s", "why"} <= set(mask) for mask in document["masked"])


def test_positions_by_lap_come_with_their_difference(
    session: list[str], capsys: pytest.CaptureFixture[str]
) -> None:
    asked = ["--position", "low=lap 1", "--position", "upright=lap 2", "--json"]
    assert main(["fit-drag", *session, *asked]) == 0
    document = json.loads(capsys.readouterr().out)
    assert [p["name"] for p in document["positions"]] == ["low", "upright"]
    (difference,) = document["differences"]
    assert difference["cda_low_m2"] < 0.0 < difference["cda_high_m2"]


@pytest.mark.parametrize("suffix", [".png", ".pdf", ".svg"])
def test_a_picture_is_drawn_whole(session: list[str], tmp_path: Path, suffix: str) -> None:
    picture = tmp_path / f"misfit{suffix}"
    assert main(["fit-drag", *session, "-o", str(picture)]) == 0
    head = {".png": b"\x89PNG", ".pdf": b"%PDF", ".svg": b"<?xml"}[suffix]
    assert picture.read_bytes().startswith(head)
    assert not list(tmp_path.glob(".*part"))


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["laps.csv"], "--race: no race file"),
        (["none.csv", "--race", "RACE"], "none.csv: no such file"),
        (["laps.csv", "--race", "RACE"], "no column power_w"),
        (["laps.csv", "--race", "RACE", "--columns", "power_w=Wats"], "no column 'Wats'"),
        (["laps.csv", "--race", "RACE", "--position", "low"], "--position"),
        (["laps.csv", "--race", "RACE", "--columns", "power_w=Watts", "--method", "x"], "a method"),
        (["laps.csv", "--race", "RACE", "-o", "misfit.doc"], "misfit.doc"),
    ],
)
def test_each_mistake_is_one_message_and_status_2(
    session: list[str],
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
    arguments: list[str],
    words: str,
) -> None:
    monkeypatch.chdir(tmp_path)
    called = [session[2] if word == "RACE" else word for word in arguments]
    assert main(["fit-drag", *called]) == 2
    found = capsys.readouterr()
    assert found.out == ""
    assert found.err.startswith("pacing: ")
    assert found.err.count("\n") == 1
    assert words in found.err
