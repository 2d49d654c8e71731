"""The optimum of a race: fine solve, pieces cut by its prices, SLSQP over their powers."""

from __future__ import annotations

from dataclasses import dataclass, replace
from time import perf_counter

import numpy as np
from numpy.typing import NDArray

from pacing.course.pieces import cut_pieces
from pacing.motion.road import Road
from pacing.plan.approach import with_approaches
from pacing.plan.cut import Cut, cheapest_cuts
from pacing.plan.free import FreeRide, ride_free
from pacing.plan.position_choice import Choice, choose_positions
from pacing.plan.position_road import sitting_as
from pacing.plan.prepare import Prepared, prepare, settled
from pacing.plan.problem import Problem, Ride
from pacing.plan.refine import refined
from pacing.plan.replay import refuse_stall
from pacing.plan.solve import Solution, solve
from pacing.race import Race

Array = NDArray[np.float64]

SHORTEST_SLACK = 1.06
"""Pieces are cut a little longer than cues need be, so that there is room to move them."""
LEVEL_W = 10.0
MOST_SETTLINGS = 4
REFINING_ROUNDS = 4


@dataclass(frozen=True)
class Optimum:
    """The best pieces found, and the free ride they are measured against.

    ``free`` is the better of the fine solves from two starts (or the pieces, should neither
    have come as far), a local optimum; ``free_times_s`` are both, ``free_seconds`` the wall
    time they took. ``evenness_s`` is what breaking near-ties towards even power costs.
    """

    prepared: Prepared
    solution: Solution
    free: Ride
    free_times_s: tuple[float, ...]
    solves: int
    iterations: int
    evaluations: int
    free_seconds: float
    evenness_s: float
    choice: Choice


class _Counts:
    """What the solves took together."""

    def __init__(self) -> None:
        self.solves = self.iterations = self.evaluations = 0
        self.free_seconds = 0.0

    def solve(self, problem: Problem, cut: Cut, guess_m_s: Array) -> Solution:
        return self.counted(solve(problem, cut.starts, cut.power_w, guess_m_s=guess_m_s))

    def counted(self, solution: Solution) -> Solution:
        self.solves += 1
        self.iterations += solution.iterations
        self.evaluations += solution.evaluations
        return solution

    def choose(self, prepared: Prepared, solution: Solution) -> Choice:
        plan = prepared.race.plan
        choice = choose_positions(
            solution,
            most_pieces=plan.max_cues,
            shortest_s=SHORTEST_SLACK * plan.shortest_cue_s,
        )
        self.solves += choice.solves
        self.iterations += choice.iterations
        return choice

    def ride_free(self, problem: Problem, start: Ride) -> FreeRide:
        began = perf_counter()
        free = ride_free(problem, start)
        self.free_seconds += perf_counter() - began
        return free


def optimise(race: Race) -> Optimum:
    """Find the pieces and powers of least time for ``race``.

    Raises CannotBeRiddenError if the rider stalls or the reserve cannot be kept.
    """
    counts = _Counts()
    prepared = prepare(race)
    plain = _by_terrain(prepared, counts)
    first = counts.ride_free(prepared.problem, plain.ride)
    prepared = settled(prepared, min(first.ride, plain.ride, key=_time_s))
    choice = counts.choose(prepared, _pieces(prepared, plain, first, counts))
    solution = choice.solution
    for _ in range(MOST_SETTLINGS):
        again = settled(prepared, solution.ride)
        if again is prepared:
            break
        prepared = again
        problem = replace(prepared.problem, road=_with_limits(prepared, solution))
        problem = sitting_as(problem, solution.ride.problem)
        cut = Cut(solution.ride.starts, solution.ride.power_w)
        solution = counts.solve(problem, cut, solution.ride.motion.speed_m_s)
    refuse_stall(solution.ride)
    cut = Cut(solution.ride.starts, solution.ride.power_w)
    fastest = solve(
        solution.ride.problem, *cut, guess_m_s=solution.ride.motion.speed_m_s, evenness=0.0
    )
    ridden_so = sitting_as(prepared.problem, solution.ride.problem)
    second = counts.ride_free(ridden_so, solution.ride)
    times = (first.ride.motion.total_s, second.ride.motion.total_s)
    best = min((first.ride, second.ride, solution.ride), key=lambda ridden: ridden.motion.total_s)
    return Optimum(
        prepared=replace(prepared, problem=solution.ride.problem),
        solution=solution,
        free=best,
        free_times_s=times,
        solves=counts.solves,
        iterations=counts.iterations,
        evaluations=counts.evaluations,
        free_seconds=counts.free_seconds,
        evenness_s=max(0.0, solution.ride.motion.total_s - fastest.ride.motion.total_s),
        choice=choice,
    )


