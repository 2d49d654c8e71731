"""Where to cut: pieces split, merged and moved by what one adjoint solve says of every cell."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.motion.slopes import cell_end_slopes, time_adjoint
from pacing.plan.balance import prices
from pacing.plan.problem import Cuts, Ride
from pacing.plan.solve import Solution, solve

Array = NDArray[np.float64]


def reduced_slope(solution: Solution) -> Array:
    """Slope of the Lagrangian in the power of each cell by itself (N,), seconds per watt.

    Zero on the whole over each piece at the optimum; within a piece it says where more power
    and where less would pay if the piece could be cut there.
    """
    ridden = solution.ride
    problem, motion = ridden.problem, ridden.motion
    price = prices(
        problem.law,
        motion,
        runs=ridden.runs,
        pieces=ridden.starts.size,
        power_share=problem.power_share,
        w_prime_j=problem.w_prime_j,
        multipliers=solution.multipliers_s_per_j,
        at_lowest=problem.reserve_everywhere,
        start_j=problem.w_start_j,
    )
    ends = cell_end_slopes(problem.road, motion, ridden.target_w)
    weight = 1.0 - price.per_s
    per_energy = weight * ends.time_to - price.per_w * ends.power_to
    per_energy[:-1] += (weight * ends.time_from - price.per_w * ends.power_from)[1:]
    adjoint = time_adjoint(ends, ridden.cell_slopes, per_energy=per_energy)
    return -price.per_w * ends.power_target + adjoint * ridden.cell_slopes.power


def curvature(ridden: Ride) -> Array:
    """Second slope of the Lagrangian in each cell's power (N,), quasi-steady, s/W²."""
    power = np.maximum(ridden.target_w, 0.5 * float(np.mean(ridden.target_w)))
    return ridden.motion.time_s / (3.0 * power**2)


@dataclass(frozen=True)
class Refinement:
    """What refining did: the solution, and the solves and iterations it took."""

    solution: Solution
    solves: int
    iterations: int


def refined(
    solution: Solution, *, most_pieces: int, shortest_s: float, rounds: int = 6
) -> Refinement:
    """Cut better, with at most ``most_pieces`` pieces none shorter than ``shortest_s`` seconds.

    Each round splits where that gains most, merges where it costs least, moves every boundary
    by the second-order model, and solves again; a round that does not gain is taken back and
    half its moves are tried.
    """
    best, solves, iterations = solution, 1, solution.iterations
    reach, exchanges = 1.0, 2
    for _ in range(rounds):
        slope = reduced_slope(best)
        starts, power = _exchanged(
            best, slope, most_pieces=most_pieces, shortest_s=shortest_s, exchanges=exchanges
        )
        starts = _moved(best, slope, starts, power, shortest_s=shortest_s, reach=reach)
        if np.array_equal(starts, best.ride.starts):
            if reach < 0.3:
                break
            reach, exchanges = 0.5 * reach, 0
            continue
        trial = solve(best.ride.problem, starts, power, guess_m_s=best.ride.motion.speed_m_s)
        solves, iterations = solves + 1, iterations + trial.iterations
        gain = best.ride.motion.total_s - trial.ride.motion.total_s
        if gain > 0.0:
            best = trial
        if gain < 2e-5 * best.ride.motion.total_s:
            if reach < 0.3:
                break
            reach, exchanges = 0.5 * reach, exchanges // 2
    return Refinement(best, solves, iterations)


def _exchanged(
    solution: Solution, slope: Array, *, most_pieces: int, shortest_s: float, exchanges: int
) -> tuple[Cuts, Array]:
    """Split and merge pieces while a split gains more than the merge that pays for it costs."""
    ridden = solution.ride
    elapsed, bend = ridden.motion.elapsed_s, curvature(ridden)
    starts, power = ridden.starts, ridden.power_w
    splits = _best_splits(starts, slope, bend, elapsed, shortest_s)
    order = np.argsort([-gain for gain, _ in splits])
    done, touched = 0, set[int]()
    added: list[int] = []
    dropped: list[int] = []
    merges = _merge_costs(starts, power, bend)
    by_cost = np.argsort(merges)
    for k in order.tolist():
        gain, at = splits[k]
        if gain <= 0.0 or k in touched:
            continue
        if starts.size + len(added) - len(dropped) >= most_pieces:
            if done >= exchanges:
                break
            free = [
                j
                for j in by_cost.tolist()
                if j not in touched and j + 1 not in touched and k not in (j, j + 1)
            ]
            if not free or gain < 1.3 * merges[free[0]]:
                break
            dropped.append(int(starts[free[0] + 1]))
            touched |= {free[0], free[0] + 1}
            done += 1
        added.append(at)
        touched.add(k)
    new = np.array(sorted((set(starts.tolist()) - set(dropped)) | set(added)), dtype=np.intp)
    return new, _averaged(ridden, new)


