"""From a race to the optimum's question: road, planned critical power, budget and bounds."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.motion.road import Road, road_for
from pacing.plan.position_road import in_each_position
from pacing.plan.problem import Problem, Ride
from pacing.plan.solve import best_constant
from pacing.race import Race
from pacing.rider.budget import recovery_law
from pacing.rider.power_time import declined_critical_power_w

Array = NDArray[np.float64]

CAP_HELD_FOR_S = 180.0
FIRST_30_S_SHARE = 1.3
CLOCK_TOLERANCE_S = 2.0
LEAST_W_PRIME_J = 1e-3
"""A rider without W′ has this little: laws and shares of it divide by W′."""
CRITICAL_POWER_TOLERANCE_W = 0.02


@dataclass(frozen=True)
class Prepared:
    """A race ready to be solved; ``constant`` is the best ride at one target power.

    ``clock_s`` (N,) is the time of day whose weather each cell has.
    """

    race: Race
    problem: Problem
    constant: Ride
    clock_s: Array


def prepare(race: Race) -> Prepared:
    """Set up the problem, with weather and planned critical power for the time it will take.

    Both depend on the ride; here on that of the best constant target. `settled` brings them up
    to date with a better one.
    """
    clock = np.full(race.course.gradient.size, race.plan.start_clock_s)
    prepared = _prepared(race, clock, race.rider.critical_power_w)
    for _ in range(8):
        again = settled(prepared, prepared.constant)
        if again is prepared:
            break
        prepared = again
    return prepared


def settled(prepared: Prepared, ridden: Ride) -> Prepared:
    """The race with the weather met and the critical power held on such a ride.

    Returns ``prepared`` itself where nothing would change by more than the tolerances.
    """
    race = prepared.race
    critical_power = planned_critical_power_w(race, ridden.motion.total_s)
    changed = abs(critical_power - float(prepared.problem.critical_power_w[0]))
    elapsed = ridden.motion.elapsed_s
    clock = race.plan.start_clock_s + 0.5 * (elapsed[1:] + elapsed[:-1])
    late = float(np.max(np.abs(clock - prepared.clock_s)))
    weather_holds = len(race.day.weathers) == 1 or late < CLOCK_TOLERANCE_S
    if changed < CRITICAL_POWER_TOLERANCE_W and weather_holds:
        return prepared
    return _prepared(race, clock, critical_power)


def planned_critical_power_w(race: Race, time_s: float) -> float:
    """Critical power the plan counts on for a race of ``time_s``."""
    rider = race.rider
    return float(
        declined_critical_power_w(
            time_s,
            critical_power_w=rider.critical_power_w,
            long_decline_w=rider.long_decline_w,
        )
    )


def _prepared(race: Race, clock_s: Array, critical_power_w: float) -> Prepared:
    problem = problem_for(race, road_for(race, clock_s=clock_s), critical_power_w)
    constants = [best_constant(ridden) for ridden in in_each_position(race, problem)]
    # one position all the way: the fastest the rider gets through in
    best = min(constants, key=lambda c: (c.motion.stalled_cells.size > 0, c.motion.total_s))
    return Prepared(race, best.problem, best, clock_s)


def problem_for(race: Race, road: Road, critical_power_w: float) -> Problem:
    """The question of least time on ``road`` at a planned critical power."""
    rider, plan = race.rider, race.plan
    share = np.array([position.power_share for position in rider.positions])[road.position]
    cap = plan.max_power_w
    if cap is None:
        cap = rider.critical_power_w + rider.w_prime_j / CAP_HELD_FOR_S
    falls = rider.fit_form == "three-parameter"
    if rider.peak_power_w is not None and not falls:
        cap = min(cap, rider.peak_power_w)
    first = plan.first_30_s_max_w
    return Problem(
        road=road,
        law=recovery_law(rider.recovery_law),
        start_speed_m_s=plan.start_speed_m_s,
        critical_power_w=np.full(share.size, critical_power_w),
        power_share=share,
        w_prime_j=max(rider.w_prime_j, LEAST_W_PRIME_J),
        reserve_j=plan.reserve_j,
        min_power_w=plan.min_power_w,
        max_power_w=cap,
        first_30_s_max_w=FIRST_30_S_SHARE * rider.critical_power_w if first is None else first,
        peak_power_w=rider.peak_power_w if falls else None,
    )
