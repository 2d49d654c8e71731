"""Ways to change who sits how: a piece otherwise, a stretch cut out, a boundary slid."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.plan.marginal import Marginal, curvature, marginal
from pacing.plan.position_prices import (
    OUTSIDE_PRICE,
    held_runs,
    merit_s,
    position_changes_s,
)
from pacing.plan.position_road import asked_in_pieces, with_pieces
from pacing.plan.problem import Cuts, Problem, Ride, ride
from pacing.plan.refine import averaged
from pacing.plan.solve import Solution, margins_j, power_bounds_w

Array = NDArray[np.float64]

MOST_PLACES = 60
"""Places looked at within a piece for a change of position."""
LEAST_STRETCH_GAIN_S = 0.05
AT_BOUND_W = 1.0


class Move(NamedTuple):
    """Other pieces and positions (n,) to try, and the seconds they promise to gain.

    ``name`` tells other cuts apart, whatever the pieces around them; empty where none is moved.
    """

    gain_s: float
    starts: Cuts
    power_w: Array
    asked: NDArray[np.intp]
    name: tuple[int, ...] = ()


def applied(problem: Problem, move: Move) -> Problem:
    """The problem in the positions of a move."""
    return with_pieces(problem, move.starts, move.asked)


def flipped(solution: Solution, pieces: tuple[int, ...], positions: tuple[int, ...]) -> Move:
    """Some pieces in other positions at the same effort, judged by one ride at the old prices.

    A piece at its highest power may stay there if that pays, for the bound was what held it.
    """
    ridden = solution.ride
    now = asked_in_pieces(ridden.problem, ridden.starts)
    asked, shares = now.copy(), _shares(ridden.problem)
    asked[list(pieces)] = positions
    low, high = power_bounds_w(ridden.problem, ridden)
    power = np.clip(ridden.power_w * shares[asked] / shares[now], low, high)
    ways = [_judged(solution, Move(0.0, ridden.starts, power, asked))]
    held = (ridden.power_w > high - AT_BOUND_W) & (power < high - AT_BOUND_W)
    if np.any(held):
        full = np.where(held, ridden.power_w, power)
        ways.append(_judged(solution, Move(0.0, ridden.starts, full, asked)))
    return max(ways, key=lambda move: move.gain_s)


def _judged(solution: Solution, move: Move) -> Move:
    ridden = solution.ride
    there = ride(
        applied(ridden.problem, move), move.starts, move.power_w, guess_m_s=ridden.motion.speed_m_s
    )
    left = solution.multipliers_s_per_j @ (margins_j(there) - margins_j(ridden))
    return move._replace(gain_s=float(merit_s(ridden) - merit_s(there) + left))


def flips(solution: Solution) -> list[Move]:
    """Every piece in every other position."""
    ridden = solution.ride
    asked = asked_in_pieces(ridden.problem, ridden.starts)
    count = _shares(ridden.problem).size
    return [
        flipped(solution, (k,), (p,))
        for k in range(asked.size)
        for p in range(count)
        if p != asked[k]
    ]


def slides(solution: Solution, *, shortest_s: float) -> list[Move]:
    """Every boundary between two positions where, by the adjoint, it stands best."""
    ridden = solution.ride
    asked = asked_in_pieces(ridden.problem, ridden.starts)
    swap = SwapCosts(solution)
    value = marginal(solution)
    elapsed = ridden.motion.elapsed_s
    ends = np.append(ridden.starts[1:], ridden.problem.cells)
    found = []
    for k in (np.flatnonzero(np.diff(asked) != 0) + 1).tolist():
        a, here, b = int(ridden.starts[k - 1]), int(ridden.starts[k]), int(ends[k])
        nodes = np.unique(np.linspace(a, b, min(b - a, 2 * MOST_PLACES) + 1).astype(np.intp))
        roomy = (elapsed[nodes] - elapsed[a] >= shortest_s) & (
            elapsed[b] - elapsed[nodes] >= shortest_s
        )
        nodes = nodes[roomy & (nodes != here)]
        if nodes.size == 0:
            continue
        costs = [swap.boundary_s(value, ridden, k, int(node)) for node in nodes]
        best = int(np.argmin(costs))
        starts = ridden.starts.copy()
        starts[k] = nodes[best]
        name = (here, int(nodes[best]))
        found.append(Move(-costs[best], starts, ridden.power_w, asked, name))
    return found


class SwapCosts:
    """Seconds that a stretch costs when it is ridden in another position, by the adjoint."""

    def __init__(self, solution: Solution) -> None:
        changes = position_changes_s(solution)
        self.sums = np.concatenate([np.zeros((changes.shape[0], 1)), np.cumsum(changes, 1)], 1)

    def change_s(self, first: int, last: int, position: int) -> float:
        """Cells ``first`` up to ``last`` in ``position``."""
        return float(self.sums[position, last] - self.sums[position, first])

    def boundary_s(self, value: Marginal, ridden: Ride, piece: int, node: int) -> float:
        """The start of ``piece`` moved to ``node``: cells passed take power and position."""
        here = int(ridden.starts[piece])
        asked = asked_in_pieces(ridden.problem, ridden.starts)
        shares = _shares(ridden.problem)
        first, last = min(here, node), max(here, node)
        takes, gives = (piece - 1, piece) if node > here else (piece, piece - 1)
        # the change of power beyond the one that the same effort in the other position brings
        same = ridden.power_w[gives] * shares[asked[takes]] / shares[asked[gives]]
        step = float(ridden.power_w[takes] - same)
        return self.change_s(first, last, int(asked[takes])) + value.change_s(
            slice(first, last), step
        )


def stretches(solution: Solution, *, most_pieces: int, shortest_s: float) -> list[Move]:
    """For each piece and position the stretch that is best ridden in it, cut out of the piece.

    Where there are too many pieces, neighbours in one position are merged to make room.
    """
    ridden = solution.ride
    problem = ridden.problem
    sums = SwapCosts(solution).sums
    asked = asked_in_pieces(problem, ridden.starts)
    ends = np.append(ridden.starts[1:], problem.cells)
    merges = _merge_costs(ridden, asked)
    over = {a: seconds for a, _, seconds in _long_pieces(ridden)}
    found = []
    for k, (a, b) in enumerate(zip(ridden.starts.tolist(), ends.tolist(), strict=True)):
        for p in range(sums.shape[0]):
            if p == asked[k]:
                continue
            cut = _best_stretch(ridden, sums[p], a, b, shortest_s, over.get(a, 0.0))
            if cut is None:
                continue
            gain, first, last = cut
            room = most_pieces - ridden.starts.size - ((first > a) + (last < b))
            dropped = _cheapest(merges, max(0, -room), k)
            if dropped is None:
                continue
            gain -= float(np.sum(merges[dropped]))
            if gain > LEAST_STRETCH_GAIN_S:
                found.append(_cut_out(ridden, asked, k, p, (first, last), dropped, gain))
    return found


def _best_stretch(
    ridden: Ride, sums: Array, a: int, b: int, shortest_s: float, over_s: float
) -> tuple[float, int, int] | None:
    """Gain and nodes of the best stretch of the piece [a, b); it pays to break a long hold."""
    nodes = np.unique(np.linspace(a, b, min(b - a, MOST_PLACES) + 1).astype(np.intp))
    at = ridden.motion.elapsed_s[nodes]
    i, j = np.triu_indices(nodes.size, 1)
    whole = (i == 0) & (j == nodes.size - 1)
    roomy = (at[j] - at[i] >= shortest_s) & ~whole
    roomy &= (i == 0) | (at[i] - at[0] >= shortest_s)
    roomy &= (j == nodes.size - 1) | (at[-1] - at[j] >= shortest_s)
    i, j = i[roomy], j[roomy]
    if i.size == 0:
        return None
    gain = sums[nodes[i]] - sums[nodes[j]]
    if over_s > 0.0:
        longest_left = np.maximum(at[i] - at[0], at[-1] - at[j])
        gain = gain + OUTSIDE_PRICE * np.minimum(over_s, at[-1] - at[0] - longest_left)
    pick = int(np.argmax(gain))
    return float(gain[pick]), int(nodes[i[pick]]), int(nodes[j[pick]])


def _long_pieces(ridden: Ride) -> list[tuple[int, int, float]]:
    """Pieces of stretches held too long: first cell, cell after, seconds too many."""
    edges = np.append(ridden.starts, ridden.problem.cells)
    return [
        (int(edges[k]), int(edges[k + 1]), over)
        for a, b, over in held_runs(ridden)
        if over > 0.0
        for k in range(int(np.searchsorted(edges, a)), int(np.searchsorted(edges, b)))
    ]


def _cut_out(
    ridden: Ride,
    asked: NDArray[np.intp],
    piece: int,
    position: int,
    nodes: tuple[int, int],
    dropped: list[int],
    gain_s: float,
) -> Move:
    """Pieces with one stretch of ``piece`` in another position, and some neighbours merged."""
    first, last = nodes
    problem, shares = ridden.problem, _shares(ridden.problem)
    target, cells = ridden.target_w.copy(), problem.cells
    of_cell = np.repeat(asked, np.diff(np.append(ridden.starts, cells)))
    target[first:last] *= shares[position] / shares[asked[piece]]
    of_cell[first:last] = position
    edges = set(ridden.starts.tolist()) | {first} | ({last} if last < cells else set())
    edges -= {int(ridden.starts[pair + 1]) for pair in dropped}
    starts = np.array(sorted(edges), dtype=np.intp)
    power = averaged(target, ridden.motion.time_s, starts)
    power = np.clip(power, problem.min_power_w, problem.max_power_w)
    return Move(gain_s, starts, power, of_cell[starts], (first, last, position))


def _merge_costs(ridden: Ride, asked: NDArray[np.intp]) -> Array:
    """What riding each pair of neighbours at one power costs, s (n − 1,); inf for two positions."""
    weight = np.add.reduceat(curvature(ridden), ridden.starts)
    together = weight[:-1] * weight[1:] / (weight[:-1] + weight[1:])
    cost = 0.5 * np.diff(ridden.power_w) ** 2 * together
    return np.where(np.diff(asked) == 0, cost, np.inf)


def _cheapest(merges: Array, count: int, piece: int) -> list[int] | None:
    """The ``count`` cheapest merges that leave ``piece`` and each other alone."""
    chosen: list[int] = []
    taken = {piece}
    for pair in np.argsort(merges).tolist():
        if len(chosen) == count or not np.isfinite(merges[pair]):
            break
        if not taken & {pair, pair + 1}:
            chosen.append(pair)
            taken |= {pair, pair + 1}
    return chosen if len(chosen) == count else None


def _shares(problem: Problem) -> Array:
    assert problem.sitting is not None
    return np.array([position.power_share for position in problem.sitting.positions])
