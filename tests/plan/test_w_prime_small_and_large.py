"""W′ of nothing, of little and of much."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from typing import Any

import numpy as np
import pytest

from pacing.plan import plan_race
from pacing.plan.solve import best_constant, solve
from pacing.rider.budget import RECOVERY_LAWS

AT_M = 10.0 * np.arange(600)
GRADIENT = 0.035 * np.sin(2.0 * np.pi * AT_M / 2100.0)
STARTS = np.arange(0, 600, 40, dtype=np.intp)


@pytest.mark.parametrize("law", RECOVERY_LAWS)
@pytest.mark.parametrize(("w_prime_j", "reserve_j"), [(0.0, 0.0), (18_000.0, 18_000.0)])
def test_without_w_prime_the_optimum_never_exceeds_critical_power(
    make_road: Callable[..., Any],
    make_problem: Callable[..., Any],
    law: str,
    w_prime_j: float,
    reserve_j: float,
) -> None:
    problem = make_problem(make_road(GRADIENT), law=law, w_prime_j=w_prime_j, reserve_j=reserve_j)
    found = solve(problem, STARTS, np.full(STARTS.size, 300.0)).ride
    assert found.power_w.max() <= 300.0 + 1e-3
    # and nothing is gained below it: constant power is the optimum
    constant = best_constant(problem)
    assert constant.power_w[0] == pytest.approx(300.0, abs=0.01)
    assert found.motion.total_s == pytest.approx(constant.motion.total_s, abs=0.02)


def test_a_whole_plan_without_w_prime_stays_at_critical_power(
    make_race: Callable[..., Any],
) -> None:
    plan = plan_race(make_race(GRADIENT, rider__w_prime_kj=0.0))
    assert plan.inputs["model"]["reserve_j"] == 0.0
    assert plan.trace["power_w"].max() <= 300.0
    assert plan.cues["power_w"].to_numpy() == pytest.approx(np.full(len(plan.cues), 300.0))


@pytest.mark.parametrize("w_prime_kj", [1.0, 2.0, 60.0])
def test_little_and_much_w_prime_end_in_a_plan_that_holds(
    make_race: Callable[..., Any], w_prime_kj: float
) -> None:
    race = make_race(GRADIENT, rider__w_prime_kj=w_prime_kj)
    plan = plan_race(race)
    left = plan.trace["w_balance_to_j"]
    assert left.min() >= race.plan.reserve_j - 1e-6
    assert plan.cues["time_s"].min() >= race.plan.shortest_cue_s - 1e-6
    assert len(plan.cues) <= race.plan.max_cues
    gain_pct = 100.0 * (1.0 - plan.time_s / plan.constant["time_s"])
    assert -0.15 < gain_pct < 4.0


def test_much_w_prime_is_ridden_at_the_cap(make_race: Callable[..., Any]) -> None:
    # 80 kJ over some 8 min is 160 W above critical power; the cap of 400 W is below that
    plan = plan_race(make_race(GRADIENT, rider__w_prime_kj=80.0, plan__max_power_w=400.0))
    assert plan.cues["power_w"].iloc[1:].min() >= 395.0


def test_more_w_prime_is_never_slower(make_race: Callable[..., Any]) -> None:
    times = [
        plan_race(make_race(GRADIENT[:300], rider__w_prime_kj=kj, plan__reserve_kj=1.0)).time_s
        for kj in (2.0, 8.0, 24.0)
    ]
    assert all(later < before for before, later in pairwise(times))
