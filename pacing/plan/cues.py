"""From optimal pieces to cues: starts at readable places, powers in printed steps, feasible."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.plan.balance import run_slopes, runs_of, starting_pools
from pacing.plan.problem import Cuts, Ride, ride
from pacing.plan.refine import curvature
from pacing.plan.solve import Solution, power_bounds_w

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


class _Model:
    """The ride near an optimum: time to second order, W′ by its law over first-order runs."""

    def __init__(self, solution: Solution) -> None:
        ridden = solution.ride
        problem, slopes = ridden.problem, ridden.slopes
        self.problem = problem
        self.centre_w = ridden.power_w
        self.bend = np.add.reduceat(curvature(ridden), ridden.starts)
        self.time_slope = ridden.time_slopes
        self.runs = runs_of(ridden.motion, starts=ridden.starts, excess_w=ridden.excess_w)
        self.change = run_slopes(self.runs, slopes, power_share=problem.power_share)
        self.entry_energy = slopes.entry_energy

    def cost(self, power_w: Array) -> Array:
        """Seconds over the optimum's time (…,) of powers (…, n)."""
        step = power_w - self.centre_w
        return np.asarray(step @ self.time_slope + 0.5 * step**2 @ self.bend)

    def spare_j(self, power_w: Array) -> float:
        """Lowest W′ over the reserve, or the last where only the finish counts."""
        step = power_w - self.centre_w
        piece = self.runs.piece
        by = np.stack([step[piece], (self.entry_energy @ step)[piece]], axis=1)
        excess = self.runs.excess_w + np.sum(self.change.excess * by, axis=1)
        duration = self.runs.duration_s + np.sum(self.change.duration * by, axis=1)
        problem = self.problem
        pools = starting_pools(problem.law, problem.w_prime_j, problem.w_start_j)
        least = sum(pools)
        for e, t in zip(excess.tolist(), np.maximum(duration, 0.0).tolist(), strict=True):
            pools = problem.law.advance(pools, e, t, w_prime_j=problem.w_prime_j)
            least = min(least, sum(pools))
        return (least if problem.reserve_everywhere else sum(pools)) - problem.reserve_j


def rounded(solution: Solution, *, step_w: float) -> Ride:
    """Powers in whole ``step_w`` chosen together, so that the reserve holds as printed.

    A local search over single and paired steps on a model of the ride near the optimum; what
    it picks is ridden, and the model's margin tightened until the ride keeps the reserve.
    """
    ridden = solution.ride
    problem = ridden.problem
    low, high = power_bounds_w(problem, ridden)
    low = np.ceil(low / step_w - 1e-9) * step_w
    high = np.maximum(np.floor(high / step_w + 1e-9) * step_w, low)
    model = _Model(solution)
    keep_j = 0.0
    for _ in range(8):
        power = _nearest_feasible(model, low, high, step_w, keep_j)
        candidate = ride(problem, ridden.starts, power, guess_m_s=ridden.motion.speed_m_s)
        spare = spare_j(candidate)
        if spare >= 0.0:
            return candidate
        keep_j += 5.0 - spare
    return _stepped_down(candidate, low, step_w)


def spare_j(ridden: Ride) -> float:
    """W′ over the reserve, by every cell: at its lowest, or at the finish alone."""
    left = ridden.balance_j[1:] if ridden.problem.reserve_everywhere else ridden.balance_j[-1:]
    return float(np.min(left) - ridden.problem.reserve_j)


def _nearest_feasible(
    model: _Model, low: Array, high: Array, step_w: float, keep_j: float
) -> Array:
    """Rounded powers of least model cost with at least ``keep_j`` to spare."""
    power = np.clip(np.floor(model.centre_w / step_w + 1e-9) * step_w, low, high)
    while model.spare_j(power) < keep_j and np.any(power > low):
        power[int(np.argmax(np.where(power > low, power, -np.inf)))] -= step_w
    count = power.size
    up = step_w * np.eye(count)
    pairs = (up[:, None, :] - up[None, :, :]).reshape(-1, count)
    moves = np.concatenate([up, -up, pairs[np.any(pairs != 0.0, axis=1)]])
    best = float(model.cost(power))
    while True:
        trials = power + moves
        cost = model.cost(trials)
        cost[~np.all((trials >= low) & (trials <= high), axis=1)] = np.inf
        for pick in np.argsort(cost).tolist():
            if cost[pick] >= best - 1e-9:
                return power
            if model.spare_j(trials[pick]) >= keep_j:
                power, best = trials[pick], float(cost[pick])
                break
        else:
            return power


def _stepped_down(ridden: Ride, low: Array, step_w: float) -> Ride:
    """Lower the highest power before the worst shortage, step by step, until the reserve holds."""
    problem = ridden.problem
    while spare_j(ridden) < 0.0:
        worst = int(np.argmin(ridden.balance_j[1:])) if problem.reserve_everywhere else -1
        last = ridden.starts.size - 1
        if worst >= 0:
            last = int(np.searchsorted(ridden.starts, worst, side="right")) - 1
        power = ridden.power_w.copy()
        above = np.flatnonzero(power[: last + 1] > low[: last + 1])
        if above.size == 0:
            break
        power[above[int(np.argmax(power[above]))]] -= step_w
        ridden = ride(problem, ridden.starts, power, guess_m_s=ridden.motion.speed_m_s)
    return ridden
