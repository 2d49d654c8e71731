"""Pieces cut where it pays: better than by terrain, and no boundary better elsewhere."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.course.pieces import cut_pieces
from pacing.plan.marginal import marginal, reduced_slope
from pacing.plan.refine import merged_to, refined
from pacing.plan.solve import best_constant, solve

CELLS = 1000
AT_M = 10.0 * np.arange(CELLS)
PIECES, SHORTEST_S = 12, 33.0


@pytest.fixture(scope="module")
def problem(make_road: Callable[..., Any], make_problem: Callable[..., Any]) -> Any:
    gradient = 0.03 * np.sin(2.0 * np.pi * AT_M / 2300.0) + 0.02 * np.sin(AT_M / 130.0)
    return make_problem(make_road(gradient, limit_m_s=17.0))


@pytest.fixture(scope="module")
def by_terrain(problem: Any) -> Any:
    constant = best_constant(problem)
    speed = constant.motion.speed_m_s
    force, _ = problem.road.resistance_n_and_slope(0.5 * (speed[1:] + speed[:-1]))
    nodes = cut_pieces(constant.motion.elapsed_s, force, most_pieces=PIECES, shortest_m=SHORTEST_S)
    return solve(problem, nodes[:-1], np.full(nodes.size - 1, 320.0))


@pytest.fixture(scope="module")
def better(by_terrain: Any) -> Any:
    return refined(by_terrain, most_pieces=PIECES, shortest_s=SHORTEST_S).solution


@pytest.fixture(scope="module")
def finest_s(problem: Any) -> float:
    """Time with four times as many pieces, which no cutting of twelve can beat by much."""
    starts = np.arange(0, CELLS, 20, dtype=np.intp)
    return solve(problem, starts, np.full(starts.size, 320.0)).ride.motion.total_s


def test_no_more_pieces_than_wanted_and_none_too_short(better: Any) -> None:
    assert better.ride.starts.size <= PIECES
    assert better.ride.piece_time_s.min() >= SHORTEST_S - 2.0


def test_a_third_of_what_cutting_by_terrain_loses_is_won_back(
    by_terrain: Any, better: Any, finest_s: float
) -> None:
    # random moves brought 24 pieces from 0.45 to 0.23 % on another course (a sketch of ours)
    lost_by_terrain = by_terrain.ride.motion.total_s - finest_s
    lost = better.ride.motion.total_s - finest_s
    assert lost_by_terrain > 0.5
    assert lost < 0.67 * lost_by_terrain


def test_moving_any_boundary_gains_next_to_nothing(problem: Any, better: Any) -> None:
    starts = better.ride.starts
    for k in range(1, starts.size):
        for nodes in (-6, 6):
            moved = starts.copy()
            moved[k] += nodes
            if np.any(np.diff(moved) <= 3):
                continue
            tried = solve(
                problem, moved, better.ride.power_w, guess_m_s=better.ride.motion.speed_m_s
            )
            if tried.ride.piece_time_s.min() < SHORTEST_S:
                continue
            gain = better.ride.motion.total_s - tried.ride.motion.total_s
            assert gain < 3e-4 * better.ride.motion.total_s, (k, nodes)


def test_at_the_optimum_more_and_less_power_over_a_piece_both_lose(better: Any) -> None:
    """Summed over a piece inside its bounds the slopes vanish, or hold it from both sides."""
    ridden, value = better.ride, marginal(better)
    up = np.add.reduceat(value.up, ridden.starts)
    down = np.add.reduceat(value.down, ridden.starts)
    inside = (ridden.power_w > 1.0) & (ridden.power_w < 399.0)
    at_critical = np.abs(ridden.power_w - 300.0) < 1e-3
    # seconds a watt; 0.01 s/W over a step of 5 W is 0.05 s; the evenness term pulls a little
    assert np.max(np.abs(up[inside & ~at_critical]), initial=0.0) < 0.01
    assert np.all(up[at_critical] > -0.01)
    assert np.all(down[at_critical] < 0.01)


def test_off_critical_power_both_sides_are_the_one_slope(better: Any) -> None:
    ridden, value = better.ride, marginal(better)
    plain = reduced_slope(ridden, better.multipliers_s_per_j)
    away = np.abs(ridden.target_w - 300.0) > 1.0
    assert value.up[away] == pytest.approx(plain[away], rel=0.02, abs=2e-6)
    assert value.down[away] == pytest.approx(plain[away], rel=0.02, abs=2e-6)


@pytest.mark.parametrize("most", [1, 3, 6])
def test_merging_leaves_no_more_pieces_than_wanted_at_little_cost(better: Any, most: int) -> None:
    merged = merged_to(better, most)
    assert merged.ride.starts.size == min(most, better.ride.starts.size)
    assert set(merged.ride.starts.tolist()) <= set(better.ride.starts.tolist())
    assert merged.ride.motion.total_s >= better.ride.motion.total_s - 1e-3
    assert merged.ride.motion.total_s <= best_constant(better.ride.problem).motion.total_s + 0.05


def test_the_more_cues_the_less_is_lost(make_race: Callable[..., Any]) -> None:
    from pacing.plan import plan_race

    gradient = 0.035 * np.sin(2.0 * np.pi * AT_M[:450] / 1900.0)
    times = [
        plan_race(make_race(gradient, plan__max_cues=cues)).solver["unrounded_time_s"]
        for cues in (2, 5, 12)
    ]
    assert times[0] > times[1] > times[2]
