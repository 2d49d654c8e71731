"""The default recovery law: W′ in a quick and a slow pool.

A calibration, not a validation: the four constants were fitted to second-hand group means of
recovery after exhaustion and of intermittent work to exhaustion (`pacing.rider.recovery_fit` does
it and prints how near it comes). Single riders differ by more.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.rider.recovery import LEAST_DEFICIT_W, Advance, Pools, RecoveryLaw
from pacing.rider.time_constants import PowerOfDeficit
from pacing.rider.two_phase_many import recover_many, spend_many

Array = NDArray[np.float64]
Pair = tuple[float, float]

SLOW_TAU = PowerOfDeficit(scale=13957.0, exponent=0.5924)


@dataclass(frozen=True)
class TwoPhase(RecoveryLaw):
    """Two pools that are spent together and come back each at its own pace.

    Spending takes from each in proportion to what it holds; below zero both fall by size.
    Recovery: each pool's debt decays, the quick one with ``quick_tau_s``, the slow one with
    ``slow_tau`` of D. Where together they would return more than D, both are slowed alike.

    Source: caen-2021 (two phases); constants from `pacing.rider.recovery_fit`.
    """

    quick_share: float = 0.3735
    quick_tau_s: float = 33.73
    slow_tau: PowerOfDeficit = SLOW_TAU
    name = "two-phase"

    @property
    def pool_shares(self) -> Pair:
        """Size of the quick and the slow pool over W′."""
        return (self.quick_share, 1.0 - self.quick_share)

    @property
    def constants(self) -> dict[str, float]:
        """See `RecoveryLaw.constants`; ``by_content`` 1 says that spending goes by content."""
        return {
            "quick_share": self.quick_share,
            "quick_tau_s": self.quick_tau_s,
            "slow_tau_scale": self.slow_tau.scale,
            "slow_tau_exponent": self.slow_tau.exponent,
            "by_content": 1.0,
        }

    def return_rates_per_s(self, deficit_w: Array, *, w_prime_j: float) -> Array:
        """See `RecoveryLaw.return_rates_per_s`."""
        quick = np.full(deficit_w.size, 1.0 / self.quick_tau_s)
        return np.stack([quick, 1.0 / self.slow_tau.tau_s(deficit_w)])

    def advance(
        self,
        pools: Pools,
        excess_w: float,
        duration_s: float,
        *,
        w_prime_j: float,
        capped: bool = True,
    ) -> Pools:
        """See `RecoveryLaw.advance`."""
        quick, slow = pools
        if excess_w > -LEAST_DEFICIT_W:
            return self._spend(quick, slow, max(excess_w, 0.0) * duration_s)
        deficit = -excess_w
        full = self.quick_share * w_prime_j
        rates = (1.0 / self.quick_tau_s, 1.0 / self.slow_tau.tau_s(deficit))
        debts = (max(full - quick, 0.0), max(w_prime_j - full - slow, 0.0))
        time, _ = _own_time(debts, rates, deficit, duration_s, capped=capped)
        return (
            full - debts[0] * math.exp(-time * rates[0]),
            w_prime_j - full - debts[1] * math.exp(-time * rates[1]),
        )

    def advance_and_slopes(
        self,
        pools: Pools,
        excess_w: float,
        duration_s: float,
        *,
        w_prime_j: float,
        capped: bool = True,
    ) -> Advance:
        """See `RecoveryLaw.advance_and_slopes`."""
        quick, slow = pools
        if excess_w > -LEAST_DEFICIT_W:
            return self._spend_and_slopes(quick, slow, max(excess_w, 0.0), duration_s)
        return self._recover_and_slopes(
            quick, slow, -excess_w, duration_s, w_prime_j=w_prime_j, capped=capped
        )

    def advance_many(
        self,
        pools: Array,
        excess_w: Array,
        duration_s: Array,
        *,
        w_prime_j: float | Array,
        capped: bool = True,
    ) -> Array:
        """See `RecoveryLaw.advance_many`."""
        quick, slow, excess, duration, w_prime = np.broadcast_arrays(
            pools[0], pools[1], excess_w, duration_s, w_prime_j
        )
        after = np.stack([quick, slow]).astype(float)
        up = excess > -LEAST_DEFICIT_W
        after[:, up] = spend_many(
            after[:, up],
            np.maximum(excess[up], 0.0) * duration[up],
            quick_share=self.quick_share,
        )
        down = ~up
        deficit = -excess[down]
        after[:, down] = recover_many(
            after[:, down],
            np.stack([self.quick_share * w_prime[down], (1 - self.quick_share) * w_prime[down]]),
            np.stack([np.full_like(deficit, self.quick_tau_s), self.slow_tau.tau_s(deficit)]),
            deficit,
            duration[down],
            capped=capped,
        )
        return after

    def _spend(self, quick: float, slow: float, spent_j: float) -> Pair:
        total = quick + slow
        left = total - spent_j
        share = self.quick_share
        if quick > 0.0 and slow > 0.0:
            if left > 0.0:
                kept = left / total
                return quick * kept, slow * kept
            return share * left, (1.0 - share) * left
        held = max(quick, 0.0) + max(slow, 0.0)
        if spent_j > held:
            rest = spent_j - held
            return min(quick, 0.0) - share * rest, min(slow, 0.0) - (1.0 - share) * rest
        return (quick - spent_j, slow) if quick > 0.0 else (quick, slow - spent_j)

    def _spend_and_slopes(
        self, quick: float, slow: float, excess_w: float, duration_s: float
    ) -> Advance:
        share, spent_j = self.quick_share, excess_w * duration_s
        total = quick + slow
        left = total - spent_j
        # rows: d quick after, d slow after; columns: by quick, by slow, by what is spent
        if quick > 0.0 and slow > 0.0 and left > 0.0:
            kept, shift = left / total, spent_j / total**2
            rows = (
                (kept + quick * shift, quick * shift, -quick / total),
                (slow * shift, kept + slow * shift, -slow / total),
            )
        elif (quick > 0.0 or slow > 0.0) and left > min(quick, slow, 0.0):
            from_quick = 1.0 if quick > 0.0 else 0.0
            rows = ((1.0, 0.0, -from_quick), (0.0, 1.0, from_quick - 1.0))
        else:
            quick_own, slow_own = float(quick <= 0.0), float(slow <= 0.0)
            rows = (
                (share + (1.0 - share) * quick_own, share * (1.0 - slow_own), -share),
                ((1.0 - share) * (1.0 - quick_own), 1.0 - share * (1.0 - slow_own), share - 1.0),
            )
        return Advance(
            self._spend(quick, slow, spent_j),
            (rows[0][:2], rows[1][:2]),
            (rows[0][2] * duration_s, rows[1][2] * duration_s),
            (rows[0][2] * excess_w, rows[1][2] * excess_w),
        )

    def _recover_and_slopes(
        self,
        quick: float,
        slow: float,
        deficit_w: float,
        duration_s: float,
        *,
        w_prime_j: float,
        capped: bool,
    ) -> Advance:
        tau = self.slow_tau.tau_s(deficit_w)
        slow_rate_slope = -self.slow_tau.slope_s_per_w(deficit_w) / tau**2
        k1, k2 = rates = (1.0 / self.quick_tau_s, 1.0 / tau)
        full = self.quick_share * w_prime_j
        debts = (max(full - quick, 0.0), max(w_prime_j - full - slow, 0.0))
        time, slowed = _own_time(debts, rates, deficit_w, duration_s, capped=capped)
        e1, e2 = math.exp(-time * k1), math.exp(-time * k2)
        x1, x2 = debts[0] * e1, debts[1] * e2
        rate = x1 * k1 + x2 * k2
        # How the pools' own time moves with each debt, with D and with the clock.
        t_x1 = t_x2 = t_deficit = 0.0
        t_clock = 1.0
        if slowed is not None:
            s1, s2 = math.exp(-slowed * k1), math.exp(-slowed * k2)
            still_slowed = slowed == time
            slope = rate if still_slowed else deficit_w
            t_x1, t_x2 = (s1 - 1.0) / slope, (s2 - 1.0) / slope
            slow_part = -debts[1] * s2 * slowed * slow_rate_slope
            gained = debts[0] * (1.0 - s1) + debts[1] * (1.0 - s2)
            t_deficit = (gained / deficit_w + slow_part) / slope
            t_clock = deficit_w / slope if still_slowed else 1.0
        return Advance(
            (full - x1, w_prime_j - full - x2),
            ((e1 - x1 * k1 * t_x1, -x1 * k1 * t_x2), (-x2 * k2 * t_x1, e2 - x2 * k2 * t_x2)),
            (-x1 * k1 * t_deficit, -x2 * (k2 * t_deficit + time * slow_rate_slope)),
            (x1 * k1 * t_clock, x2 * k2 * t_clock),
        )


def _own_time(
    debts: Pair, rates: Pair, deficit_w: float, duration_s: float, *, capped: bool
) -> tuple[float, float | None]:
    """Time by which the pools' own decay has gone on, and the part of it that was slowed.

    Slowed to D in all, the debts follow their own decay with a clock that runs slow:
    d(clock)/d(own time) = Σ debt·rate / D, so Σ debt falls by D a second.
    """
    x1, x2 = debts
    k1, k2 = rates
    if not capped or x1 * k1 + x2 * k2 <= deficit_w:
        return duration_s, None
    goal = x1 + x2 - deficit_w * duration_s
    if goal > 0.0:
        time = _decay_time(x1, x2, k1, k2, goal)
        if x1 * k1 * math.exp(-time * k1) + x2 * k2 * math.exp(-time * k2) >= deficit_w:
            return time, time
    slowed = _decay_time(x1 * k1, x2 * k2, k1, k2, deficit_w)
    paid = x1 * -math.expm1(-slowed * k1) + x2 * -math.expm1(-slowed * k2)
    return slowed + max(duration_s - paid / deficit_w, 0.0), slowed


def _decay_time(a1: float, a2: float, k1: float, k2: float, goal: float) -> float:
    """Time at which a₁ e^(−k₁ t) + a₂ e^(−k₂ t) has fallen to ``goal`` from above.

    Newton on the logarithm, which is convex, from below: it never overshoots.
    """
    time = math.log((a1 + a2) / goal) / max(k1, k2)
    for a, k in ((a1, k1), (a2, k2)):
        if a > goal:
            time = max(time, math.log(a / goal) / k)
    for _ in range(60):
        f1, f2 = a1 * math.exp(-time * k1), a2 * math.exp(-time * k2)
        step = math.log((f1 + f2) / goal) * (f1 + f2) / (f1 * k1 + f2 * k2)
        time += step
        if abs(step) <= 1e-9 * time:
            break
    return time
