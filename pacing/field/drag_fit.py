"""Drag area and rolling coefficient from field rides."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from pacing.errors import UnusableInputError
from pacing.field.drag_course import RoadKnown, roads_known
from pacing.field.drag_groups import Where, groups_of
from pacing.field.drag_result import DragFit
from pacing.field.drag_segments import Segments
from pacing.field.drag_session import session_of
from pacing.field.drag_solve import Solved, solve_balance
from pacing.field.drag_stretches import BALANCE, COASTING, METHODS, stretches_of
from pacing.field.drag_summary import Task, interval_of, result_of
from pacing.field.drag_system import Shape, system_of
from pacing.field.drag_tilt import tilt_of
from pacing.field.drag_unknowns import unknowns_for, with_wind_believed
from pacing.field.recording import Recording, recording_of_frame
from pacing.field.recording_check import Ride, check
from pacing.field.recording_columns import Column
from pacing.field.recording_read import read_recording
from pacing.race import Race
from pacing.units import GRAVITY_M_S2

if TYPE_CHECKING:
    import pandas as pd

Array = NDArray[np.float64]

FEWEST_STRETCHES = 6
MOST_OFF = 3.5
"""A stretch that misses by more of its own standard deviations is left out, and said."""
TRIMMINGS = 3
WIDE_CRR, WIDE_CDA = 0.4, 0.15
"""Half intervals over these shares of Crr and of drag area: not told apart."""
LEAST_CRR_SD_SHARE = 0.25
"""Rolling resistance of a road not yet ridden is known no better than this (common practice)."""


def fit_drag(
    rides: str | Path | pd.DataFrame | Sequence[str | Path | pd.DataFrame],
    *,
    race: Race,
    columns: Mapping[str, Column] | None = None,
    positions: Mapping[str, Where] | None = None,
    method: str | None = None,
) -> DragFit:
    """Drag area [m²] and rolling coefficient from rides, as paths or DataFrames.

    ``race`` gives masses, air, efficiency and what is uncertain; ``columns`` maps our column
    names to a file's; ``positions`` says which was held when. ``method`` is "steady runs",
    "energy balance" or "coast-downs", by default what the rides suggest.

    Raises `UnusableInputError` for a file that is no ride, and where too little of the rides
    can be used.

    Source: martin-1998 (the forces), martin-2006 (the regression).
    """
    if method is not None and method not in METHODS:
        raise UnusableInputError(f"a method {method!r}", expected=" or ".join(METHODS))
    given = [rides] if isinstance(rides, str | Path) or hasattr(rides, "columns") else list(rides)
    if not given:
        raise UnusableInputError("no rides", expected="at least one")
    recordings = [_recording(ride, columns, number) for number, ride in enumerate(given, 1)]
    return fit_rides(
        [check(recording) for recording in recordings],
        race,
        positions=positions or {},
        method=method,
    )


def fit_rides(
    rides: Sequence[Ride],
    race: Race,
    *,
    positions: Mapping[str, Where] | None = None,
    method: str | None = None,
) -> DragFit:
    """`fit_drag` for rides already read and checked."""
    names, groups = groups_of(
        [ride.recording for ride in rides], positions or {}, race.rider.positions[0].name
    )
    known = roads_known(rides, race)
    rides = _with_heights(rides, known)
    session = session_of(rides, race, groups, [ride.height_m for ride in rides])
    if known is not None:
        session = replace(
            session,
            crr_factor=np.concatenate([road.crr_factor[:-1] for road in known]),
            wind_share=np.concatenate([road.wind_share[:-1] for road in known]),
        )
    stretches = stretches_of(session, race, method)
    task = Task(session, race, names, stretches, on_course=known is not None)
    _refuse_too_few(task, stretches.segments)
    free, off = _solved(task, crr_sd=None)
    separable = _separable(free)
    solved = free
    if not separable:
        share = max(race.uncertainty.crr_pct / 100.0, LEAST_CRR_SD_SHARE)
        solved, off = _solved(task, crr_sd=share * task.crr)
    return result_of(task, solved, off, separable=separable)


def _with_heights(rides: Sequence[Ride], known: tuple[RoadKnown, ...] | None) -> list[Ride]:
    """Rides without heights of their own get those of the course, and say so."""
    if known is None:
        return list(rides)
    found = []
    for ride, road in zip(rides, known, strict=True):
        if not ride.has_heights and np.isfinite(road.height_m).any():
            notes = (*ride.notes, "no heights recorded: taken from the course")
            ride = replace(ride, has_heights=True, height_m=road.height_m, notes=notes)
        found.append(ride)
    return found


def _recording(ride: object, columns: Mapping[str, Column] | None, number: int) -> Recording:
    if isinstance(ride, str | Path):
        return read_recording(ride, columns)
    return recording_of_frame(ride, name=f"ride {number}")  # type: ignore[arg-type]


def _solved(task: Task, *, crr_sd: float | None) -> tuple[Solved, NDArray[np.bool_]]:
    """The balance solved, stretches that do not fit left out; which were (K,)."""
    session, race = task.session, task.race
    even = task.stretches.method != BALANCE or not session.has_heights
    unknowns = unknowns_for(
        session.rides,
        race,
        positions=task.names,
        crr=task.crr,
        crr_sd=crr_sd,
        tilt=tilt_of(session.rides) if even else None,
        headed=session.headed,
    )
    shapes = tuple(Shape(added=race.bike.cda_by_yaw) for _ in task.names)
    whole = task.stretches.segments
    off = np.zeros(len(whole), dtype=bool)
    typical = _typical(task, even=even)
    theta = None
    for turn in range(TRIMMINGS + 2):
        system = system_of(session, whole.kept(~off), race, unknowns, shapes)
        solved = solve_balance(system, typical=typical, theta=theta)
        theta = solved.theta
        wrong = np.abs(solved.white) > MOST_OFF * max(1.0, float(np.std(solved.white)))
        if (~off).sum() - wrong.sum() < FEWEST_STRETCHES:
            wrong[:] = False
        if turn == 0:
            unknowns = with_wind_believed(unknowns, theta, len(session.rides))
        if not wrong.any() and unknowns is system.unknowns:
            break
        off[np.flatnonzero(~off)[wrong]] = True
    return solved, off


def _typical(task: Task, *, even: bool) -> Array:
    """Scatter expected beforehand: at the ends [J], as a walk [J/√s], of gusts [m/s]."""
    weight_n = task.race.mass_kg * GRAVITY_M_S2
    if not even:
        return np.array([0.15 * weight_n, 0.06 * weight_n, 0.3])
    speed = 8.0
    found = task.stretches.segments
    if len(found):
        speed = float(np.mean(task.session.speed_m_s[found.start]))
    ends_j = 0.05 * task.race.mass_kg * speed if task.stretches.method == COASTING else 1.0
    return np.array([ends_j, 15.0, 0.3])


def _refuse_too_few(task: Task, segments: Segments) -> None:
    masked = [m.why for ride in task.stretches.masked for m in ride]
    most = max(set(masked), key=masked.count) if masked else None
    groups = task.session.group[segments.start]
    for index, name in enumerate(task.names):
        count = int(np.sum(groups == index))
        if count >= FEWEST_STRETCHES or (len(task.names) > 1 and count >= 2):
            continue
        where = f" in position '{name}'" if len(task.names) > 1 else ""
        raise UnusableInputError(
            f"{count} stretches{where} that could be used for {task.stretches.method}"
            + (f"; much is masked: {most}" if most else ""),
            file=", ".join(ride.recording.name for ride in task.session.rides),
            expected=f"at least {FEWEST_STRETCHES} of them",
            mend="ride longer without stops and brakes, at several speeds, both directions",
        )


def _separable(solved: Solved) -> bool:
    """Whether both intervals are narrow against what is usual for such a rider and such tyres.

    Not against the value found: a low value by chance must not decide how it is treated.
    """
    u = solved.system.unknowns
    crr, cda = interval_of(solved, u.at("rolling")), interval_of(solved, 0)
    narrow = crr.half < WIDE_CRR * u.mean[u.at("rolling")] and cda.half < WIDE_CDA * cda.value
    return bool(narrow and crr.value > 0.0)
