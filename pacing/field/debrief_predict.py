"""How well the model predicts a ride from its recorded power: the usual measure of its worth."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from pacing.errors import UnusableInputError
from pacing.field.debrief_match import Matched, match_ride
from pacing.field.debrief_parts import SLOWEST_M_S, part_of_road, ride_road
from pacing.field.debrief_ridden import Ridden, ridden_cells
from pacing.field.recording import Masked
from pacing.field.recording_check import Ride
from pacing.motion import Road, road_for
from pacing.motion.limits import braking_m_s2, with_braking
from pacing.race import Race

Array = NDArray[np.float64]

LOWEST_FACTOR, HIGHEST_FACTOR = 0.3, 3.0


@dataclass(frozen=True)
class Prediction:
    """The ride predicted from its own power, against the ride; stops are left out of both.

    Times in seconds; ``error_pct`` is predicted less ridden over ridden. ``speed_error_m_s`` is
    the root mean square of the difference of speed over distance. ``drag_factor`` times the drag
    area would have made the time right, None where nothing between 0.3 and 3 would. Per node of
    the ridden part (M+1,): ``at_m``, predicted and ridden speed.
    """

    predicted_s: float
    ridden_s: float
    stops_s: float
    speed_error_m_s: float
    drag_factor: float | None
    at_m: Array
    predicted_m_s: Array
    ridden_m_s: Array
    guessed_s: float
    masked: tuple[Masked, ...]
    notes: tuple[str, ...] = ()

    @property
    def error_pct(self) -> float:
        """Predicted less ridden time, in percent of the ridden."""
        return 100.0 * (self.predicted_s / self.ridden_s - 1.0)


def predict(ride: Ride, race: Race) -> Prediction:
    """Simulate the ridden part of the course with the recorded power, as the race file has it.

    The rider starts at the recorded speed and comes to rest where the ride did.
    Raises `UnusableInputError` where the ride does not follow the course.
    """
    matched = match_ride(ride, race.course)
    share = np.full(race.course.gradient.size, race.rider.positions[0].power_share)
    ridden = ridden_cells(
        ride, matched, race, critical_power_w=race.rider.critical_power_w, share=share
    )
    return predicted(ride, matched, ridden, race)


def predicted(
    ride: Ride,
    matched: Matched,
    ridden: Ridden,
    race: Race,
    *,
    position: NDArray[np.intp] | None = None,
) -> Prediction:
    """`predict` for a ride already brought to the course.

    ``position`` (N,) is the index of the position in each cell of the course, by default the
    first everywhere.
    """
    if ridden.moving_s <= 0.0:
        raise UnusableInputError("no riding on the course", file=ride.recording.name)
    clock = race.plan.start_clock_s + np.zeros(race.course.gradient.size)
    middle = 0.5 * (ridden.clock_s[1:] + ridden.clock_s[:-1]) - ridden.clock_s[0]
    clock[ridden.cells] += middle
    road = _stopping(
        part_of_road(road_for(race, clock_s=clock, position=position), ridden.cells), ridden, race
    )
    start = float(ridden.speed_m_s[0])
    motion = ride_road(road, ridden.power_w, start, ridden.speed_m_s)
    off = motion.speed_m_s - ridden.speed_m_s
    weight = np.append(road.cell_m, road.cell_m[-1:])
    return Prediction(
        predicted_s=motion.total_s,
        ridden_s=ridden.moving_s,
        stops_s=float(ridden.stop_s.sum()),
        speed_error_m_s=float(np.sqrt(np.average(off**2, weights=weight))),
        drag_factor=_factor(road, ridden, start),
        at_m=race.course.distance_m[ridden.cells.start : ridden.cells.stop + 1],
        predicted_m_s=motion.speed_m_s,
        ridden_m_s=ridden.speed_m_s,
        guessed_s=ridden.guessed_s,
        masked=ridden.masked,
        notes=matched.notes,
    )


def _stopping(road: Road, ridden: Ridden, race: Race) -> Road:
    """The road with a stop at every place where the rider stood, and brakes before it."""
    limit = road.limit_m_s.copy()
    at = np.flatnonzero(ridden.stop_s > 0.5)
    limit[at + 1] = np.minimum(limit[at + 1], SLOWEST_M_S)
    gradient = race.course.gradient[ridden.cells]
    braking = braking_m_s2(gradient, dry=race.plan.dry)
    return replace(road, limit_m_s=with_braking(limit, cell_m=road.cell_m, braking_m_s2=braking))


def _factor(road: Road, ridden: Ridden, start_m_s: float) -> float | None:
    """What drag areas would have to be multiplied by for the predicted time to be right."""

    def late(factor: float) -> float:
        areas = tuple(area.scaled(factor) for area in road.drag_areas)
        other = replace(road, drag_areas=areas)
        return ride_road(other, ridden.power_w, start_m_s, ridden.speed_m_s).total_s

    low, high = late(LOWEST_FACTOR) - ridden.moving_s, late(HIGHEST_FACTOR) - ridden.moving_s
    if low > 0.0 or high < 0.0:
        return None
    return float(
        brentq(
            lambda factor: late(factor) - ridden.moving_s,
            LOWEST_FACTOR,
            HIGHEST_FACTOR,
            xtol=1e-4,
            rtol=1e-4,
        )
    )
