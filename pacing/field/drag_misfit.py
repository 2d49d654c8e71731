"""Height recomputed from the energy balance, less the recorded one: where a fit goes wrong."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from pacing.field.drag_result import Misfit
from pacing.field.drag_segments import Segments
from pacing.field.drag_solve import Solved
from pacing.field.drag_system import system_of
from pacing.race import Race
from pacing.units import GRAVITY_M_S2

Array = NDArray[np.float64]
Index = NDArray[np.intp]

THIN_M = 25.0
SIGMAS = 1.96


def misfits(solved: Solved, race: Race) -> tuple[Misfit, ...]:
    """The height misfit of every ride, step by step through all that was balanced."""
    system = solved.system
    session, segments = system.session, system.segments
    used = np.zeros(session.dt_s.size, dtype=bool)
    for a, b in zip(segments.start.tolist(), segments.end.tolist(), strict=True):
        used[a:b] = True
    steps = np.flatnonzero(used).astype(np.intp)
    single = Segments(steps, steps + 1, np.arange(steps.size), 0, np.ones((steps.size, 2)))
    fine = system_of(session, single, race, system.unknowns, system.shapes)
    left = replace(fine, wind=system.wind).balance(solved.theta).left_j
    weight_n = race.mass_kg * GRAVITY_M_S2
    gain = np.zeros(session.dt_s.size)
    gain[steps] = left / weight_n
    return tuple(
        _misfit(solved, number, gain, used, weight_n) for number in range(len(session.rides))
    )


def _misfit(solved: Solved, number: int, gain: Array, used: Array, weight_n: float) -> Misfit:
    session = solved.system.session
    here = session.ride == number
    ride = session.rides[number]
    total = np.cumsum(gain[here])
    lasted = np.cumsum(np.where(used[here], session.dt_s[here], 0.0))
    whole = max(float(lasted[-1]), 1.0) if lasted.size else 1.0
    sd = np.exp(solved.log_sd)
    # The fit ties both ends down, so that in between the walk may go off as a bridge does.
    bridge = lasted * (whole - lasted) / whole
    gusts = float(np.median(solved.system.gust_w(solved.theta))) ** 2 * 2.0 * 15.0 * sd[2] ** 2
    band = SIGMAS * np.sqrt(2.0 * sd[0] ** 2 + (sd[1] ** 2 + gusts) * bridge) / weight_n
    height = np.where(used[here], total, np.nan)
    km = session.from_m[here]
    keep = np.unique(np.searchsorted(km, np.arange(0.0, float(km[-1]) + THIN_M, THIN_M)))
    keep = keep[keep < km.size]
    return Misfit(ride.recording.name, km[keep] / 1000.0, height[keep], band[keep])
