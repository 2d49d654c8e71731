"""What a ride says of critical power: it cannot be less than what the ride took."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from pacing.field.debrief_ridden import Ridden
from pacing.plan.balance import balance_at_nodes
from pacing.race import Race
from pacing.rider.budget import recovery_law

Array = NDArray[np.float64]

MOST_SHARE = 1.6


@dataclass(frozen=True)
class AtLeast:
    """Critical power [W] that the ride took at least, and its standard error.

    As in the race file: for efforts to half an hour, before any decline of a long race.
    """

    critical_power_w: float
    se_w: float


def least_critical_power(
    ridden: Ridden, race: Race, share: Array, planned_w: float
) -> AtLeast | None:
    """The lowest critical power at which W′ would not have gone below 0; None if it did not.

    ``share`` (M,) is the power share of the position in the ridden cells, ``planned_w`` the
    critical power the plan counted on. The error: W′ and power meter as uncertain as stated.
    """
    if float(np.min(ridden.balance_j)) >= 0.0:
        return None
    decline = race.rider.critical_power_w - planned_w

    def least(w_prime_j: float, meter: float) -> float:
        def lowest(critical_w: float) -> float:
            return _lowest_j(ridden, race, share, critical_w, w_prime_j, meter)

        high = MOST_SHARE * planned_w
        if lowest(planned_w) >= 0.0:
            return planned_w
        if lowest(high) < 0.0:
            return high
        return float(brentq(lowest, planned_w, high, xtol=0.05))

    found = least(race.rider.w_prime_j, 1.0)
    known = race.uncertainty
    more = race.rider.w_prime_j + 1000.0 * known.w_prime_kj
    by_w_prime = found - least(more, 1.0)
    by_meter = found * known.power_meter_pct / 100.0
    return AtLeast(found + decline, float(np.hypot(by_w_prime, by_meter)))


def _lowest_j(
    ridden: Ridden, race: Race, share: Array, critical_w: float, w_prime_j: float, meter: float
) -> float:
    work = ridden.power_w * meter * (ridden.time_s - ridden.stop_s)
    balance = balance_at_nodes(
        recovery_law(race.rider.recovery_law),
        excess_w=work / ridden.time_s / share - critical_w,
        time_s=ridden.time_s,
        w_prime_j=w_prime_j,
    )
    return float(np.min(balance))
