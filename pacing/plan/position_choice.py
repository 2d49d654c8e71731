"""Which position each piece is ridden in, chosen with its power.

The adjoint says which changes promise to pay: a piece in another position, a stretch cut out of
a piece, a boundary moved. The most promising are solved exactly, from the powers at hand, and
kept if they gain, until none does.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from pacing.plan.position_moves import Move, applied, flipped, flips, slides, stretches
from pacing.plan.position_prices import merit_s, outside_s
from pacing.plan.position_road import asked_in_pieces
from pacing.plan.solve import Solution, solve

LEAST_GAIN_SHARE = 1e-5
"""What a change must gain, in shares of the time."""
HOPE_SHARE, HOPE_SHARE_FEW = 1e-4, 1e-3
"""Positions that promise to lose less than this share are still tried: prices are local.

With few pieces they are long and the prices less sure, and trying costs less.
"""
MOST_TRIES = 8
MOST_ROUNDS = 40
MOST_RESTARTS = 3
FEW_PIECES = 8
ALLOWED_S = 0.5
"""Seconds outside a position's bounds that are let pass: a cell or so at a boundary."""


@dataclass(frozen=True)
class Choice:
    """The solution with positions chosen, and what each single position would have taken.

    ``singles`` are the solutions in one position all the way, in the rider's order; ``single``
    is the fastest that may be ridden so, None where there is none.
    """

    solution: Solution
    singles: tuple[Solution, ...]
    single: int | None
    solves: int
    iterations: int

    @property
    def single_s(self) -> float | None:
        """Time in the best single position."""
        return None if self.single is None else self.singles[self.single].ride.motion.total_s


def choose_positions(
    solution: Solution, *, most_pieces: int, shortest_s: float, cut: bool = True
) -> Choice:
    """Choose a position for every piece of a solution ridden in one position all the way.

    Pieces are cut anew where that pays (``cut``), at most ``most_pieces`` of at least
    ``shortest_s`` each. A problem without positions to choose from comes back as it is.
    """
    if solution.ride.problem.sitting is None:
        return Choice(solution, (solution,), 0, 0, 0)
    search = _Search(solution)
    singles = [solution, *search.solved(_uniform(solution))]
    singles.sort(key=lambda s: int(asked_in_pieces(s.ride.problem, s.ride.starts)[0]))
    allowed = [k for k, s in enumerate(singles) if outside_s(s.ride) <= ALLOWED_S]
    search.best = min(singles, key=lambda s: merit_s(s.ride))
    cutting = (most_pieces, shortest_s) if cut else None
    for _ in range(MOST_RESTARTS):
        search.descend(cutting)
        if not allowed:
            break
        # the pieces found may suit one position all the way better, too
        single = min(allowed, key=lambda k: singles[k].ride.motion.total_s)
        again = search.solve(_all_in(search.best, single))
        singles[single] = min(singles[single], again, key=lambda s: s.ride.motion.total_s)
        if not search.takes(again):
            break
    best = min(allowed, key=lambda k: singles[k].ride.motion.total_s, default=None)
    return Choice(search.best, tuple(singles), best, search.solves, search.iterations)


class _Search:
    """The best solution so far, and what finding it took."""

    def __init__(self, solution: Solution) -> None:
        self.best = solution
        self.solves = self.iterations = 0
        self.in_vain: set[tuple[int, ...]] = set()

    def solve(self, move: Move) -> Solution:
        ridden = self.best.ride
        found = solve(
            applied(ridden.problem, move),
            move.starts,
            move.power_w,
            guess_m_s=ridden.motion.speed_m_s,
        )
        self.solves += 1
        self.iterations += found.iterations
        return found

    def solved(self, moves: Iterable[Move]) -> list[Solution]:
        return [self.solve(move) for move in moves]

    def descend(self, cutting: tuple[int, float] | None) -> None:
        """Change what pays until nothing does; pieces are cut within ``cutting`` if given."""
        for _ in range(MOST_ROUNDS):
            moves = flips(self.best)
            moves += _together(self.best, moves)
            if cutting is not None:
                most, shortest_s = cutting
                moves += stretches(self.best, most_pieces=most, shortest_s=shortest_s)
                moves += slides(self.best, shortest_s=shortest_s)
            if self.improves(moves, MOST_TRIES):
                continue
            few = self.best.ride.starts.size <= FEW_PIECES
            if not few or not self.improves(_pairs(self.best), 3 * MOST_TRIES):
                break

    def improves(self, moves: list[Move], most: int) -> bool:
        """Solve the most promising of the moves until one gains; no cut twice in vain."""
        ridden = self.best.ride
        share = HOPE_SHARE_FEW if ridden.starts.size <= FEW_PIECES else HOPE_SHARE
        hope_s, least_s = share * ridden.motion.total_s, LEAST_GAIN_SHARE * ridden.motion.total_s
        hopeful = [
            move
            for move in sorted(moves, key=lambda m: m.gain_s, reverse=True)
            if move.gain_s > (least_s if move.name else -hope_s) and move.name not in self.in_vain
        ]
        return any(self._kept(move) for move in hopeful[:most])

    def _kept(self, move: Move) -> bool:
        kept = self.takes(self.solve(move))
        if not kept and move.name:
            self.in_vain.add(move.name)
        return kept

    def takes(self, found: Solution) -> bool:
        """Make it the best if it gains."""
        least_s = LEAST_GAIN_SHARE * self.best.ride.motion.total_s
        if merit_s(self.best.ride) - merit_s(found.ride) <= least_s:
            return False
        self.best = found
        return True


def _uniform(solution: Solution) -> list[Move]:
    """Every other position, all the way."""
    problem, starts = solution.ride.problem, solution.ride.starts
    asked = asked_in_pieces(problem, starts)
    assert problem.sitting is not None
    others = [p for p in range(len(problem.sitting.positions)) if p != asked[0]]
    return [_all_in(solution, p) for p in others]


def _all_in(solution: Solution, position: int) -> Move:
    count = solution.ride.starts.size
    return flipped(solution, tuple(range(count)), (position,) * count)


def _together(solution: Solution, singly: list[Move]) -> list[Move]:
    """Flips that promise to gain by themselves, all at once, and those of no two neighbours."""
    asked = asked_in_pieces(solution.ride.problem, solution.ride.starts)
    chosen: dict[int, int] = {}
    apart: dict[int, int] = {}
    best_s = 0.0
    for move in sorted(singly, key=lambda m: m.gain_s, reverse=True):
        piece = int(np.flatnonzero(move.asked != asked)[0])
        if move.gain_s <= 0.0 or piece in chosen:
            continue
        best_s = max(best_s, move.gain_s)
        chosen[piece] = int(move.asked[piece])
        if not {piece - 1, piece + 1} & apart.keys():
            apart[piece] = chosen[piece]
    joint = [
        flipped(solution, tuple(some), tuple(some.values()))
        for some in (chosen, apart)
        if len(some) > 1
    ]
    return [move for move in joint if move.gain_s > best_s]


def _pairs(solution: Solution) -> list[Move]:
    """Every two pieces in other positions."""
    problem, starts = solution.ride.problem, solution.ride.starts
    asked = asked_in_pieces(problem, starts)
    assert problem.sitting is not None
    count = len(problem.sitting.positions)
    return [
        flipped(solution, (i, j), (p, q))
        for i, j in combinations(range(starts.size), 2)
        for p in range(count)
        for q in range(count)
        if p != asked[i] and q != asked[j]
    ]
