"""What is printed is ridden again and checked; what cannot be ridden is said in plain words."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from pacing.errors import CannotBeRiddenError, OurFaultError
from pacing.plan import plan_race
from pacing.plan.problem import ride
from pacing.plan.replay import refuse_reserve_broken, refuse_stall, replayed

STARTS = np.array([0, 30, 60], dtype=np.intp)


@pytest.fixture
def problem(make_road: Callable[..., Any], make_problem: Callable[..., Any]) -> Any:
    gradient = np.repeat([0.0, 0.05, -0.02], 30)
    return make_problem(make_road(gradient))


def test_an_honest_ride_is_ridden_again_to_the_same_time(problem: Any) -> None:
    ridden = ride(problem, STARTS, np.array([350.0, 380.0, 250.0]))
    again = replayed(ridden)
    assert again.motion.total_s == pytest.approx(ridden.motion.total_s, abs=1e-8)


def test_a_time_that_is_not_that_of_the_powers_is_our_fault(problem: Any) -> None:
    ridden = ride(problem, STARTS, np.array([350.0, 380.0, 250.0]))
    faster = replace(ridden.motion, time_s=0.999 * ridden.motion.time_s)
    with pytest.raises(OurFaultError, match=r"more or less when ridden again"):
        replayed(replace(ridden, motion=faster))


def test_a_reserve_broken_is_told_by_kilojoule_and_kilometre(problem: Any) -> None:
    hard = replace(problem, w_prime_j=6_000.0)
    ridden = ride(hard, np.zeros(1, dtype=np.intp), np.array([415.0]))
    # W′ falls at 115 W until the end at km 0.9
    short = (2_000.0 - ridden.balance_j[-1]) / 1000.0
    assert short > 0.1
    message = rf"W′ would fall {short:.1f} kJ below the reserve at km 0\.9"
    with pytest.raises(CannotBeRiddenError, match=message):
        refuse_reserve_broken(ridden)
    refuse_reserve_broken(ride(problem, STARTS, np.array([300.0, 310.0, 300.0])))


def test_a_stall_names_the_kilometre_and_the_power(
    make_road: Callable[..., Any], make_problem: Callable[..., Any]
) -> None:
    gradient = np.zeros(200)
    gradient[120:160] = 0.25
    problem = make_problem(make_road(gradient))
    ridden = ride(problem, np.zeros(1, dtype=np.intp), np.array([150.0]))
    with pytest.raises(CannotBeRiddenError) as refusal:
        refuse_stall(ridden)
    words = str(refusal.value)
    stalled_at_km = float(ridden.motion.stalled_cells[0]) / 100.0
    assert 1.20 <= stalled_at_km < 1.30
    assert f"at km {stalled_at_km:.2f}" in words
    assert "150 W is not enough" in words
    # 1.5 m/s up 25 %: m g (sin θ + Crr cos θ) and bearings and air, over the drivetrain
    force = 82.0 * 9.80665 * (0.25 + 0.004) / np.sqrt(1.0 + 0.25**2) + 0.091 + 0.0087 * 1.5
    needed = (force + 0.5 * 1.2 * 0.235 * 1.5**2) * 1.5 / 0.976
    assert f"at 5 km/h takes {needed:.0f} W" in words
    refuse_stall(ride(problem, np.zeros(1, dtype=np.intp), np.array([400.0])))


def test_a_race_whose_climb_is_too_steep_for_the_rider_is_refused(
    make_race: Callable[..., Any],
) -> None:
    gradient = np.repeat([0.0, 0.24, 0.0], [100, 150, 50])
    race = make_race(gradient, rider__critical_power_w=110.0, rider__w_prime_kj=6.0)
    with pytest.raises(CannotBeRiddenError, match=r"stalls on the climb at km 1\.\d\d: \d+ W"):
        plan_race(race)


def test_a_ramp_that_only_w_prime_can_climb_is_ridden(make_race: Callable[..., Any]) -> None:
    """180 W would stall on 25 %; the plan keeps W′ for the 150 m of it."""
    gradient = np.repeat([0.0, 0.25, 0.0], [200, 15, 400])
    race = make_race(gradient, rider__critical_power_w=180.0, rider__w_prime_kj=20.0)
    plan = plan_race(race)
    on_ramp = plan.trace.iloc[205:213]  # the wall's first cells overshoot on a 10 m grid
    assert on_ramp["target_w"].min() > 250.0
    assert on_ramp["speed_to_m_s"].iloc[2:].min() > 1.2


def test_a_least_power_that_eats_the_reserve_is_refused(make_race: Callable[..., Any]) -> None:
    race = make_race(np.zeros(1500), plan__min_power_w=340.0, plan__reserve_kj=2.0)
    with pytest.raises(CannotBeRiddenError, match=r"reserve of 2\.0 kJ cannot be kept"):
        plan_race(race)
