"""Where to cut: pieces split, merged and moved by what one adjoint solve says of every cell."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.plan.marginal import Marginal, curvature, marginal
from pacing.plan.problem import Cuts, Ride
from pacing.plan.solve import Solution, power_bounds_w, solve

Array = NDArray[np.float64]

MOST_PLACES = 60
"""Places looked at within a piece for a cut."""
TRADE_FACTOR = 1.3
"""A split must promise this much more than the merges that pay for it."""
LEAST_GAIN = 2e-5
"""Share of the time a round must gain to go on at full reach."""


@dataclass(frozen=True)
class Refinement:
    """What refining did: the solution, and the solves and iterations it took."""

    solution: Solution
    solves: int
    iterations: int


class Insert(NamedTuple):
    """A stretch within one piece whose power should differ: nodes, watts, seconds gained."""

    gain_s: float
    first: int
    last: int
    step_w: float
    cuts: int


def refined(
    solution: Solution, *, most_pieces: int, shortest_s: float, rounds: int = 12
) -> Refinement:
    """Cut better, with at most ``most_pieces`` pieces none shorter than ``shortest_s`` seconds.

    Each round splits where that gains most, merges where it costs least, moves every boundary
    by the second-order model, and solves again; what does not gain is taken back and tried in
    smaller steps.
    """
    best, solves, iterations = solution, 0, 0
    at_once, reach = max(2, most_pieces // 6), 1.0
    for _ in range(rounds):
        value = marginal(best)
        starts, power = _recut(best, value, most_pieces, shortest_s, at_once)
        starts = _moved(best, value, starts, power, shortest_s=shortest_s, reach=reach)
        gain = 0.0
        if not np.array_equal(starts, best.ride.starts):
            trial = solve(best.ride.problem, starts, power, guess_m_s=best.ride.motion.speed_m_s)
            solves, iterations = solves + 1, iterations + trial.iterations
            gain = best.ride.motion.total_s - trial.ride.motion.total_s
            best = trial if gain > 0.0 else best
        if gain < LEAST_GAIN * best.ride.motion.total_s:
            if at_once == 0 or reach < 0.3:
                break
            at_once, reach = at_once // 3, 0.5 * reach
    return Refinement(best, solves, iterations)


def _recut(
    solution: Solution, value: Marginal, most_pieces: int, shortest_s: float, at_once: int
) -> tuple[Cuts, Array]:
    """Insert up to ``at_once`` stretches, paid for by merges where there are too many pieces."""
    ridden = solution.ride
    inserts = sorted(_best_inserts(ridden, value, shortest_s), reverse=True)
    merges = _merge_costs(ridden.starts, ridden.power_w, value.bend)
    piece_of = np.searchsorted(ridden.starts, [i.first for i in inserts], side="right") - 1
    target, edges = ridden.target_w.copy(), set(ridden.starts.tolist())
    touched: set[int] = set()
    room = most_pieces - ridden.starts.size
    for insert, piece in list(zip(inserts, piece_of.tolist(), strict=True)):
        if at_once == 0 or insert.gain_s <= 0.0:
            break
        if touched & {piece - 1, piece, piece + 1}:
            continue
        short = max(0, insert.cuts - room)
        dropped = _cheapest(merges, short, touched | {piece - 1, piece})
        if dropped is None or insert.gain_s < TRADE_FACTOR * float(np.sum(merges[dropped])):
            continue
        for pair in dropped:
            edges.discard(int(ridden.starts[pair + 1]))
            touched |= {pair, pair + 1}
        touched.add(piece)
        room += len(dropped) - insert.cuts
        edges |= {insert.first} | ({insert.last} if insert.last < target.size else set())
        target[insert.first : insert.last] += 0.5 * insert.step_w
        at_once -= 1
    starts = np.array(sorted(edges), dtype=np.intp)
    return starts, averaged(target, ridden.motion.time_s, starts)


def _cheapest(merges: Array, count: int, untouchable: set[int]) -> list[int] | None:
    """The ``count`` cheapest merges that leave ``untouchable`` pieces and each other alone."""
    chosen: list[int] = []
    taken = set(untouchable)
    for pair in np.argsort(merges).tolist():
        if len(chosen) == count:
            break
        if not taken & {pair, pair + 1}:
            chosen.append(pair)
            taken |= {pair - 1, pair, pair + 1}
    return chosen if len(chosen) == count else None


def _best_inserts(ridden: Ride, value: Marginal, shortest_s: float) -> list[Insert]:
    """For each piece the stretch whose power is best changed, by one cut or by two."""
    ends = np.append(ridden.starts[1:], value.up.size)
    elapsed = ridden.motion.elapsed_s
    found = []
    for k, (a, b) in enumerate(zip(ridden.starts.tolist(), ends.tolist(), strict=True)):
        if elapsed[b] - elapsed[a] >= 2.0 * shortest_s:
            found.append(_best_insert(ridden, value, k, a, b, shortest_s))
    return found


def _best_insert(
    ridden: Ride, value: Marginal, piece: int, a: int, b: int, shortest_s: float
) -> Insert:
    """The best stretch [first, last) of the piece [a, b), judged to second order."""
    nodes = np.unique(np.linspace(a, b, min(b - a, MOST_PLACES) + 1).astype(np.intp))
    at = ridden.motion.elapsed_s[nodes]
    up, down, bend = (
        np.append(0.0, np.cumsum(values[a:b]))[nodes - a]
        for values in (value.up, value.down, value.bend)
    )
    i, j = np.triu_indices(nodes.size, 1)
    whole = (i == 0) & (j == nodes.size - 1)
    roomy = (at[j] - at[i] >= shortest_s) & ~whole
    roomy &= (i == 0) | (at[i] - at[0] >= shortest_s)
    roomy &= (j == nodes.size - 1) | (at[-1] - at[j] >= shortest_s)
    i, j = i[roomy], j[roomy]
    if i.size == 0:
        return Insert(0.0, a, b, 0.0, 0)
    inside = bend[j] - bend[i]
    held = up[-1] != down[-1]
    # a piece held at critical power leaves the rest as it is; any other gives way around it
    stiff = inside if held else inside * (bend[-1] - inside) / bend[-1]
    problem, power = ridden.problem, float(ridden.power_w[piece])
    more = np.minimum(np.maximum(up[i] - up[j], 0.0) / stiff, problem.max_power_w - power)
    less = np.minimum(np.maximum(down[j] - down[i], 0.0) / stiff, power - problem.min_power_w)
    gain_more = more * (up[i] - up[j]) - 0.5 * stiff * more**2
    gain_less = less * (down[j] - down[i]) - 0.5 * stiff * less**2
    gain = np.maximum(gain_more, gain_less)
    cuts = (i > 0).astype(int) + (j < nodes.size - 1)
    pick = int(np.argmax(gain / cuts))
    step = more[pick] if gain_more[pick] >= gain_less[pick] else -less[pick]
    return Insert(
        float(gain[pick]), int(nodes[i[pick]]), int(nodes[j[pick]]), float(step), int(cuts[pick])
    )


def merged_to(solution: Solution, most_pieces: int, *, idle_s: float = 0.0) -> Solution:
    """Merge the neighbours that cost least to merge until ``most_pieces`` are left; solve again.

    Below that, merging goes on while a cut gains less than ``idle_s`` seconds. A start with a
    cap of its own stays by itself as long as the count allows.
    """
    ridden = solution.ride
    starts, power = ridden.starts, ridden.power_w
    bend = curvature(ridden)
    _, most_w = power_bounds_w(ridden.problem, ridden)
    while starts.size > 1:
        costs = _merge_costs(starts, power, bend) + 1e3 * (np.diff(most_w) != 0.0)
        drop = int(np.argmin(costs))
        if starts.size <= most_pieces and costs[drop] >= idle_s:
            break
        starts, most_w = np.delete(starts, drop + 1), np.delete(most_w, drop + 1)
        power = averaged(ridden.target_w, ridden.motion.time_s, starts)
    if starts.size == ridden.starts.size:
        return solution
    return solve(ridden.problem, starts, power, guess_m_s=ridden.motion.speed_m_s)


def long_enough(ridden: Ride, *, shortest_s: float) -> Cuts:
    """Starts of the pieces so that none of the ride's is shorter than ``shortest_s``.

    A short piece takes what it lacks from a neighbour that can spare it, or joins the neighbour
    whose power is nearer.
    """
    elapsed, starts, power = ridden.motion.elapsed_s, ridden.starts, ridden.power_w
    for_both_s = 2.0 * (shortest_s + float(np.max(ridden.motion.time_s)))
    while starts.size > 1:
        at = elapsed[np.append(starts, ridden.problem.cells)]
        time = np.diff(at)
        k = int(np.argmin(time))
        if time[k] >= shortest_s:
            break
        if k + 1 < starts.size and at[k + 2] - at[k] >= for_both_s:
            starts = starts.copy()
            starts[k + 1] = np.searchsorted(elapsed, at[k] + shortest_s)
        elif k > 0 and at[k + 1] - at[k - 1] >= for_both_s:
            starts = starts.copy()
            starts[k] = np.searchsorted(elapsed, at[k + 1] - shortest_s, side="right") - 1
        else:
            beside = [j for j in (k - 1, k + 1) if 0 <= j < starts.size]
            other = min(beside, key=lambda j: abs(power[j] - power[k]))
            drop = max(k, other)
            starts, power = np.delete(starts, drop), np.delete(power, drop)
    return starts


def averaged(target_w: Array, time_s: Array, starts: Cuts) -> Array:
    """Time-weighted mean target over pieces."""
    return np.add.reduceat(target_w * time_s, starts) / np.add.reduceat(time_s, starts)


def _merge_costs(starts: Cuts, power: Array, bend: Array) -> Array:
    """What riding each pair of neighbours at one power costs, seconds (n − 1,)."""
    weight = np.add.reduceat(bend, starts)
    together = weight[:-1] * weight[1:] / (weight[:-1] + weight[1:])
    return np.asarray(0.5 * np.diff(power) ** 2 * together)


def _moved(
    solution: Solution,
    value: Marginal,
    starts: Cuts,
    power: Array,
    *,
    shortest_s: float,
    reach: float,
) -> Cuts:
    """Move each boundary to where the model's Lagrangian is least, a share ``reach`` of the way."""
    elapsed = solution.ride.motion.elapsed_s
    moved = starts.copy()
    ends = np.append(starts[1:], value.up.size)
    for k in range(1, starts.size):
        here, step = int(starts[k]), float(power[k - 1] - power[k])
        a, b = (int(moved[k - 1]) + here) // 2, (here + int(ends[k])) // 2
        change = _change_if_moved(value, a, here, b, step)
        target = a + int(np.argmin(change))
        there = here + round(reach * (target - here))
        low = np.searchsorted(elapsed, elapsed[moved[k - 1]] + shortest_s)
        high = np.searchsorted(elapsed, elapsed[ends[k]] - shortest_s, side="right") - 1
        if low <= high:
            moved[k] = min(max(there, int(low)), int(high))
    return moved


def _change_if_moved(value: Marginal, a: int, here: int, b: int, step_w: float) -> Array:
    """Lagrangian's change (b − a + 1,) if a boundary ``here`` stood at each node a..b.

    Forward, the cells passed take the earlier piece's power, ``step_w`` more; backward the
    later one's, ``step_w`` less.
    """
    later = value.up if step_w > 0.0 else value.down
    earlier = value.down if step_w > 0.0 else value.up
    forward = step_w * later[here:b] + 0.5 * step_w**2 * value.bend[here:b]
    backward = -step_w * earlier[a:here] + 0.5 * step_w**2 * value.bend[a:here]
    return np.concatenate([np.cumsum(backward[::-1])[::-1], [0.0], np.cumsum(forward)])
