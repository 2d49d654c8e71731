"""Freewheeling into slow places, as the fine solve does it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from pacing.plan.problem import Problem, Ride

Array = NDArray[np.float64]

IDLE_SHARE = 0.07
"""Below this share of critical power a rider counts as freewheeling."""
AT_LIMIT_M_S = 0.03


def with_approaches(problem: Problem, free: Ride) -> Problem:
    """The same problem for a rider who freewheels into slow places where that is best.

    Power spent just before a slow place only heats the brakes. Where the ride with power free
    in every cell stops pedalling ahead of a limit, its speed becomes the limit of the approach;
    a rider at that speed freewheels there. The free ride itself keeps all limits, so its time
    stays the same, and no cue is needed for every bend.
    """
    limit = problem.road.limit_m_s.copy()
    cells = np.flatnonzero(freewheeling_in(free))
    limit[cells] = np.minimum(limit[cells], free.motion.speed_m_s[cells])
    return replace(problem, road=replace(problem.road, limit_m_s=limit))


def freewheeling_in(free: Ride) -> NDArray[np.bool_]:
    """Cells (N,) in which the ride freewheels into a slow place."""
    limit, speed = free.problem.road.limit_m_s, free.motion.speed_m_s
    idle = free.motion.power_w < IDLE_SHARE * free.problem.at_critical_w
    slow = (speed >= limit - AT_LIMIT_M_S) & (limit < 0.999 * float(np.max(limit)))
    found = np.zeros(idle.size, dtype=bool)
    for cell in np.flatnonzero(idle)[::-1].tolist():
        if slow[cell + 1]:
            slow[cell] = found[cell] = True
    return found
