"""Where on the course the rider sits how: what a cue asks for, and where the hands are off."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.motion.limits import node_limits_m_s
from pacing.plan.problem import Cuts, Problem, Ride
from pacing.race import Race
from pacing.rider import Position
from pacing.units import KMH_PER_M_S

Array = NDArray[np.float64]

HANDS_OFF_BELOW_KMH = 35.0
"""In bends and slow places slower than this, the hands are at the brakes (common practice)."""


@dataclass(frozen=True)
class Sitting:
    """Positions to choose from, and per cell (N,) the one asked for and where hands are off."""

    positions: tuple[Position, ...]
    asked: NDArray[np.intp]
    hands_off: NDArray[np.bool_]


def slow_bend_cells(race: Race) -> NDArray[np.bool_]:
    """Cells (N,) in bends and slow places limited below `HANDS_OFF_BELOW_KMH`."""
    limit = node_limits_m_s(race.course, max_speed_m_s=np.inf, dry=race.plan.dry)
    slow = limit < HANDS_OFF_BELOW_KMH / KMH_PER_M_S
    return np.asarray(slow[1:] | slow[:-1])


def upright_most(problem: Problem) -> int:
    """The position with the largest drag area straight ahead."""
    return int(np.argmax([area.m2[0] for area in problem.road.drag_areas]))


def seated(problem: Problem, sitting: Sitting) -> Problem:
    """The same problem ridden in the positions asked for.

    Where the hands are off the drag is that of the upright-most position; the share of power
    stays that of the position asked for, which a short bend does not change.
    """
    shares = np.array([position.power_share for position in sitting.positions])
    position = np.where(sitting.hands_off, upright_most(problem), sitting.asked)
    return replace(
        problem,
        road=replace(problem.road, position=position.astype(np.intp)),
        power_share=shares[sitting.asked],
        sitting=sitting,
    )


def in_each_position(race: Race, problem: Problem) -> tuple[Problem, ...]:
    """The problem with every position in turn asked for all the way; itself if there is one."""
    positions = race.rider.positions
    if len(positions) == 1:
        return (problem,)
    hands_off = slow_bend_cells(race)
    return tuple(
        seated(problem, Sitting(positions, np.full(problem.cells, p), hands_off))
        for p in range(len(positions))
    )


def sitting_as(problem: Problem, other: Problem) -> Problem:
    """``problem`` in the positions of ``other``."""
    return problem if other.sitting is None else seated(problem, other.sitting)


def asked_in_pieces(problem: Problem, starts: Cuts) -> NDArray[np.intp]:
    """The position each piece (n,) asks for."""
    if problem.sitting is None:
        return problem.road.position[starts]
    return problem.sitting.asked[starts]


def with_pieces(problem: Problem, starts: Cuts, asked: NDArray[np.intp]) -> Problem:
    """The problem with positions ``asked`` (n,) in pieces that begin at ``starts`` (n,)."""
    if problem.sitting is None:
        return problem
    cells = np.repeat(asked, np.diff(np.append(starts, problem.cells)))
    if np.array_equal(cells, problem.sitting.asked):
        return problem
    return seated(problem, replace(problem.sitting, asked=cells))


def moved_to(ridden: Ride, starts: Cuts) -> Problem:
    """The ride's problem for pieces that begin elsewhere: as many keep their positions in order.

    Otherwise each takes the position in which most of its time is ridden.
    """
    problem = ridden.problem
    if problem.sitting is None:
        return problem
    if starts.size == ridden.starts.size:
        return with_pieces(problem, starts, asked_in_pieces(problem, ridden.starts))
    time = [
        np.add.reduceat(np.where(problem.sitting.asked == p, ridden.motion.time_s, 0.0), starts)
        for p in range(len(problem.sitting.positions))
    ]
    return with_pieces(problem, starts, np.argmax(time, axis=0))
