"""The plan: from a race to pieces, cues, the ride they make, and how good that is."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from time import perf_counter
from typing import Any

import pandas as pd

from pacing.plan.cautions import plan_cautions
from pacing.plan.crossover import positions_report
from pacing.plan.cues import Printed, print_cues
from pacing.plan.frames import cue_frame, model_inputs, piece_frame, split_frame, trace_frame
from pacing.plan.optimum import Optimum, optimise
from pacing.plan.places import places_of
from pacing.plan.replay import refuse_reserve_broken, replayed
from pacing.race import Race


@dataclass(frozen=True)
class Plan:
    """A plan for one race.

    ``cues``, ``pieces``, ``trace`` and ``splits`` are DataFrames; ``time_s`` is the time of
    riding the cues exactly as printed. ``constant`` holds ``power_w`` and ``time_s`` of the
    highest constant target that keeps the same reserve under the same limits. ``positions`` says
    when another position is faster and what changing is worth; None for a rider with one.
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
    positions: Mapping[str, Any] | None = None

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
            **({} if self.positions is None else {"positions": dict(self.positions)}),
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
    found = optimise(race)
    printed = print_cues(race, found.solution)
    seconds = perf_counter() - began
    ridden = replayed(printed.ride)
    refuse_reserve_broken(ridden)
    return _plan(found, printed._replace(ride=ridden), seconds)


def _plan(found: Optimum, printed: Printed, seconds: float) -> Plan:
    race, ridden, constant = found.prepared.race, printed.ride, found.prepared.constant
    return Plan(
        race=race,
        time_s=ridden.motion.total_s,
        cues=cue_frame(race, ridden, places_of(race.course)),
        pieces=piece_frame(found.solution.ride),
        trace=trace_frame(race, ridden),
        splits=split_frame(race, ridden),
        solver=_solver(found, printed, seconds),
        constant={
            "power_w": float(constant.power_w[-1]) / race.rider.power_meter_factor,
            "time_s": constant.motion.total_s,
        },
        sensitivities=None,
        cautions=plan_cautions(race, ridden, constant),
        inputs={**race.inputs, "model": model_inputs(race, ridden)},
        positions=positions_report(race, ridden, found.choice),
    )


def _solver(found: Optimum, printed: Printed, seconds: float) -> dict[str, Any]:
    """How the plan was found and how far each step is from the free ride."""
    solution, free_s = found.solution, found.free.motion.total_s
    unrounded_s, printed_s = solution.ride.motion.total_s, printed.ride.motion.total_s
    per_cent = 100.0 / free_s
    return {
        "method": "SLSQP over piece powers, exact gradients; pieces cut by a fine solve",
        "status": solution.status,
        "message": solution.message,
        "iterations": found.iterations,
        "evaluations": found.evaluations,
        "solves": found.solves,
        "seconds": seconds,
        "free_seconds": found.free_seconds,
        "pieces": int(solution.ride.starts.size),
        "kkt_residual": solution.kkt_residual,
        "free_time_s": free_s,
        "free_times_s": list(found.free_times_s),
        "free_solved": free_s < unrounded_s,
        "unrounded_time_s": unrounded_s,
        "evenness_s": found.evenness_s,
        "gap_pct": per_cent * (printed_s - free_s),
        "cutting_pct": per_cent * (unrounded_s - free_s),
        "placing_pct": per_cent * (printed.placed_time_s - unrounded_s),
        "rounding_pct": per_cent * (printed_s - printed.placed_time_s),
    }
