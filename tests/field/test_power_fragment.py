"""What is pasted into a race file is read back as it was fitted."""

from __future__ import annotations

import tomllib
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from pacing import load_race
from pacing.field import fit_power
from pacing.field.power_fragment import power_fragment
from pacing.rider.power_time import three_parameter_power_w

DURATIONS = [180.0, 420.0, 720.0, 1200.0]
POWERS = [387.0, 334.0, 312.0, 296.0]


def test_a_fragment_replaces_the_race_files_own_numbers(
    small_race: str, write_race: Callable[..., Path]
) -> None:
    fit = fit_power(DURATIONS, POWERS)
    rider, uncertainty = power_fragment(fit).removeprefix("[rider]\n").split("\n\n")
    text = small_race.replace("critical_power_w = 304.0\nw_prime_kj = 18.0", rider)
    race = load_race(write_race(text + "\n" + uncertainty))
    assert race.rider.critical_power_w == pytest.approx(fit.critical_power_w, abs=0.05)
    assert race.rider.w_prime_j == pytest.approx(fit.w_prime_j, abs=5.0)
    percent = 100.0 * fit.critical_power_se_w / fit.critical_power_w
    assert race.uncertainty.critical_power_pct == pytest.approx(percent, abs=0.005)


def test_a_three_parameter_fragment_carries_the_peak() -> None:
    durations = np.array([10.0, 60.0, 180.0, 600.0, 1200.0])
    power = three_parameter_power_w(
        durations, critical_power_w=280.0, w_prime_j=19_000.0, peak_power_w=900.0
    )
    rider = tomllib.loads(power_fragment(fit_power(durations, power)))["rider"]
    assert rider["fit_form"] == "three-parameter"
    assert rider["peak_power_w"] == pytest.approx(900.0)


def test_two_efforts_leave_the_default_uncertainty() -> None:
    fragment = tomllib.loads(power_fragment(fit_power([180.0, 720.0], [387.0, 309.0])))
    assert fragment["uncertainty"] == {}


def test_positions_are_named_with_their_shares() -> None:
    fit = fit_power([*DURATIONS, 600.0], [*POWERS, 330.0], positions=["low"] * 4 + ['the "high"'])
    fragment = power_fragment(fit)
    assert tomllib.loads(fragment)["rider"]["tested_position"] == "low"
    assert '# in rider.positions "the \\"high\\"": power_share = 1.0' in fragment
