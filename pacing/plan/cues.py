"""From optimal pieces to cues: starts at readable places, powers in printed steps, feasible."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.plan.problem import Cuts, Problem, Ride, ride
from pacing.plan.refine import curvature
from pacing.plan.solve import Solution, margins_j, power_bounds_w

Array = NDArray[np.float64]

REACH_M = 160.0
"""How far a boundary may be moved to a readable place."""


def placed(solution: Solution, slope: Array, readable: Cuts, *, shortest_s: float) -> Cuts:
    """Move every boundary to the readable node where, to second order, it costs least.

    ``slope`` is the reduced slope per cell at the solution. Boundaries that find no readable
    node within `REACH_M`, or would make a cue too short, stay.
    """
    ridden = solution.ride
    bend = curvature(ridden)
    node_m = np.concatenate([[0.0], np.cumsum(ridden.problem.road.cell_m)])
    elapsed = ridden.motion.elapsed_s
    starts = ridden.starts.copy()
    for k in range(1, starts.size):
        here = int(starts[k])
        after = elapsed[starts[k + 1]] if k + 1 < starts.size else elapsed[-1]
        near = readable[np.abs(node_m[readable] - node_m[here]) <= REACH_M]
        near = near[
            (elapsed[near] - elapsed[starts[k - 1]] >= shortest_s)
            & (after - elapsed[near] >= shortest_s)
        ]
        if near.size == 0:
            continue
        step = float(ridden.power_w[k - 1] - ridden.power_w[k])
        costs = [_cost_of_move(slope, bend, here, int(node), step) for node in near]
        starts[k] = near[int(np.argmin(costs))]
    return starts


def _cost_of_move(slope: Array, bend: Array, here: int, there: int, step_w: float) -> float:
    """Lagrangian's change when the boundary goes from ``here`` to ``there``."""
    a, b = min(here, there), max(here, there)
    change = step_w if there > here else -step_w
    return float(change * slope[a:b].sum() + 0.5 * change**2 * bend[a:b].sum())


class _Model(NamedTuple):
    """The optimum to second order in the piece powers: what rounding is judged by."""

    centre_w: Array
    time_slope: Array
    bend: Array
    margin_j: Array
    margin_slope: Array

    def cost(self, power_w: Array) -> float:
        step = power_w - self.centre_w
        return float(self.time_slope @ step + 0.5 * self.bend @ step**2)

    def spare_j(self, power_w: Array) -> float:
        return float(np.min(self.margin_j + self.margin_slope @ (power_w - self.centre_w)))


def rounded(solution: Solution, *, step_w: float) -> Ride:
    """Powers in whole ``step_w`` chosen together, so that the reserve holds as printed.

    A local search over single and paired steps on the second-order model at the optimum; what
    it picks is ridden, and the model's margin tightened until the ride keeps the reserve.
    """
    ridden = solution.ride
    problem = ridden.problem
    low, high = power_bounds_w(problem, ridden)
    low = np.ceil(low / step_w - 1e-9) * step_w
    high = np.maximum(np.floor(high / step_w + 1e-9) * step_w, low)
    bend = np.add.reduceat(curvature(ridden), ridden.starts)
    margins = margins_j(ridden)
    every = problem.reserve_everywhere
    model = _Model(
        centre_w=ridden.power_w,
        time_slope=ridden.time_slopes,
        bend=bend,
        margin_j=margins,
        margin_slope=ridden.lowest.lowest_slopes if every else ridden.lowest.end_slopes[-1:],
    )
    keep_j = 0.0
    for _ in range(12):
        power = _nearest_feasible(model, low, high, step_w, keep_j)
        candidate = ride(problem, ridden.starts, power, guess_m_s=ridden.motion.speed_m_s)
        short = -float(np.min(candidate.balance_j[1:]) - problem.reserve_j)
        if short <= 0.0:
            return candidate
        keep_j += short + 5.0
    return _stepped_down(problem, candidate, low, step_w)


def _nearest_feasible(
    model: _Model, low: Array, high: Array, step_w: float, keep_j: float
) -> Array:
    """Rounded powers of least model cost with at least ``keep_j`` to spare."""
    power = np.clip(np.floor(model.centre_w / step_w + 1e-9) * step_w, low, high)
    while model.spare_j(power) < keep_j and np.any(power > low):
        worst = int(np.argmin(model.margin_j + model.margin_slope @ (power - model.centre_w)))
        gain = np.where(power > low, -model.margin_slope[worst], -np.inf)
        power[int(np.argmax(gain))] -= step_w
    count = power.size
    moves = [step_w * row for row in np.eye(count)]
    moves += [-move for move in moves]
    moves += [a + b for a in moves[:count] for b in moves[count:] if np.any(a + b)]
    best = model.cost(power)
    improved = True
    while improved:
        improved = False
        trials = power + np.array(moves)
        inside = np.all((trials >= low) & (trials <= high), axis=1)
        steps = trials - model.centre_w
        spare = np.min(model.margin_j + steps @ model.margin_slope.T, axis=1)
        cost = steps @ model.time_slope + 0.5 * steps**2 @ model.bend
        cost = np.where(inside & (spare >= keep_j), cost, np.inf)
        pick = int(np.argmin(cost))
        if cost[pick] < best - 1e-9:
            power, best, improved = trials[pick], float(cost[pick]), True
    return power


def _stepped_down(problem: Problem, ridden: Ride, low: Array, step_w: float) -> Ride:
    """Lower the last powers before the worst shortage, step by step, until the reserve holds."""
    while True:
        short = ridden.balance_j[1:] - problem.reserve_j
        if np.min(short) >= 0.0:
            return ridden
        worst = int(np.searchsorted(ridden.starts, int(np.argmin(short)), side="right")) - 1
        power = ridden.power_w.copy()
        above = np.flatnonzero(power[: worst + 1] > low[: worst + 1])
        if above.size == 0:
            return ridden
        power[above[int(np.argmax(power[above]))]] -= step_w
        ridden = ride(problem, ridden.starts, power, guess_m_s=ridden.motion.speed_m_s)
