"""What the meter shows, where it sits, and what is true."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.plan import plan_race
from pacing.plan.prepare import prepare

GRADIENT = 0.03 * np.sin(2.0 * np.pi * np.arange(400) / 130.0)


@pytest.mark.parametrize("factor", [0.95, 1.0, 1.04])
def test_printed_targets_are_as_the_meter_shows_and_the_ride_is_true(
    make_race: Callable[..., Any], factor: float
) -> None:
    # power_meter_factor is true power over what is shown
    plan = plan_race(make_race(GRADIENT, rider__power_meter_factor=factor))
    shown = plan.cues["power_w"].to_numpy()
    assert shown == pytest.approx(5.0 * np.round(shown / 5.0), abs=1e-9)
    assert set(np.round(plan.trace["target_w"].to_numpy() / factor, 6)) == set(np.round(shown, 6))


def test_a_meter_that_errs_changes_what_is_printed_and_hardly_the_time(
    make_race: Callable[..., Any],
) -> None:
    honest = plan_race(make_race(GRADIENT))
    low = plan_race(make_race(GRADIENT, rider__power_meter_factor=1.04))
    assert low.time_s == pytest.approx(honest.time_s, rel=1.5e-3)
    assert low.constant["time_s"] == pytest.approx(honest.constant["time_s"], abs=1e-6)
    ratio = honest.constant["power_w"] / low.constant["power_w"]
    assert ratio == pytest.approx(1.04, abs=1e-6)
    shown = [
        float((p.trace["target_w"] * p.trace["time_s"]).sum() / p.time_s) for p in (honest, low)
    ]
    assert shown[0] == pytest.approx(shown[1], abs=1.5)


def test_with_a_hub_meter_all_that_is_shown_drives_the_wheel(
    make_race: Callable[..., Any],
) -> None:
    """The same rider measured behind the chain has 2.4 % less critical power and W′."""
    crank = prepare(make_race(GRADIENT)).constant
    hub = prepare(
        make_race(
            GRADIENT,
            bike__power_measured_at="hub",
            rider__critical_power_w=300.0 * 0.976,
            rider__w_prime_kj=18.0 * 0.976,
            plan__reserve_kj=2.5 * 0.976,
            rider__recovery_law="none",
            plan__max_power_w=400.0 * 0.976,
        )
    ).constant
    of_crank = prepare(
        make_race(GRADIENT, rider__recovery_law="none", plan__max_power_w=400.0)
    ).constant
    assert hub.motion.total_s == pytest.approx(of_crank.motion.total_s, abs=1e-4)
    assert hub.power_w[0] == pytest.approx(0.976 * of_crank.power_w[0], abs=1e-3)
    assert crank.problem.road.efficiency == 0.976