def merged_to(solution: Solution, most_pieces: int) -> Solution:
    """Merge the neighbours that cost least to merge until ``most_pieces`` are left; solve again."""
    ridden = solution.ride
    starts, power = ridden.starts, ridden.power_w
    bend = curvature(ridden)
    while starts.size > max(1, most_pieces):
        drop = int(np.argmin(_merge_costs(starts, power, bend))) + 1
        starts = np.delete(starts, drop)
        power = _averaged(ridden, starts)
    return solve(ridden.problem, starts, power, guess_m_s=ridden.motion.speed_m_s)


def _averaged(ridden: Ride, starts: Cuts) -> Array:
    """Time-weighted mean target of the old pieces over new ones."""
    time = ridden.motion.time_s
    work = np.add.reduceat(ridden.target_w * time, starts)
    return work / np.add.reduceat(time, starts)


def _best_splits(
    starts: Cuts, slope: Array, bend: Array, elapsed: Array, shortest_s: float
) -> list[tuple[float, int]]:
    """For each piece the gain of its best split, and the cell where the second half begins."""
    found = []
    for a, b in zip(starts, np.append(starts[1:], slope.size), strict=True):
        inside = np.arange(a + 1, b)
        inside = inside[
            (elapsed[inside] - elapsed[a] >= shortest_s)
            & (elapsed[b] - elapsed[inside] >= shortest_s)
        ]
        if inside.size == 0:
            found.append((0.0, -1))
            continue
        first = np.cumsum(slope[a:b])[inside - a - 1]
        left = np.cumsum(bend[a:b])[inside - a - 1]
        right = bend[a:b].sum() - left
        gain = 0.5 * first**2 * (1.0 / left + 1.0 / right)
        pick = int(np.argmax(gain))
        found.append((float(gain[pick]), int(inside[pick])))
    return found


def _merge_costs(starts: Cuts, power: Array, bend: Array) -> Array:
    """What riding each pair of neighbours at one power costs, seconds (n − 1,)."""
    weight = np.add.reduceat(bend, starts)
    together = weight[:-1] * weight[1:] / (weight[:-1] + weight[1:])
    return np.asarray(0.5 * np.diff(power) ** 2 * together)


def _moved(
    solution: Solution, slope: Array, starts: Cuts, power: Array, *, shortest_s: float, reach: float
) -> Cuts:
    """Move each boundary to where the model's Lagrangian is least, a share ``reach`` of the way."""
    bend, elapsed = curvature(solution.ride), solution.ride.motion.elapsed_s
    moved = starts.copy()
    ends = np.append(starts[1:], slope.size)
    for k in range(1, starts.size):
        here, step = int(starts[k]), float(power[k - 1] - power[k])
        a = (int(moved[k - 1]) + here) // 2
        b = (here + int(ends[k])) // 2
        # change of the Lagrangian if the boundary stood at each node a..b
        marginal = step * slope[a:b]
        forward = np.cumsum(np.append(0.0, marginal))
        change = forward - forward[here - a]
        stiff = np.cumsum(np.append(0.0, 0.5 * step**2 * bend[a:b]))
        change += np.abs(stiff - stiff[here - a])
        target = a + int(np.argmin(change))
        there = here + round(reach * (target - here))
        low = np.searchsorted(elapsed, elapsed[moved[k - 1]] + shortest_s)
        high = np.searchsorted(elapsed, elapsed[ends[k]] - shortest_s, side="right") - 1
        if low <= high:
            moved[k] = min(max(there, int(low)), int(high))
    return moved
