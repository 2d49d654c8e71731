"""The printed cues ridden again, by themselves, and held against what the solver said."""

from __future__ import annotations

import numpy as np

from pacing.errors import CannotBeRiddenError, OurFaultError
from pacing.motion.simulate import Mode
from pacing.plan.problem import Ride, ride
from pacing.units import KMH_PER_M_S

BALANCE_TOLERANCE_J = 1.0
ENERGY_TOLERANCE_J = 1.0
TIME_TOLERANCE_S = 1e-3


def replayed(ridden: Ride) -> Ride:
    """Ride the same targets from nothing and check the ride against itself and the law of energy.

    Raises
    ------
    CannotBeRiddenError
        If the rider stalls.
    OurFaultError
        If solver and simulator disagree: on time, on energy, or on W′.
    """
    again = ride(ridden.problem, ridden.starts, ridden.power_w)
    refuse_stall(again)
    apart_s = abs(again.motion.total_s - ridden.motion.total_s)
    if apart_s > TIME_TOLERANCE_S:
        raise OurFaultError(f"The plan takes {apart_s:.4f} s more or less when ridden again.")
    left_j = _energy_left_over_j(again)
    if abs(left_j) > ENERGY_TOLERANCE_J:
        raise OurFaultError(f"The ride makes or loses {left_j:.2f} J of energy.")
    by_runs = again.lowest.end_j
    by_cells = again.balance_j[np.append(again.starts[1:], again.problem.cells)]
    apart_j = float(np.max(np.abs(by_runs - by_cells)))
    if apart_j > BALANCE_TOLERANCE_J:
        raise OurFaultError(f"W′ by pieces and by cells differ by {apart_j:.1f} J.")
    return again


def refuse_reserve_broken(ridden: Ride) -> None:
    """Raise CannotBeRiddenError where W′ falls below the reserve, and OurFaultError never."""
    short = ridden.problem.reserve_j - ridden.balance_j
    if ridden.problem.reserve_everywhere and float(np.max(short)) > BALANCE_TOLERANCE_J:
        worst = int(np.argmax(short))
        km = float(np.sum(ridden.problem.road.cell_m[:worst])) / 1000.0
        raise CannotBeRiddenError(
            f"W′ would fall {np.max(short) / 1000:.1f} kJ below the reserve at km {km:.1f}. "
            "Lower plan.reserve_kj or plan.min_power_w, or check rider.critical_power_w."
        )


def refuse_stall(ridden: Ride) -> None:
    """Raise CannotBeRiddenError naming the kilometre where the rider stalls, and what it takes."""
    stalled = ridden.motion.stalled_cells
    if stalled.size == 0:
        return
    road = ridden.problem.road
    steepest = int(stalled[np.argmax(road.steady_n[stalled])])
    km = float(np.sum(road.cell_m[: stalled[0]])) / 1000.0
    walking = 1.5 * float(ridden.motion.speed_m_s[steepest + 1])
    needed = road.steady_power_w(walking, steepest)
    target = float(ridden.target_w[stalled[0]])
    raise CannotBeRiddenError(
        f"The rider stalls on the climb at km {km:.2f}: {target:.0f} W is not enough. "
        f"Riding it at {walking * KMH_PER_M_S:.0f} km/h takes {needed:.0f} W; allow more with "
        "plan.max_power_w, or check the course's heights and the masses."
    )


def _energy_left_over_j(ridden: Ride) -> float:
    """Work in, less kinetic energy gained, resistance and braking, over the driven cells."""
    motion, road = ridden.motion, ridden.problem.road
    v0, v1 = motion.speed_m_s[:-1], motion.speed_m_s[1:]
    r0, _ = road.resistance_n_and_slope(v0)
    r1, _ = road.resistance_n_and_slope(v1)
    work = road.efficiency * motion.power_w * motion.time_s
    gained = 0.5 * road.effective_mass_kg * (v1**2 - v0**2)
    left = work - gained - road.cell_m * (0.5 * (r0 + r1) + motion.braking_n)
    return float(left[motion.mode != Mode.FLOOR].sum())
