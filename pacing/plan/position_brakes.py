"""Hands off the bars where the plan brakes, which only the brakes notice."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from pacing.plan.position_prices import air_forces_n
from pacing.plan.position_road import seated, upright_most
from pacing.plan.problem import Ride, ride
from pacing.plan.solve import spare_j

MORE_THAN_DRAG = 1.5


def hands_off_at_brakes(ridden: Ride) -> Ride:
    """The same ride with the hands off the bars wherever it brakes.

    The limit decides the speed there. Where the drag of sitting up alone would about do, the
    brakes are not needed and the hands stay on.
    """
    sitting = ridden.problem.sitting
    if sitting is None:
        return ridden
    road, speed = ridden.problem.road, ridden.motion.speed_m_s
    upright = np.full(road.cell_m.size, upright_most(ridden.problem))
    more_n = air_forces_n(road, speed, upright) - air_forces_n(road, speed, road.position)
    braking = ridden.motion.braking_n > MORE_THAN_DRAG * np.maximum(more_n, 1e-6)
    if not np.any(braking & ~sitting.hands_off):
        return ridden
    problem = seated(ridden.problem, replace(sitting, hands_off=sitting.hands_off | braking))
    again = ride(problem, ridden.starts, ridden.power_w, guess_m_s=speed)
    return again if spare_j(again) >= min(0.0, spare_j(ridden)) else ridden
