"""After the race: where the time went and why, and what to change for the next one."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from pacing.errors import CannotBeRiddenError, OurFaultError
from pacing.field.debrief_drag import Learnt, learn, race_as_learnt
from pacing.field.debrief_match import Matched, match_ride
from pacing.field.debrief_parts import Basis, Parts, planned_part, taken_apart
from pacing.field.debrief_power import AtLeast, least_critical_power
from pacing.field.debrief_predict import Prediction, predicted
from pacing.field.debrief_ridden import Ridden, ridden_cells
from pacing.field.debrief_slowed import slowed_nodes
from pacing.field.debrief_tables import cue_table, split_table
from pacing.field.debrief_updates import Update, updates_from
from pacing.field.recording import Masked, Recording, recording_of_frame
from pacing.field.recording_check import Ride, check
from pacing.field.recording_columns import Column
from pacing.field.recording_read import read_recording
from pacing.plan import Plan, plan_race
from pacing.race import Race

if TYPE_CHECKING:
    import pandas as pd

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Debrief:
    """A ride against its plan.

    Times in seconds over the part of the course that was ridden (``from_m`` to ``to_m``);
    ``parts_s`` by name add up to ``difference_s``. ``best_with_hindsight_s`` is the plan that
    would have been best with the drag, wind and critical power the ride shows, stops left out;
    None where none could be made. ``cues`` and ``splits`` are DataFrames.
    """

    plan: Plan
    name: str
    from_m: float
    to_m: float
    whole: bool
    planned_s: float
    ridden_s: float
    parts_s: Mapping[str, float]
    cues: pd.DataFrame
    splits: pd.DataFrame
    best_with_hindsight_s: float | None
    updates: tuple[Update, ...]
    prediction: Prediction
    masked: tuple[Masked, ...]
    notes: tuple[str, ...]
    basis: Basis
    ridden: Ridden
    parts: Parts
    recording: Recording

    @property
    def difference_s(self) -> float:
        """Ridden less planned."""
        return self.ridden_s - self.planned_s


def debrief_ride(
    race: Race,
    ride: str | Path | pd.DataFrame,
    *,
    columns: Mapping[str, Column] | None = None,
    plan: Plan | None = None,
    hindsight: bool = True,
) -> Debrief:
    """Compare a ride, as a path or a DataFrame, with the plan for ``race``.

    ``plan`` saves making it again; ``hindsight`` False saves planning with what is known now.
    Raises `UnusableInputError` for a file that is no ride or does
    not follow the course, and what `plan_race` raises.
    """
    recording = (
        read_recording(ride, columns) if isinstance(ride, str | Path) else recording_of_frame(ride)
    )
    checked = check(recording)
    matched = match_ride(checked, race.course)
    return _debriefed(
        checked, matched, plan if plan is not None else plan_race(race), hindsight=hindsight
    )


def _debriefed(ride: Ride, matched: Matched, plan: Plan, *, hindsight: bool) -> Debrief:
    race, trace = plan.race, plan.trace
    names = [position.name for position in race.rider.positions]
    position = np.array([names.index(name) for name in trace["position"]], dtype=np.intp)
    share = trace["power_share"].to_numpy(dtype=float)
    planned_w = float(trace["critical_power_w"].iloc[0])
    ridden = ridden_cells(ride, matched, race, critical_power_w=planned_w, share=share)
    basis = planned_part(plan, ridden)
    limit = np.append(trace["speed_limit_from_m_s"], trace["speed_limit_to_m_s"].iloc[-1])
    learnt = learn(ride, matched, race, position=position, limit_m_s=limit.astype(float))
    as_learnt = race if learnt is None else race_as_learnt(race, learnt.explaining)
    masked = tuple(ride.masked) if learnt is None else learnt.masked
    parts = taken_apart(basis, ridden, as_learnt, slowed_nodes(ridden, masked))
    power = least_critical_power(ridden, race, share[ridden.cells], planned_w)
    notes = [*ride.notes, *matched.notes]
    if learnt is None:
        notes.append("too little of the ride could be used to tell drag and wind from it")
    best, said = _hindsight(race, learnt, power, basis) if hindsight else (None, ())
    whole = (*masked, *ridden.masked)
    return Debrief(
        plan=plan,
        name=ride.recording.name,
        from_m=float(race.course.distance_m[matched.from_node]),
        to_m=float(race.course.distance_m[matched.to_node]),
        whole=matched.whole,
        planned_s=float(basis.time_s.sum()),
        ridden_s=float(ridden.time_s.sum()),
        parts_s=parts.sums(),
        cues=cue_table(plan, basis, ridden, parts),
        splits=split_table(plan, basis, ridden, parts),
        best_with_hindsight_s=best,
        updates=updates_from(race, learnt, power),
        prediction=predicted(ride, matched, ridden, race, position=position),
        masked=tuple(sorted(whole, key=lambda mask: (mask.from_s, mask.to_s))),
        notes=(*notes, *said),
        basis=basis,
        ridden=ridden,
        parts=parts,
        recording=ride.recording,
    )


def _hindsight(
    race: Race, learnt: Learnt | None, power: AtLeast | None, basis: Basis
) -> tuple[float | None, tuple[str, ...]]:
    """Time over the ridden part of the best plan with what is now known."""
    known = race if learnt is None else race_as_learnt(race, learnt.explaining)
    if power is not None and power.critical_power_w > race.rider.critical_power_w:
        rider = replace(known.rider, critical_power_w=power.critical_power_w)
        known = replace(known, rider=rider)
    if known is race:
        return float(basis.time_s.sum()), ()
    try:
        best = plan_race(known)
    except (CannotBeRiddenError, OurFaultError) as problem:
        return None, (f"no plan with hindsight: {problem}",)
    time = best.trace["time_s"].to_numpy(dtype=float)
    return float(time[basis.cells].sum()), ()
