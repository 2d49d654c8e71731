"""Powers in whole steps, chosen together: the reserve holds and next to nothing is lost."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from itertools import product
from typing import Any

import numpy as np
import pytest

from pacing.plan.problem import ride
from pacing.plan.rounding import rounded, spare_j
from pacing.plan.solve import best_constant, solve

AT_M = 10.0 * np.arange(400)
GRADIENT = 0.035 * np.sin(2.0 * np.pi * AT_M / 1500.0)


@pytest.fixture(scope="module")
def problem(make_road: Callable[..., Any], make_problem: Callable[..., Any]) -> Any:
    return make_problem(make_road(GRADIENT))


def optimum(problem: Any, pieces: int) -> Any:
    starts = np.arange(0, 400, 400 // pieces, dtype=np.intp)
    return solve(problem, starts, np.full(starts.size, 320.0))


@pytest.mark.parametrize("step_w", [1.0, 5.0, 10.0, 25.0])
@pytest.mark.parametrize("law", ["two-phase", "none", "skiba-2015"])
def test_powers_are_whole_steps_within_bounds_and_the_reserve_holds(
    make_problem: Callable[..., Any], problem: Any, law: str, step_w: float
) -> None:
    of_law = make_problem(problem.road, law=law, min_power_w=60.0, max_power_w=410.0)
    found = optimum(of_law, 8)
    printed = rounded(found, step_w=step_w)
    steps = printed.power_w / step_w
    assert steps == pytest.approx(np.round(steps), abs=1e-9)
    assert printed.power_w.min() >= 60.0 - 1e-9
    assert printed.power_w.max() <= 410.0 + 1e-9
    assert printed.power_w[0] <= 400.0 + 1e-9
    assert printed.balance_j.min() >= of_law.reserve_j


@pytest.mark.parametrize("everywhere", [True, False])
def test_no_way_of_rounding_up_or_down_is_faster(problem: Any, everywhere: bool) -> None:
    """All 4^4 choices among the steps around each power, ridden and compared."""
    found = optimum(replace(problem, reserve_everywhere=everywhere), 4)
    printed = rounded(found, step_w=10.0)
    below = 10.0 * np.floor(found.ride.power_w / 10.0)
    best = np.inf
    for choice in product((-10.0, 0.0, 10.0, 20.0), repeat=4):
        power = np.clip(below + choice, 0.0, 420.0)
        tried = ride(found.ride.problem, found.ride.starts, power)
        if power[0] <= 400.0 and spare_j(tried) >= 0.0:
            best = min(best, tried.motion.total_s)
    assert printed.motion.total_s <= best + 0.05


def test_fine_steps_lose_next_to_nothing(problem: Any) -> None:
    found = optimum(problem, 10)
    lost = [
        rounded(found, step_w=step_w).motion.total_s - found.ride.motion.total_s
        for step_w in (1.0, 5.0)
    ]
    assert -1e-3 < lost[0] < 0.03
    assert lost[1] < 0.25


def test_rounded_powers_that_fit_already_stay(problem: Any) -> None:
    constant = best_constant(replace(problem, max_power_w=300.0))
    found = solve(constant.problem, constant.starts, constant.power_w)
    assert set(rounded(found, step_w=5.0).power_w.tolist()) == {300.0}
