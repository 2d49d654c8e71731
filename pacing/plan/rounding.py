"""Powers in printed steps, chosen together so that the reserve holds and little time is lost."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.plan.balance import run_slopes, starting_pools
from pacing.plan.marginal import curvature
from pacing.plan.problem import Cuts, Ride, ride
from pacing.plan.solve import Solution, power_bounds_w, spare_j

Array = NDArray[np.float64]

NEAR_STEPS = 2.5
"""Printed powers looked at lie within this many steps of the optimum's."""
MOST_KEPT = 300
MOST_RIDES = 10
LONG_SHARE = 0.3


def rounded(solution: Solution, *, step_w: float) -> Ride:
    """Ride the optimum's pieces at whole ``step_w``, with W′ at or above the reserve.

    Piece after piece every nearby power is tried on a model of the ride near the optimum, and
    of the ways to get there those kept that no other beats in both time and W′ left. The best
    is ridden; while it falls short of the reserve, the model is asked for as much more.
    """
    problem, starts = solution.ride.problem, solution.ride.starts
    _, high = power_bounds_w(problem, solution.ride)
    low = np.full(high.size, np.ceil(problem.min_power_w / step_w - 1e-9) * step_w)
    high = np.maximum(np.floor(high / step_w + 1e-9) * step_w, low)
    model = _Model(solution)
    keep_j, best = 0.0, None
    for _ in range(MOST_RIDES):
        power = model.best_powers_w(low, high, step_w, keep_j)
        candidate = ride(problem, starts, power, guess_m_s=solution.ride.motion.speed_m_s)
        spare = spare_j(candidate)
        if spare >= 0.0 and (best is None or candidate.motion.total_s < best.motion.total_s):
            best = candidate
        if 0.0 <= spare < 50.0:
            break
        keep_j -= spare - 10.0 if spare < 0.0 else 0.5 * spare
        if keep_j < 0.0 and best is not None:
            break
    return _stepped_down(candidate, low, step_w) if best is None else best


def long_pieces(ridden: Ride, *, step_w: float) -> NDArray[np.bool_]:
    """Pieces (n,) so long that half a step of power is a good part of W′."""
    problem = ridden.problem
    usable_j = max(problem.w_prime_j - problem.reserve_j, 1.0)
    return ridden.piece_time_s * step_w > LONG_SHARE * usable_j


def split_for_steps(ridden: Ride, readable: Cuts, *, step_w: float, shortest_s: float) -> Cuts:
    """Cut long pieces in two so that the steps above and below make up the power between them.

    The higher step comes first where most of W′ is left at the piece's start, else last.
    ``readable`` are the nodes at which a cue may begin; no part is shorter than ``shortest_s``.
    """
    problem = ridden.problem
    elapsed, starts = ridden.motion.elapsed_s, ridden.starts
    ends = np.append(starts[1:], problem.cells)
    added = []
    for k in np.flatnonzero(long_pieces(ridden, step_w=step_w)):
        above = ridden.power_w[k] / step_w % 1.0
        left = (ridden.balance_j[starts[k]] - problem.reserve_j) / max(problem.w_prime_j, 1.0)
        share = above if left > 0.5 else 1.0 - above
        inside = readable[
            (elapsed[readable] - elapsed[starts[k]] >= shortest_s)
            & (elapsed[ends[k]] - elapsed[readable] >= shortest_s)
        ]
        if not 0.1 < share < 0.9 or inside.size == 0:
            continue
        wanted = elapsed[starts[k]] + share * (elapsed[ends[k]] - elapsed[starts[k]])
        added.append(int(inside[np.argmin(np.abs(elapsed[inside] - wanted))]))
    return np.union1d(starts, np.array(added, dtype=np.intp))


@dataclass(frozen=True)
class _Kept:
    """Ways to have ridden so far (m): seconds over the optimum, pools, last step, where from."""

    cost_s: Array
    pools: Array
    step_w: Array
    before: NDArray[np.intp]

    def chosen(self, index: NDArray[np.intp]) -> _Kept:
        return _Kept(
            self.cost_s[index], self.pools[:, index], self.step_w[index], self.before[index]
        )


