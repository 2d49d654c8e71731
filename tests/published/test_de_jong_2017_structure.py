"""Structure of the optimum on a straight level course.

de Jong, Fokkink, Olsder & Schwab 2017: start at most power, one singular stretch, end at least
power, for a budget looked at at the finish alone. With a reserve held at every moment nothing
can be saved by coasting in: the best finish is at critical power or above (model). With a
budget over critical power only a few modes occur: all out, coast, critical power, constant speed
(Ashtiani et al., arXiv 2007.11393).
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from scipy.optimize import brentq

from pacing.plan.problem import ride
from pacing.plan.solve import solve

CELLS = 800
# short pieces near start and finish, long ones between
STARTS = np.r_[0:30:3, 30, 50, 100:800:100, 740:800:4].astype(np.intp)
STARTS.sort()
LEAST_W, MOST_W, CRITICAL_W = 50.0, 450.0, 300.0


@pytest.fixture
def level(make_road: Callable[..., Any], make_problem: Callable[..., Any]) -> Callable[..., Any]:
    def problem(**changes: Any) -> Any:
        given = {
            "critical_power_w": CRITICAL_W,
            "min_power_w": LEAST_W,
            "max_power_w": MOST_W,
            "first_30_s_max_w": MOST_W,
            "start_speed_m_s": 2.0,
        } | changes
        return make_problem(make_road(0.0, cells=CELLS), **given)

    return problem


def optimum(problem: Any, start_w: float = 310.0) -> Any:
    power = np.full(STARTS.size, start_w)
    return solve(problem, STARTS, power, evenness=0.0, tolerance_s=1e-8).ride


def modes(power_w: Any) -> list[str]:
    """Most, least or between, neighbours of one kind as one."""
    kinds = np.select([power_w > MOST_W - 0.5, power_w < LEAST_W + 0.5], ["most", "least"], "")
    return [
        str(kind)
        for kind, before in zip(kinds, ["none", *kinds[:-1]], strict=True)
        if kind != before
    ]


def test_with_a_budget_at_the_finish_alone_most_one_singular_stretch_then_least(
    level: Callable[..., Any], mean_power_law: Any
) -> None:
    ledger = {"law": mean_power_law, "w_start_j": 10_000.0}
    best = optimum(level(**ledger, reserve_everywhere=False))
    assert modes(best.power_w) == ["most", "", "least"]
    # the singular stretch is ridden at constant speed, by one power
    long = np.flatnonzero(np.diff(STARTS) == 100)[1:-1]
    assert np.ptp(best.power_w[long]) < 0.1
    assert best.balance_j[-1] == pytest.approx(2_000.0, abs=1.0)
    # coasting in pays the debt back: on the way the budget is overdrawn
    assert best.balance_j.min() < 0.0
    held = optimum(level(**ledger))
    assert best.motion.total_s < held.motion.total_s - 0.1


@pytest.mark.parametrize("law", ["none", "two-phase", "skiba-2015", "ledger"])
def test_with_the_reserve_held_throughout_the_finish_is_at_critical_power_or_above(
    level: Callable[..., Any], mean_power_law: Any, law: str
) -> None:
    start_j = 10_000.0 if law == "ledger" else None
    problem = level(law=mean_power_law if law == "ledger" else law, w_start_j=start_j)
    best = optimum(problem)
    late = best.power_w[STARTS >= 400]
    assert np.all(late >= CRITICAL_W - 1e-6)
    assert modes(best.power_w) == ["most", ""]
    assert best.balance_j[-1] == pytest.approx(2_000.0, abs=1.0)
    assert best.balance_j.min() >= 2_000.0 - 1.0


def test_the_optimum_is_no_worse_than_rides_of_the_published_form(
    level: Callable[..., Any],
) -> None:
    """Most power for a while, then one power to the line with the reserve just kept."""
    problem = level()
    best = optimum(problem).motion.total_s
    for first in (4, 6, 7, 8, 10):

        def tried(rest_w: float, first: int = first) -> Any:
            target = np.where(np.arange(STARTS.size) < first, MOST_W, rest_w)
            return ride(problem, STARTS, target)

        rest_w = brentq(lambda watts: tried(watts).balance_j[-1] - 2_000.0, CRITICAL_W, MOST_W)
        assert best <= tried(rest_w).motion.total_s + 1e-4
