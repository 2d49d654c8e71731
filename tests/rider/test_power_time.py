"""Power for a duration: the forms agree with each other and with their limits."""

from __future__ import annotations

import math

import numpy as np
import pytest

from pacing.errors import UnusableInputError
from pacing.rider.power_time import (
    altitude_factor,
    declined_critical_power_w,
    durability_factors,
    highest_power_w,
    omni_domain_power_w,
    power_limit_now_w,
    three_parameter_duration_s,
    three_parameter_power_w,
    two_parameter_duration_s,
    two_parameter_power_w,
    two_parameter_work_j,
)

TWO = {"critical_power_w": 300.0, "w_prime_j": 20_000.0}
THREE = {**TWO, "peak_power_w": 1_000.0}
DURATIONS = np.array([5.0, 30.0, 180.0, 1200.0, 7200.0])


def test_the_three_ways_to_write_two_parameters_are_one_curve() -> None:
    power = two_parameter_power_w(DURATIONS, **TWO)
    assert two_parameter_duration_s(power, **TWO) == pytest.approx(DURATIONS)
    assert two_parameter_work_j(DURATIONS, **TWO) == pytest.approx(power * DURATIONS)


def test_critical_power_and_less_is_held_for_ever() -> None:
    assert np.all(np.isinf(two_parameter_duration_s(np.array([300.0, 100.0]), **TWO)))
    assert np.all(np.isinf(three_parameter_duration_s(np.array([300.0, 100.0]), **THREE)))


def test_the_three_parameter_power_inverts_its_duration() -> None:
    power = three_parameter_power_w(DURATIONS, **THREE)
    assert three_parameter_duration_s(power, **THREE) == pytest.approx(DURATIONS)


def test_the_three_parameter_curve_starts_at_peak_power() -> None:
    assert three_parameter_power_w(0.0, **THREE) == pytest.approx(1_000.0)


def test_the_limit_now_falls_from_peak_to_critical_power_as_w_prime_empties() -> None:
    left = np.array([20_000.0, 10_000.0, 0.0])
    assert power_limit_now_w(left, **THREE) == pytest.approx([1_000.0, 650.0, 300.0])


def test_riding_at_the_limit_now_empties_w_prime_as_the_three_parameter_curve_says() -> None:
    # Held from rested, P is possible until the limit has fallen to it: (W′ − W)/(P − CP) with
    # W = W′ (P − CP)/(Pmax − CP), which is Morton's duration.
    power = 450.0
    left = (power - 300.0) / 700.0 * 20_000.0
    assert power_limit_now_w(left, **THREE) == pytest.approx(power)
    duration = three_parameter_duration_s(power, **THREE)
    assert duration == pytest.approx((20_000.0 - left) / (power - 300.0))


def test_the_omni_domain_curve_runs_from_peak_power_to_the_two_parameter_one() -> None:
    assert omni_domain_power_w(1e-6, **THREE) == pytest.approx(1_000.0, abs=0.01)
    long = omni_domain_power_w(1_800.0, **THREE, long_decline_w=20.0)
    assert long == pytest.approx(two_parameter_power_w(1_800.0, **TWO))


def test_the_omni_domain_curve_falls_by_the_decline_per_e_fold_beyond_half_an_hour() -> None:
    with_decline = omni_domain_power_w(1_800.0 * math.e, **THREE, long_decline_w=20.0)
    without = omni_domain_power_w(1_800.0 * math.e, **THREE)
    assert without - with_decline == pytest.approx(20.0)


def test_the_default_decline_costs_5_percent_in_an_hour_and_10_in_two() -> None:
    # 0.07 CP: −4.9 % at 60 min and −9.7 % at 2 h, the size measured by Clark et al. 2018, 2019
    planned = declined_critical_power_w(
        np.array([600.0, 1_800.0, 3_600.0, 7_200.0]), critical_power_w=1.0, long_decline_w=0.07
    )
    assert planned == pytest.approx([1.0, 1.0, 0.951, 0.903], abs=5e-4)


def test_the_highest_power_follows_the_form_of_the_fit() -> None:
    capped = highest_power_w(DURATIONS, **TWO, peak_power_w=700.0)
    assert capped == pytest.approx(np.minimum(two_parameter_power_w(DURATIONS, **TWO), 700.0))
    three = highest_power_w(DURATIONS[:4], **THREE, fit_form="three-parameter")
    assert three == pytest.approx(three_parameter_power_w(DURATIONS[:4], **THREE))
    assert highest_power_w(180.0, **TWO) == pytest.approx(300.0 + 20_000.0 / 180.0)


def test_a_three_parameter_rider_without_a_peak_is_refused() -> None:
    with pytest.raises(UnusableInputError, match="no peak power"):
        highest_power_w(180.0, **TWO, fit_form="three-parameter")


def test_durability_falls_in_a_line_and_is_held_beyond_twice_two_hours() -> None:
    factors = durability_factors(
        np.array([0.0, 150.0, 300.0, 600.0, 900.0]) * 7_200.0, critical_power_w=300.0
    )
    assert factors.critical_power == pytest.approx([1.0, 0.9535, 0.907, 0.814, 0.814])
    assert factors.w_prime == pytest.approx([1.0, 0.905, 0.81, 0.62, 0.62])


@pytest.mark.parametrize("acclimatised", [True, False])
def test_sea_level_and_below_cost_nothing(acclimatised: bool) -> None:
    assert altitude_factor(np.array([0.0, -100.0]), acclimatised=acclimatised) == pytest.approx(1.0)