class _Model:
    """The ride near an optimum: time to second order, W′ by its law over first-order runs."""

    def __init__(self, solution: Solution) -> None:
        ridden = solution.ride
        self.problem = ridden.problem
        self.centre_w = ridden.power_w
        self.bend = np.add.reduceat(curvature(ridden), ridden.starts)
        self.time_slope = ridden.time_slopes
        self.runs = ridden.runs
        share = self.problem.power_share
        self.share = share[ridden.starts]
        self.critical_w = self.problem.critical_power_w[ridden.starts]
        self.change = run_slopes(self.runs, ridden.slopes, power_share=share)
        self.from_before = np.append(0.0, np.diag(ridden.slopes.entry_energy, -1))
        self.first_run = np.searchsorted(self.runs.piece, np.arange(self.centre_w.size + 1))

    def best_powers_w(self, low: Array, high: Array, step_w: float, keep_j: float) -> Array:
        """Rounded powers (n,) of least time that keep ``keep_j`` over the reserve."""
        problem = self.problem
        pools = starting_pools(problem.law, problem.w_prime_j, problem.w_start_j)
        kept = _Kept(np.zeros(1), np.array(pools)[:, None], np.zeros(1), np.zeros(1, dtype=np.intp))
        trail = []
        for piece in range(self.centre_w.size):
            options = _multiples(self.centre_w[piece], low[piece], high[piece], step_w)
            kept = _undominated(self._extended(kept, piece, options, keep_j))
            trail.append(kept)
        index = int(np.argmin(kept.cost_s))
        power = np.empty(self.centre_w.size)
        for piece in range(self.centre_w.size - 1, -1, -1):
            power[piece] = self.centre_w[piece] + trail[piece].step_w[index]
            index = int(trail[piece].before[index])
        return np.round(power / step_w) * step_w

    def _extended(self, kept: _Kept, piece: int, options: Array, keep_j: float) -> _Kept:
        """Every way kept, gone on at every optional power; those short of the reserve left out."""
        problem, count = self.problem, kept.cost_s.size
        before = np.repeat(np.arange(count), options.size)
        step = np.tile(options - self.centre_w[piece], count)
        entry = self.from_before[piece] * kept.step_w[before]
        cost = kept.cost_s[before] + self.time_slope[piece] * step
        cost += 0.5 * self.bend[piece] * step**2
        pools = kept.pools[:, before]
        least = pools.sum(axis=0)
        for r in range(self.first_run[piece], self.first_run[piece + 1]):
            by_excess, by_duration = self.change.excess[r], self.change.duration[r]
            excess = self.runs.excess_w[r] + by_excess[0] * step + by_excess[1] * entry
            time = self.runs.duration_s[r] + by_duration[0] * step + by_duration[1] * entry
            pools = problem.law.advance_many(
                pools, excess, np.maximum(time, 0.0), w_prime_j=problem.w_prime_j
            )
            least = np.minimum(least, pools.sum(axis=0))
        if not problem.reserve_everywhere:
            last = piece == self.centre_w.size - 1
            least = pools.sum(axis=0) if last else np.full(step.size, np.inf)
        spare = least - problem.reserve_j
        if problem.peak_power_w is not None:
            critical, share = self.critical_w[piece], self.share[piece]
            per_joule = (problem.peak_power_w - critical) / problem.w_prime_j
            needed = ((self.centre_w[piece] + step) / share - critical) / per_joule
            spare = np.minimum(spare, least - needed)
        spare = spare - keep_j
        every = _Kept(cost, pools, step, before)
        holds = np.flatnonzero(spare >= 0.0)
        return every.chosen(holds if holds.size else np.array([int(np.argmax(spare))]))


def _multiples(centre: float, low: float, high: float, step: float) -> Array:
    first = max(low, np.ceil((centre - NEAR_STEPS * step) / step) * step)
    last = min(high, np.floor((centre + NEAR_STEPS * step) / step) * step)
    if last < first:
        return np.array([min(max(round(centre / step) * step, low), high)])
    return np.arange(first, last + 0.5 * step, step)


def _undominated(kept: _Kept) -> _Kept:
    """Those that no other beats in both time and W′ left, thinned to `MOST_KEPT`."""
    order: NDArray[np.intp] = np.lexsort((kept.cost_s, -kept.pools.sum(axis=0))).astype(np.intp)
    cost = kept.cost_s[order]
    fastest_so_far = np.concatenate([[np.inf], np.minimum.accumulate(cost)[:-1]])
    order = order[cost < fastest_so_far]
    if order.size > MOST_KEPT:
        order = order[np.linspace(0, order.size - 1, MOST_KEPT).astype(np.intp)]
    return kept.chosen(order)


def _stepped_down(ridden: Ride, low: Array, step_w: float) -> Ride:
    """Lower the highest power before the worst shortage, step by step, until the reserve holds."""
    problem = ridden.problem
    while spare_j(ridden) < 0.0:
        last = ridden.starts.size - 1
        if problem.reserve_everywhere:
            last = int(np.argmin(ridden.lowest.lowest_j))
        power = ridden.power_w.copy()
        above = np.flatnonzero(power[: last + 1] > low[: last + 1])
        if above.size == 0:
            break
        power[above[int(np.argmax(power[above]))]] -= step_w
        ridden = ride(problem, ridden.starts, power, guess_m_s=ridden.motion.speed_m_s)
    return ridden
