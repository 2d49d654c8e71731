"""How near each recovery law comes to what was measured, and the fit of the default's constants.

``python -m pacing.rider.recovery_fit`` prints the table and fits the constants anew.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from pacing.rider.budget import RECOVERY_LAWS, recovery_law
from pacing.rider.recovery import Pools, RecoveryLaw
from pacing.rider.recovery_data import (
    INTERMITTENT,
    MEASURED,
    MeasuredIntermittent,
    MeasuredRecovery,
)
from pacing.rider.recovery_two_phase import TwoPhase
from pacing.rider.time_constants import PowerOfDeficit

Array = NDArray[np.float64]

INTERMITTENT_WEIGHT = 0.9
"""A point of W′ left at each measured exhaustion, against the RMS of a row of recoveries.

Chosen so that all rows stay below 8 points and the times to exhaustion within 15 %.
"""
LONGEST_INTERMITTENT_S = 20_000.0


def recovery_errors_pct(
    law: RecoveryLaw, row: MeasuredRecovery, *, capped: bool = True
) -> list[float]:
    """The law's W′ found again less the measured one, in points of W′, at each time of ``row``.

    The effort before is ridden first: from rested to empty in ``effort_s`` (300 s if unknown).
    """
    w_prime_j, effort_s = row.w_prime_j, row.effort_s or 300.0
    empty = law.advance(
        law.full(w_prime_j), w_prime_j / effort_s, effort_s, w_prime_j=w_prime_j, capped=capped
    )
    excess_w = row.recovery_w - row.critical_power_w
    errors = []
    for time_s, measured_pct in zip(row.time_s, row.recovered_pct, strict=True):
        left = law.advance(empty, excess_w, time_s, w_prime_j=w_prime_j, capped=capped)
        errors.append(100.0 * sum(left) / w_prime_j - measured_pct)
    return errors


def rms(errors: list[float]) -> float:
    """Root of the mean square."""
    return math.sqrt(sum(error * error for error in errors) / len(errors))


def row_errors_pct(law: RecoveryLaw, *, capped: bool = True) -> dict[str, float]:
    """RMS error in points of W′ over each published table, the two efforts of caen-2019 as one."""
    rows: dict[str, list[float]] = {}
    for row in MEASURED:
        share = row.recovery_w / row.critical_power_w
        name = f"{row.source} at {row.recovery_w:.0f} W ({share:.0%} of CP)"
        rows.setdefault(name, []).extend(recovery_errors_pct(law, row, capped=capped))
    return {name: rms(errors) for name, errors in rows.items()}


def seconds_to_exhaustion(law: RecoveryLaw, bouts: MeasuredIntermittent) -> float:
    """When W′ left first reaches zero; infinite if it never does."""
    pools, clock = law.full(bouts.w_prime_j), 0.0
    excess_w = bouts.work_w - bouts.critical_power_w
    while clock < LONGEST_INTERMITTENT_S:
        if sum(pools) <= excess_w * bouts.work_s:
            return clock + sum(pools) / excess_w
        pools = _one_round(law, bouts, pools, bouts.work_s + bouts.recovery_s)
        clock += bouts.work_s + bouts.recovery_s
    return math.inf


def left_at_exhaustion_pct(law: RecoveryLaw, bouts: MeasuredIntermittent) -> float:
    """W′ left, in % of W′, when the riders measured were exhausted: 0 for a perfect law."""
    pools, rest_s = law.full(bouts.w_prime_j), bouts.exhausted_s
    while rest_s > 0.0:
        pools = _one_round(law, bouts, pools, rest_s)
        rest_s -= bouts.work_s + bouts.recovery_s
    return 100.0 * sum(pools) / bouts.w_prime_j


def _one_round(
    law: RecoveryLaw, bouts: MeasuredIntermittent, pools: Pools, seconds: float
) -> Pools:
    work_s = min(bouts.work_s, seconds)
    easy_s = min(bouts.recovery_s, seconds - work_s)
    critical_power_w, w_prime_j = bouts.critical_power_w, bouts.w_prime_j
    pools = law.advance(pools, bouts.work_w - critical_power_w, work_s, w_prime_j=w_prime_j)
    return law.advance(pools, bouts.recovery_w - critical_power_w, easy_s, w_prime_j=w_prime_j)


def fit_two_phase() -> TwoPhase:
    """The two-phase law nearest to `MEASURED` and `INTERMITTENT`, recovery capped.

    Least squares with the same weight for every row of recoveries. Source: ferguson-2010,
    caen-2019, caen-2021, chidnok-2012.
    """
    from scipy.optimize import least_squares

    def law_of(x: Array) -> TwoPhase:
        share, tau_s, log_scale, exponent = x.tolist()
        slow = PowerOfDeficit(scale=math.exp(log_scale), exponent=exponent)
        return TwoPhase(quick_share=share, quick_tau_s=tau_s, slow_tau=slow)

    def misses(x: Array) -> Array:
        law = law_of(x)
        parts = [
            np.array(recovery_errors_pct(law, row)) / math.sqrt(len(row.time_s)) for row in MEASURED
        ]
        left = [left_at_exhaustion_pct(law, bouts) for bouts in INTERMITTENT]
        return np.concatenate([*parts, INTERMITTENT_WEIGHT * np.array(left)])

    fit = least_squares(
        misses,
        [0.37, 30.0, math.log(16_000.0), 0.6],
        x_scale=[0.1, 5.0, 0.5, 0.1],
        bounds=([0.05, 3.0, 5.0, 0.0], [0.8, 120.0, 15.0, 2.0]),
        xtol=1e-12,
        ftol=1e-12,
        gtol=1e-12,
    )
    return law_of(fit.x)


def table() -> str:
    """Every law against the measurements, as plain text."""
    laws = [recovery_law(name) for name in RECOVERY_LAWS]
    lines = ["RMS in points of W′, capped".ljust(40) + "".join(f"{law.name:>14}" for law in laws)]
    errors = [row_errors_pct(law) for law in laws]
    for name in errors[0]:
        lines.append(name.ljust(40) + "".join(f"{of_law[name]:14.1f}" for of_law in errors))
    for bouts in INTERMITTENT:
        name = f"to exhaustion with {bouts.recovery_w:.0f} W: {bouts.exhausted_s:.0f} s"
        times = [seconds_to_exhaustion(law, bouts) for law in laws]
        lines.append(name.ljust(40) + "".join(f"{time:14.0f}" for time in times))
    return "\n".join(lines)


if __name__ == "__main__":
    print(table())
    print("shipped", TwoPhase().constants)
    print("fitted ", fit_two_phase().constants)
