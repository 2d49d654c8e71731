"""The most power possible now falls with W′ left, with a three-parameter fit and only then."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.plan.problem import ride
from pacing.plan.solve import best_constant, solve
from pacing.rider.power_time import power_limit_now_w

AT_M = 10.0 * np.arange(400)
GRADIENT = 0.04 * np.sin(2.0 * np.pi * AT_M / 1300.0)
STARTS = np.arange(0, 400, 40, dtype=np.intp)


def room_w(ridden: Any) -> Any:
    """Power possible at the end of each cell less the power asked for there (N,).

    Source: morton-1996, CP + (Pmax − CP) W/W′.
    """
    problem = ridden.problem
    most = power_limit_now_w(
        ridden.balance_j[1:],
        critical_power_w=problem.critical_power_w,
        w_prime_j=problem.w_prime_j,
        peak_power_w=problem.peak_power_w,
    )
    return most - ridden.target_w / problem.power_share


@pytest.fixture
def problem(make_road: Callable[..., Any], make_problem: Callable[..., Any]) -> Any:
    return make_problem(
        make_road(GRADIENT),
        peak_power_w=520.0,
        max_power_w=520.0,
        first_30_s_max_w=520.0,
        reserve_j=200.0,
    )


def test_the_optimum_asks_for_no_more_than_is_possible_at_any_moment(problem: Any) -> None:
    found = solve(problem, STARTS, np.full(STARTS.size, 320.0)).ride
    assert room_w(found).min() >= -0.01
    assert room_w(found).min() < 1.0
    # the limit is what shapes this plan: without it more would be asked
    free = solve(ride_free_of_peak(problem), STARTS, np.full(STARTS.size, 320.0)).ride
    assert free.motion.total_s < found.motion.total_s - 0.05


def ride_free_of_peak(problem: Any) -> Any:
    from dataclasses import replace

    return replace(problem, peak_power_w=None)


def test_the_best_constant_target_is_possible_at_every_moment(problem: Any) -> None:
    constant = best_constant(problem)
    assert room_w(constant).min() >= -0.01
    higher = ride(problem, constant.starts, constant.power_w + 0.5)
    assert room_w(higher).min() < 0.0 or higher.balance_j.min() < problem.reserve_j


def test_the_printed_plan_asks_for_no_more_than_is_possible(
    plan_named: Callable[[str], Any],
) -> None:
    plan = plan_named("three parameters")
    model, trace = plan.inputs["model"], plan.trace
    most = power_limit_now_w(
        trace["w_balance_to_j"].to_numpy(),
        critical_power_w=model["critical_power_w"],
        w_prime_j=model["w_prime_j"],
        peak_power_w=model["peak_power_w"],
    )
    assert np.min(most - trace["power_w"].to_numpy()) >= -0.01


def test_in_the_two_parameter_form_the_peak_is_a_flat_cap(
    make_race: Callable[..., Any],
) -> None:
    from pacing.plan import plan_race

    plan = plan_race(make_race(GRADIENT, rider__peak_power_w=345.0))
    assert plan.inputs["model"]["peak_power_w"] is None
    assert plan.inputs["model"]["max_power_w"] == 345.0
    assert plan.cues["power_w"].max() == 345.0
