"""From optimal pieces to cues: boundaries where a rider can see or read them, printed powers."""

from __future__ import annotations

from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.plan.marginal import Marginal, marginal
from pacing.plan.places import places_of, readable_nodes
from pacing.plan.position_brakes import hands_off_at_brakes
from pacing.plan.position_moves import SwapCosts
from pacing.plan.position_road import asked_in_pieces, moved_to
from pacing.plan.problem import Cuts, Ride, ride
from pacing.plan.refine import averaged, long_enough, merged_to
from pacing.plan.rounding import long_pieces, rounded, split_for_steps
from pacing.plan.solve import Solution, solve
from pacing.race import Race

Array = NDArray[np.float64]

REACH_M = 160.0
"""How far a boundary may be moved to a readable place."""
IDLE_CUT_SHARE = 5e-6
"""A cut that gains a smaller share of the time is tried without."""
IDLE_SHARE = 5e-5
"""Fewer cues are preferred where all in all they cost no more than this share of the time."""
MOST_TRIES = 8
SHORTEST_SLACK = 1.02
"""Cues are placed a little longer than they need be: rounding changes their times."""


class Printed(NamedTuple):
    """The cues ridden as printed, and the time they took before their powers were rounded."""

    ride: Ride
    placed_time_s: float


def print_cues(race: Race, solution: Solution) -> Printed:
    """Cues as printed, from the optimal pieces.

    Where pieces are so long that a step of power is much of W′, some cues may be better spent
    on changing between two steps; both ways are tried. Cuts that gain next to nothing are not
    worth a rider's eye: fewer cues are taken where they cost less than `IDLE_SHARE`.
    """
    step_w = race.plan.power_step_w * race.rider.power_meter_factor
    ways = [_printed(race, solution, step_w)]
    if np.unique(asked_in_pieces(solution.ride.problem, solution.ride.starts)).size == 1:
        long = int(np.sum(long_pieces(solution.ride, step_w=step_w)))
        most = race.plan.max_cues - min(long, race.plan.max_cues // 2)
        if long and solution.ride.starts.size > most:
            ways.append(_printed(race, merged_to(solution, most), step_w))
        idle_s = IDLE_CUT_SHARE * solution.ride.motion.total_s
        ways.append(_printed(race, merged_to(solution, most, idle_s=idle_s), step_w))
    fastest = min(ways, key=_time_s)
    enough = [way for way in ways if _time_s(way) <= (1.0 + IDLE_SHARE) * _time_s(fastest)]
    best = min(enough, key=lambda way: (way.ride.starts.size, _time_s(way)))
    return best._replace(ride=hands_off_at_brakes(best.ride))


def _time_s(way: Printed) -> float:
    return way.ride.motion.total_s


def _printed(race: Race, solution: Solution, step_w: float) -> Printed:
    """Place the boundaries, solve again, round together; again where a cue came out too short."""
    readable = readable_nodes(race.course, places_of(race.course))
    wanted_s = SHORTEST_SLACK * race.plan.shortest_cue_s
    for attempt in range(MOST_TRIES):
        starts = placed(solution, marginal(solution), readable, shortest_s=wanted_s)
        solution = _solved_at(solution, starts)
        cut = split_for_steps(solution.ride, readable, step_w=step_w, shortest_s=wanted_s)
        fits = starts.size < cut.size <= race.plan.max_cues
        rough = _cut_at(solution, cut) if fits else solution
        ridden = _merged(rounded(rough, step_w=step_w))
        shortest_s = float(np.min(ridden.piece_time_s))
        if ridden.starts.size == 1 or shortest_s >= race.plan.shortest_cue_s:
            break
        if attempt < MOST_TRIES // 2:
            wanted_s *= max(race.plan.shortest_cue_s / shortest_s, 1.0)
            solution = _solved_at(solution, long_enough(ridden, shortest_s=wanted_s))
        else:
            solution = _solved_at(solution, _without_shortest(ridden))
    return Printed(ridden, solution.ride.motion.total_s)


def _without_shortest(ridden: Ride) -> Cuts:
    """Starts with the shortest piece joined to the neighbour whose power is nearer."""
    k = int(np.argmin(ridden.piece_time_s))
    beside = [j for j in (k - 1, k + 1) if 0 <= j < ridden.starts.size]
    other = min(beside, key=lambda j: abs(float(ridden.power_w[j] - ridden.power_w[k])))
    return np.delete(ridden.starts, max(k, other))


def _solved_at(solution: Solution, starts: Cuts) -> Solution:
    """The optimum with pieces beginning elsewhere, from the powers now ridden there."""
    ridden = solution.ride
    power = averaged(ridden.target_w, ridden.motion.time_s, starts)
    return solve(moved_to(ridden, starts), starts, power, guess_m_s=ridden.motion.speed_m_s)


def _cut_at(solution: Solution, starts: Cuts) -> Solution:
    """The same ride with more pieces."""
    ridden = solution.ride
    power = ridden.target_w[starts]
    return replace(
        solution, ride=ride(ridden.problem, starts, power, guess_m_s=ridden.motion.speed_m_s)
    )


def _merged(ridden: Ride) -> Ride:
    """Neighbouring cues of the same power and position as one."""
    position = asked_in_pieces(ridden.problem, ridden.starts)
    new = np.ones(ridden.starts.size, dtype=bool)
    new[1:] = (np.diff(ridden.power_w) != 0.0) | (np.diff(position) != 0)
    return ride(
        ridden.problem,
        ridden.starts[new],
        ridden.power_w[new],
        guess_m_s=ridden.motion.speed_m_s,
    )


def placed(solution: Solution, value: Marginal, readable: Cuts, *, shortest_s: float) -> Cuts:
    """Move every boundary to the readable node where, to second order, it costs least.

    ``readable`` are the nodes at which a cue may begin. Boundaries that find none within
    `REACH_M`, or would make a cue too short, stay.
    """
    ridden = solution.ride
    node_m = np.concatenate([[0.0], np.cumsum(ridden.problem.road.cell_m)])
    elapsed = ridden.motion.elapsed_s
    starts = ridden.starts.copy()
    position = asked_in_pieces(ridden.problem, starts)
    swap = SwapCosts(solution) if np.unique(position).size > 1 else None
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
        if swap is not None and position[k] != position[k - 1]:
            costs = [swap.boundary_s(value, ridden, k, node) for node in near.tolist()]
            starts[k] = near[int(np.argmin(costs))]
            continue
        costs = [
            value.change_s(slice(here, node), step)
            if node > here
            else value.change_s(slice(node, here), -step)
            for node in near.tolist()
        ]
        starts[k] = near[int(np.argmin(costs))]
    return starts