def _by_terrain(prepared: Prepared, counts: _Counts) -> Solution:
    """Pieces cut by what the rider must overcome, at the speed of the constant ride."""
    constant, plan = prepared.constant, prepared.race.plan
    motion, road = constant.motion, prepared.problem.road
    force, _ = road.resistance_n_and_slope(0.5 * (motion.speed_m_s[1:] + motion.speed_m_s[:-1]))
    nodes = cut_pieces(
        motion.elapsed_s,
        force,
        most_pieces=plan.max_cues,
        shortest_m=SHORTEST_SLACK * plan.shortest_cue_s,
    )
    starts = nodes[:-1]
    walking = road.walking_power_w()
    power = np.maximum(constant.power_w[-1], np.maximum.reduceat(walking, starts))
    power = np.minimum(power, prepared.problem.max_power_w)
    return counts.solve(prepared.problem, Cut(starts, power), motion.speed_m_s)


def _pieces(prepared: Prepared, plain: Solution, free: FreeRide, counts: _Counts) -> Solution:
    """Cut by the free ride's prices and by the terrain; the better of the two, refined.

    A fine solve that has not come as far as the pieces by terrain has nothing to teach.
    """
    plan, problem = prepared.race.plan, prepared.problem
    shortest = SHORTEST_SLACK * plan.shortest_cue_s
    by_terrain = Cut(plain.ride.starts, plain.ride.power_w)
    guess = plain.ride.motion.speed_m_s
    tried = [counts.solve(problem, by_terrain, guess)]
    if _time_s(free.ride) < _time_s(tried[0].ride):
        problem = with_approaches(problem, free.ride)
        priced = cheapest_cuts(
            free.priced,
            most_pieces=plan.max_cues,
            shortest_s=shortest,
            levels_w=_levels_w(problem),
        )
        guess = free.ride.motion.speed_m_s
        tried += [counts.solve(problem, cut, guess) for cut in (by_terrain, priced)]
    best = min(tried, key=lambda solution: _time_s(solution.ride))
    refinement = refined(
        best, most_pieces=plan.max_cues, shortest_s=shortest, rounds=REFINING_ROUNDS
    )
    counts.solves += refinement.solves
    counts.iterations += refinement.iterations
    return refinement.solution


def _with_limits(prepared: Prepared, solution: Solution) -> Road:
    """The road brought up to date, with the approaches to slow places that were solved with."""
    return replace(prepared.problem.road, limit_m_s=solution.ride.problem.road.limit_m_s)


def _time_s(ridden: Ride) -> float:
    return ridden.motion.total_s


def _levels_w(problem: Problem) -> Array:
    """Powers a piece may be tried at: every 10 W within the bounds, and critical power."""
    levels = np.arange(problem.min_power_w, problem.max_power_w, LEVEL_W)
    critical = np.unique(problem.at_critical_w)
    every = np.concatenate([levels, critical, [problem.max_power_w]])
    return np.unique(np.clip(every, problem.min_power_w, problem.max_power_w))
