"""The plan: from a race to pieces, cues, the ride they make, and how good that is."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from time import perf_counter
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from pacing.course.pieces import cut_pieces
from pacing.plan.cautions import plan_cautions
from pacing.plan.cues import placed
from pacing.plan.frames import cue_frame, model_inputs, piece_frame, split_frame, trace_frame
from pacing.plan.marginal import marginal
from pacing.plan.places import places_of, readable_nodes
from pacing.plan.prepare import Prepared, prepare, settled
from pacing.plan.problem import Cuts, Ride, ride
from pacing.plan.refine import Refinement, merged_to, refined
from pacing.plan.replay import refuse_reserve_broken, refuse_stall, replayed
from pacing.plan.rounding import long_pieces, rounded, split_for_steps
from pacing.plan.solve import Solution, solve
from pacing.race import Race

Array = NDArray[np.float64]

SHORTEST_SLACK = 1.1
"""Pieces are cut a little longer than cues need be, so that there is room to move them."""


@dataclass(frozen=True)
class Plan:
    """A plan for one race.

    ``cues``, ``pieces``, ``trace`` and ``splits`` are DataFrames; ``time_s`` is the time of
    riding the cues exactly as printed. ``constant`` holds ``power_w`` and ``time_s`` of the
    highest constant target that keeps the same reserve under the same limits.
    """

    race: Race
    time_s: float
    cues: pd.DataFrame
    pieces: pd.DataFrame
    trace: pd.DataFrame
    splits: pd.DataFrame
    solver: Mapping[str, Any]
    constant: Mapping[str, Any]
    sensitivities: Mapping[str, Any] | None
    cautions: tuple[str, ...]
    inputs: Mapping[str, Any]

    def to_json_dict(self) -> dict[str, Any]:
        """The whole result as plain lists, dicts and numbers (schema ``plan/1``)."""
        return {
            "schema": "plan/1",
            "time_s": self.time_s,
            "constant": dict(self.constant),
            "cues": self.cues.to_dict(orient="records"),
            "pieces": self.pieces.to_dict(orient="records"),
            "splits": self.splits.to_dict(orient="records"),
            "sensitivities": self.sensitivities,
            "solver": dict(self.solver),
            "cautions": list(self.cautions),
            "inputs": dict(self.inputs),
        }

    def save(self, folder: Path | str) -> None:
        """Write the output folder: complete, or not at all.

        Raises UnusableInputError if the folder cannot be written or holds other files.
        """
        from pacing.report.export import write_plan

        write_plan(self, Path(folder))


def plan_race(race: Race) -> Plan:
    """Find the powers of least time for ``race`` and the cues a rider can follow.

    Raises
    ------
    CannotBeRiddenError
        If the rider stalls or the reserve cannot be kept.
    OurFaultError
        If solver and simulator disagree.
    """
    began = perf_counter()
    prepared = prepare(race)
    found = _optimum(prepared)
    cued = _cues(found.prepared, found.solution)
    ridden = replayed(cued)
    refuse_reserve_broken(ridden)
    seconds = perf_counter() - began
    return _plan(found.prepared, found, ridden, seconds)


@dataclass(frozen=True)
class _Found:
    """The optimum in pieces, with what it took."""

    prepared: Prepared
    solution: Solution
    solves: int
    iterations: int


def _optimum(prepared: Prepared) -> _Found:
    """Solve, bring weather and critical power up to date with the ride found, solve again."""
    solution = None
    solves = iterations = 0
    for _ in range(4):
        refinement = _refined(prepared, solution)
        solution = refinement.solution
        solves, iterations = solves + refinement.solves, iterations + refinement.iterations
        refuse_stall(solution.ride)
        again = settled(prepared, solution.ride)
        if again is prepared:
            break
        prepared = again
    assert solution is not None
    return _Found(prepared, solution, solves, iterations)


def _refined(prepared: Prepared, before: Solution | None) -> Refinement:
    """The best cuts found, or the cuts of ``before`` solved again for what has changed."""
    problem, plan = prepared.problem, prepared.race.plan
    if before is not None:
        solution = solve(
            problem, before.ride.starts, before.ride.power_w, guess_m_s=before.ride.motion.speed_m_s
        )
        return Refinement(solution, 1, solution.iterations)
    shortest = SHORTEST_SLACK * plan.shortest_cue_s
    starts = _terrain_cuts(prepared, shortest)
    constant = prepared.constant
    first = solve(
        problem,
        starts,
        np.full(starts.size, constant.power_w[0]),
        guess_m_s=constant.motion.speed_m_s,
    )
    return refined(first, most_pieces=plan.max_cues, shortest_s=shortest)


def _terrain_cuts(prepared: Prepared, shortest_s: float) -> Cuts:
    """Cuts by what the rider must overcome, at the speed of the constant ride."""
    motion, road = prepared.constant.motion, prepared.problem.road
    force, _ = road.resistance_n_and_slope(0.5 * (motion.speed_m_s[1:] + motion.speed_m_s[:-1]))
    nodes = cut_pieces(
        motion.elapsed_s,
        force,
        most_pieces=prepared.race.plan.max_cues,
        shortest_m=shortest_s,
    )
    return nodes[:-1]


def _cues(prepared: Prepared, solution: Solution) -> Ride:
    """Cues as printed: boundaries where they can be seen, powers in whole steps.

    Where pieces are so long that a step of power is much of W′, some cues may be better spent
    on changing between two steps; both ways are tried.
    """
    race = prepared.race
    step_w = race.plan.power_step_w * race.rider.power_meter_factor
    ways = [_printed(prepared, solution, step_w)]
    long = int(np.sum(long_pieces(solution.ride, step_w=step_w)))
    most = race.plan.max_cues - min(long, race.plan.max_cues // 2)
    if long and solution.ride.starts.size > most:
        ways.append(_printed(prepared, merged_to(solution, most), step_w))
    return min(ways, key=lambda way: way.motion.total_s)


def _printed(prepared: Prepared, solution: Solution, step_w: float) -> Ride:
    """Place the boundaries, solve again, round together."""
    race = prepared.race
    readable = readable_nodes(race.course, places_of(race.course))
    starts = placed(
        solution, marginal(solution), readable, shortest_s=race.plan.shortest_cue_s
    )
    ridden = solution.ride
    again = solve(prepared.problem, starts, ridden.power_w, guess_m_s=ridden.motion.speed_m_s)
    cut = split_for_steps(again.ride, readable, step_w=step_w)
    if starts.size < cut.size <= race.plan.max_cues:
        again = _cut_at(again, cut)
    return _merged(rounded(again, step_w=step_w))


def _cut_at(solution: Solution, starts: Cuts) -> Solution:
    """The same ride with more pieces."""
    ridden = solution.ride
    power = ridden.target_w[starts]
    return replace(
        solution, ride=ride(ridden.problem, starts, power, guess_m_s=ridden.motion.speed_m_s)
    )


def _merged(ridden: Ride) -> Ride:
    """Neighbouring cues of the same power and position as one."""
    position = ridden.problem.road.position[ridden.starts]
    new = np.ones(ridden.starts.size, dtype=bool)
    new[1:] = (np.diff(ridden.power_w) != 0.0) | (np.diff(position) != 0)
    return ride(
        ridden.problem,
        ridden.starts[new],
        ridden.power_w[new],
        guess_m_s=ridden.motion.speed_m_s,
    )


def _plan(prepared: Prepared, found: _Found, ridden: Ride, seconds: float) -> Plan:
    race, constant = found.prepared.race, found.prepared.constant
    course_places = places_of(race.course)
    unrounded = found.solution.ride.motion.total_s
    return Plan(
        race=race,
        time_s=ridden.motion.total_s,
        cues=cue_frame(race, ridden, course_places),
        pieces=piece_frame(found.solution.ride),
        trace=trace_frame(race, ridden),
        splits=split_frame(race, ridden),
        solver={
            "method": "SLSQP over piece powers, exact gradients",
            "status": found.solution.status,
            "message": found.solution.message,
            "iterations": found.iterations,
            "evaluations": found.solution.evaluations,
            "solves": found.solves,
            "seconds": seconds,
            "pieces": int(found.solution.ride.starts.size),
            "kkt_residual": found.solution.kkt_residual,
            "free_time_s": None,
            "unrounded_time_s": unrounded,
            "gap_pct": None,
            "cutting_pct": None,
            "rounding_pct": None,
            "placing_pct": None,
        },
        constant={
            "power_w": float(constant.power_w[0]) / race.rider.power_meter_factor,
            "time_s": constant.motion.total_s,
        },
        sensitivities=None,
        cautions=plan_cautions(race, ridden, constant),
        inputs={**race.inputs, "model": model_inputs(race, ridden)},
    )
