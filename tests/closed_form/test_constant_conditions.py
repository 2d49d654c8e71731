"""Where nothing changes along the road nothing changes in the plan.

Under constant conditions the time is convex in power, so constant power is best away from the
start and the finish (Bos et al. 2024, arXiv 2403.03363: constant speed, for which constant
conditions ask constant power).
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.bike import DragArea
from pacing.plan import plan_race
from pacing.plan.solve import best_constant, solve

BY_YAW = DragArea((0.0, 10.0, 20.0), (0.235, 0.228, 0.231))
CONDITIONS: dict[str, dict[str, Any]] = {
    "level and calm": {"gradient": 0.0},
    "head and cross wind": {
        "gradient": 0.0,
        "wind_along_m_s": 3.0,
        "wind_across_m_s": 2.0,
        "drag_area": BY_YAW,
    },
    "tail wind": {"gradient": 0.0, "wind_along_m_s": -4.0},
    "climb": {"gradient": 0.06},
}


CELLS = 1800
STARTS = np.r_[0, 3, 8, 20, np.arange(50, 1750, 100), 1750, 1780].astype(np.intp)
AWAY_M = 4_000.0


def away_from_start_and_finish(ridden: Any) -> Any:
    """Powers of the pieces that lie 4 km and more from both ends.

    Speed forgets its past over m/(3 · ½ρCdA), 0.2 km here and 0.5 km with a tail wind.
    """
    node_m = np.concatenate([[0.0], np.cumsum(ridden.problem.road.cell_m)])
    ends = np.append(ridden.starts[1:], ridden.problem.cells)
    away = (node_m[ridden.starts] >= AWAY_M) & (node_m[ends] <= node_m[-1] - AWAY_M)
    inside = ridden.power_w[away]
    assert inside.size >= 6
    return inside


@pytest.mark.parametrize("conditions", CONDITIONS)
def test_power_is_constant_to_a_tenth_of_a_watt_away_from_start_and_finish(
    make_road: Callable[..., Any], make_problem: Callable[..., Any], conditions: str
) -> None:
    problem = make_problem(make_road(cells=CELLS, **CONDITIONS[conditions]))
    found = solve(problem, STARTS, np.full(STARTS.size, 300.0)).ride
    inside = away_from_start_and_finish(found)
    assert np.ptp(inside) < 0.1
    assert np.all(inside > 300.0)
    assert found.balance_j[-1] == pytest.approx(2_000.0, abs=1.0)


@pytest.mark.parametrize("law", ["none", "skiba-2015"])
def test_with_other_recovery_laws_too(
    make_road: Callable[..., Any], make_problem: Callable[..., Any], law: str
) -> None:
    problem = make_problem(make_road(0.0, cells=CELLS), law=law)
    found = solve(problem, STARTS, np.full(STARTS.size, 300.0)).ride
    assert np.ptp(away_from_start_and_finish(found)) < 0.1


def test_a_rolling_start_at_the_steady_speed_leaves_no_start_at_all(
    make_road: Callable[..., Any], make_problem: Callable[..., Any]
) -> None:
    road = make_road(0.0, cells=CELLS)
    steady = best_constant(make_problem(road, start_speed_m_s=12.0)).motion.speed_m_s[600]
    problem = make_problem(road, start_speed_m_s=float(steady))
    constant = best_constant(problem)
    starts = np.arange(0, CELLS, 100, dtype=np.intp)
    found = solve(problem, starts, np.full(starts.size, 300.0)).ride
    assert np.ptp(away_from_start_and_finish(found)) < 0.1
    assert np.ptp(found.power_w[:-4]) < 0.4
    assert found.motion.total_s <= constant.motion.total_s + 1e-4


def test_a_whole_plan_on_a_straight_level_road_holds_one_power(
    make_race: Callable[..., Any],
) -> None:
    plan = plan_race(make_race(np.zeros(2000), rider__long_decline_w=0.0))
    pieces = plan.pieces
    inside = pieces[(pieces["from_m"] >= 1_200.0) & (pieces["to_m"] <= 19_200.0)]
    assert inside["time_s"].sum() > 0.5 * plan.time_s
    assert np.ptp(inside["power_w"]) < 0.1
    mean_w = float((plan.trace["power_w"] * plan.trace["time_s"]).sum() / plan.time_s)
    # P = W′/t + CP (source: simpson-2017), 2.5 kJ kept back, rounded to steps of 5 W
    assert mean_w == pytest.approx(300.0 + 15_500.0 / plan.time_s, abs=1.0)
