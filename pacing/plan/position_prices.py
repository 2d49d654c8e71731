"""What sitting otherwise in one cell would cost, by the adjoint; and what may not be ridden."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.motion.road import Road
from pacing.motion.simulate import Mode
from pacing.plan.marginal import priced
from pacing.plan.position_road import upright_most
from pacing.plan.problem import Ride
from pacing.plan.solve import Solution

Array = NDArray[np.float64]

OUTSIDE_PRICE = 5.0
"""Seconds of time that a second spent outside a position's bounds is held to be worth."""
SPEED_TOLERANCE_M_S = 0.05


def outside_cells(ridden: Ride, position: int) -> NDArray[np.bool_]:
    """Cells (N,) ridden too slowly or too fast for ``position``, hands on the bars."""
    sitting = ridden.problem.sitting
    assert sitting is not None
    chosen, speed = sitting.positions[position], ridden.motion.speed_m_s
    low = 0.0 if chosen.min_speed_m_s is None else chosen.min_speed_m_s - SPEED_TOLERANCE_M_S
    high = np.inf if chosen.max_speed_m_s is None else chosen.max_speed_m_s + SPEED_TOLERANCE_M_S
    slowest, fastest = np.minimum(speed[1:], speed[:-1]), np.maximum(speed[1:], speed[:-1])
    return ((slowest < low) | (fastest > high)) & ~sitting.hands_off


def outside_by_position(ridden: Ride) -> NDArray[np.bool_]:
    """`outside_cells` of every position (p, N)."""
    sitting = ridden.problem.sitting
    assert sitting is not None
    return np.array([outside_cells(ridden, p) for p in range(len(sitting.positions))])


def held_runs(ridden: Ride) -> list[tuple[int, int, float]]:
    """Stretches in one position: first cell, cell after the last, seconds over its longest."""
    sitting = ridden.problem.sitting
    assert sitting is not None
    asked, elapsed = sitting.asked, ridden.motion.elapsed_s
    edges = np.concatenate([[0], np.flatnonzero(np.diff(asked)) + 1, [asked.size]])
    runs = []
    for a, b in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
        longest = sitting.positions[asked[a]].longest_s
        over = 0.0 if longest is None else max(0.0, float(elapsed[b] - elapsed[a]) - longest)
        runs.append((a, b, over))
    return runs


def outside_s(ridden: Ride) -> float:
    """Seconds ridden in a position outside its speeds, and held beyond its longest."""
    sitting = ridden.problem.sitting
    assert sitting is not None
    outside = outside_by_position(ridden)[sitting.asked, np.arange(sitting.asked.size)]
    return float(ridden.motion.time_s[outside].sum()) + sum(over for *_, over in held_runs(ridden))


def merit_s(ridden: Ride) -> float:
    """Time, with seconds outside a position's bounds priced so that none are worth it."""
    return ridden.motion.total_s + OUTSIDE_PRICE * outside_s(ridden)


def position_changes_s(solution: Solution) -> Array:
    """Change of the Lagrangian (p, N), s, if a cell were ridden in each position instead.

    At the same effort, so that power changes with the share and W′ does not; to first order.
    Seconds in or out of a position's speeds are priced as in `merit_s`.
    """
    ridden = solution.ride
    problem, motion, sitting = ridden.problem, ridden.motion, ridden.problem.sitting
    assert sitting is not None
    found = priced(ridden, solution.multipliers_s_per_j)
    road, count = problem.road, len(sitting.positions)
    now = air_forces_n(road, motion.speed_m_s, road.position)
    moving = motion.mode <= Mode.COAST
    partly = ~moving & (motion.power_w > 0.0) & (motion.power_w < ridden.target_w)
    cells = np.arange(problem.cells)
    outside = OUTSIDE_PRICE * outside_by_position(ridden) * motion.time_s
    shares = np.array([position.power_share for position in sitting.positions])
    changes = np.empty((count, problem.cells))
    for p in range(count):
        there = np.where(sitting.hands_off, upright_most(problem), p)
        force = air_forces_n(road, motion.speed_m_s, there) - now
        more_w = ridden.target_w * (shares[p] / shares[sitting.asked] - 1.0)
        by_drag = -found.adjoint * road.cell_m * force / road.effective_mass_kg
        by_power = found.adjoint * ridden.cell_slopes.power * more_w
        to_hold_w = road.cell_m * force / (road.efficiency * motion.time_s)
        held = np.where(partly, -found.price.per_w * to_hold_w, 0.0)
        changes[p] = np.where(moving, by_drag + by_power, held)
    return np.asarray(changes + outside - outside[sitting.asked, cells])


def air_forces_n(road: Road, speed_m_s: Array, position: NDArray[np.intp]) -> Array:
    """Mean air resistance in each cell (N,) in given positions, less what all have in common."""
    force = np.empty(road.cell_m.size)
    along_from = speed_m_s[:-1] + road.wind_along_m_s
    along_to = speed_m_s[1:] + road.wind_along_m_s
    for index, area in enumerate(road.drag_areas):
        here = position == index
        across = road.wind_across_m_s[here]
        total = np.zeros(int(here.sum()))
        for along in (along_from[here], along_to[here]):
            yaw = np.arctan2(np.abs(across), along)
            total += 0.5 * area.m2_at(yaw) * np.hypot(along, across) * along
        force[here] = road.half_density_kg_m3[here] * total
    return force
