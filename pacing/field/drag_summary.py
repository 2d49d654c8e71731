"""From a balance that is solved to what is said of it: values, intervals, wind, what was masked."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.field.drag_fragment import drag_fragment
from pacing.field.drag_misfit import misfits
from pacing.field.drag_result import (
    Difference,
    DragFit,
    Interval,
    Known,
    PositionDrag,
    RideWind,
)
from pacing.field.drag_session import Session
from pacing.field.drag_solve import Solved
from pacing.field.drag_stretches import Stretches
from pacing.field.drag_unknowns import rolling_crr
from pacing.field.drag_warnings import warnings_for
from pacing.field.recording import Masked
from pacing.race import Race
from pacing.units import GRAVITY_M_S2

Array = NDArray[np.float64]

TOLD = 0.3
"""Of the variance of the wind beforehand less than this is left where a ride tells it."""


@dataclass(frozen=True)
class Task:
    """What is to be solved, whatever is taken as known of the tyres."""

    session: Session
    race: Race
    names: tuple[str, ...]
    stretches: Stretches
    on_course: bool = False

    @property
    def crr(self) -> float:
        """Crr beforehand: the tyres' where the course tells its surface, else with a surface."""
        return self.race.bike.crr if self.on_course else rolling_crr(self.race)


def interval_of(solved: Solved, index: int) -> Interval:
    """One unknown by its index, with its 95 % interval."""
    direction = np.zeros(solved.theta.size)
    direction[index] = 1.0
    return _interval(solved, direction)


def _interval(solved: Solved, direction: Array) -> Interval:
    value, half = float(direction @ solved.theta), solved.half_width(direction)
    return Interval(value, value - half, value + half)


def result_of(task: Task, solved: Solved, off: NDArray[np.bool_], *, separable: bool) -> DragFit:
    """The fit of a task; ``off`` (K,) marks the stretches that were left out."""
    session, system = task.session, solved.system
    u = system.unknowns
    crr = interval_of(solved, u.at("rolling"))
    found = tuple(
        PositionDrag(name, interval_of(solved, i), float(system.lasting_s[system.group == i].sum()))
        for i, name in enumerate(task.names)
    )
    direction = np.zeros(u.mean.size)
    direction[0] = 1.0
    parts = solved.budget(direction)
    whole = max(sum(parts.values()), 1e-12)
    speeds = system.way_m / system.lasting_s
    fit = DragFit(
        cda_m2=found[0].cda_m2.value,
        cda_low_m2=found[0].cda_m2.low,
        cda_high_m2=found[0].cda_m2.high,
        crr=crr.value,
        crr_low=crr.low,
        crr_high=crr.high,
        separable=separable,
        method=task.stretches.method,
        positions=found,
        differences=_differences(solved, task.names),
        known=_known(solved, task.race),
        wind=_winds(solved),
        budget={cause: float(part / whole) for cause, part in parts.items()},
        masked=_masked(task, off),
        warnings=(),
        notes=tuple(f"{r.recording.name}: {note}" for r in session.rides for note in r.notes),
        misfit=misfits(solved, task.race),
        used_s=float(system.lasting_s.sum()),
        moving_s=float(sum(ride.moving_s for ride in session.rides)),
        stretches=len(system.segments),
        on_course=task.on_course,
        speed_range_m_s=(float(np.quantile(speeds, 0.1)), float(np.quantile(speeds, 0.9))),
    )
    fit = replace(fit, warnings=warnings_for(fit, session.rides, task.race))
    return replace(fit, fragment=drag_fragment(fit, task.race))


def _differences(solved: Solved, names: tuple[str, ...]) -> tuple[Difference, ...]:
    found = []
    for i in range(1, len(names)):
        for j in range(i):
            direction = np.zeros(solved.theta.size)
            direction[i], direction[j] = 1.0, -1.0
            found.append(Difference(names[i], names[j], _interval(solved, direction)))
    return tuple(found)


def _known(solved: Solved, race: Race) -> Known:
    """The speed at which the sum of air and tyres is known best, and that sum."""
    u, system = solved.system.unknowns, solved.system
    at = u.at("rolling")
    weight_n = race.mass_kg * GRAVITY_M_S2
    half_density = float(np.mean(system.session.half_density_kg_m3))
    best = None
    for speed in np.arange(3.0, 20.01, 0.25):
        direction = np.zeros(solved.theta.size)
        direction[0], direction[at] = half_density * speed**2, weight_n
        interval = _interval(solved, direction)
        if best is None or interval.half / abs(interval.value) < best[1].half / abs(best[1].value):
            best = (float(speed), interval)
    assert best is not None
    covariance = solved.covariance
    slope = covariance[0, at] / max(covariance[0, 0], 1e-18)
    return Known(best[0], best[1], float(slope))


def _winds(solved: Solved) -> tuple[RideWind, ...]:
    u, session = solved.system.unknowns, solved.system.session
    first, wide = u.start("wind"), 2 if session.headed else 1
    found = []
    for number, ride in enumerate(session.rides):
        here = slice(first + wide * number, first + wide * (number + 1))
        covariance = solved.covariance[here, here]
        # Told by the ride where both directions are known much better than beforehand.
        left = np.linalg.eigvals(covariance @ u.precision[here, here]).real
        told = bool(wide == 2 and np.all(left < TOLD) and not u.fixed[here].any())
        vector = solved.theta[here]
        speed = float(np.hypot(*vector)) if wide == 2 else abs(float(vector[0]))
        from_deg = (
            float(np.degrees(np.arctan2(vector[0], vector[1])) % 360.0) if wide == 2 else None
        )
        error = float(np.sqrt(max(np.linalg.eigvalsh(covariance)[-1], 0.0)))
        found.append(
            RideWind(ride.recording.name, told, speed, from_deg, error, number in u.loosened)
        )
    return tuple(found)


def _masked(task: Task, off: NDArray[np.bool_]) -> tuple[tuple[str, Masked], ...]:
    session, segments = task.session, task.stretches.segments
    found = []
    for number, ride in enumerate(session.rides):
        masks = list(task.stretches.masked[number])
        for a, b in zip(segments.start[off].tolist(), segments.end[off].tolist(), strict=True):
            if session.ride[a] == number:
                to_s = float(session.from_s[b - 1] + session.dt_s[b - 1])
                why = "does not fit: brakes, a draught or a wrong height"
                masks.append(Masked(float(session.from_s[a]), to_s, why))
        masks.sort(key=lambda mask: (mask.from_s, mask.to_s))
        found += [(ride.recording.name, mask) for mask in masks]
    return tuple(found)
