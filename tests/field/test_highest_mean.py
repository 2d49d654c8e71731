"""Highest mean power for each duration from a recording."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from pacing.errors import UnusableInputError
from pacing.field.highest_mean import highest_mean_power, is_recording, read_power


def test_each_duration_agrees_with_a_search_over_every_window() -> None:
    power = np.random.default_rng(3).uniform(100.0, 400.0, 300)
    means = highest_mean_power(np.arange(300.0), power, (5.0, 30.0, 120.0))
    for duration, mean, start in zip(*means, strict=True):
        n = int(duration)
        windows = [power[i : i + n].mean() for i in range(300 - n + 1)]
        assert mean == pytest.approx(max(windows))
        assert start == int(np.argmax(windows))


def test_a_window_never_reaches_over_a_gap() -> None:
    time = np.concatenate([np.arange(60.0), np.arange(200.0, 260.0)])
    means = highest_mean_power(time, np.full(120, 250.0), (30.0, 60.0, 90.0))
    assert means.duration_s.tolist() == [30.0, 60.0]


def test_missing_power_is_a_gap_not_a_zero() -> None:
    power = np.full(100, 200.0)
    power[50] = np.nan
    means = highest_mean_power(np.arange(100.0), power, (40.0, 60.0))
    assert means.duration_s.tolist() == [40.0]
    assert means.power_w.tolist() == [200.0]


def test_a_sample_every_other_second_stands_for_both() -> None:
    means = highest_mean_power(np.arange(0.0, 100.0, 2.0), np.tile([100.0, 300.0], 25), (4.0,))
    assert means.power_w == pytest.approx([200.0])


def test_a_ride_is_told_from_a_table_of_efforts(tmp_path: Path) -> None:
    ride, table = tmp_path / "ride.csv", tmp_path / "efforts.csv"
    ride.write_text("time_s,power_w\n0,200\n1,\n2,210\n", encoding="utf-8")
    table.write_text("duration_s,power_w\n180,387\n", encoding="utf-8")
    assert is_recording(ride)
    assert not is_recording(table)
    time, power = read_power(ride)
    assert time.tolist() == [0.0, 1.0, 2.0]
    assert np.isnan(power[1])


def test_clock_times_become_seconds_from_the_start(tmp_path: Path) -> None:
    ride = tmp_path / "ride.csv"
    ride.write_text(
        "time,power_w\n2031-05-02T09:00:00Z,200\n2031-05-02T09:00:03Z,210\n", encoding="utf-8"
    )
    assert read_power(ride)[0].tolist() == [0.0, 3.0]


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("time_s,power_w\n0,200\n0,201\n", "line 3: time_s: time that does not rise"),
        ("time_s,power_w\n0,200\nlater,201\n", "line 3: time: 'later'"),
        ("time_s,power_w\n0,lots\n", "line 2: power_w: 'lots'; expected watts, or nothing"),
        ("time_s,power_w\n0,200\n", "fewer than two samples"),
        ("time_s,watts\n0,200\n", "line 1: no time or no power column"),
    ],
)
def test_a_bad_recording_is_refused_with_the_line(tmp_path: Path, text: str, message: str) -> None:
    ride = tmp_path / "ride.csv"
    ride.write_text(text, encoding="utf-8")
    with pytest.raises(UnusableInputError, match=message):
        read_power(ride)
