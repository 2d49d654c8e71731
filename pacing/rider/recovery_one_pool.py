"""Recovery laws with W′ in one pool: none at all, or an exponential return of what is owed."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.rider.recovery import LEAST_DEFICIT_W, Advance, Pools, RecoveryLaw
from pacing.rider.time_constants import TimeConstant

Array = NDArray[np.float64]


class NoRecovery(RecoveryLaw):
    """What is spent above critical power stays spent."""

    name = "none"
    pool_shares = (1.0,)

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
        return (pools[0] - max(excess_w, 0.0) * duration_s,)

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
        if excess_w < 0.0:
            return Advance((pools[0],), ((1.0,),), (0.0,), (0.0,))
        return _spent(pools[0], excess_w, duration_s)

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
        return pools - np.maximum(excess_w, 0.0) * duration_s


class OnePool(RecoveryLaw):
    """The debt to W′ decays with a time constant τ(D); ``tau_for`` gives it for a W′."""

    pool_shares = (1.0,)

    def __init__(
        self,
        name: str,
        tau_for: Callable[[float], TimeConstant],
        constants: dict[str, float] | None = None,
    ) -> None:
        self.name = name
        self._tau_for = tau_for
        self._constants = constants or {}

    def return_rates_per_s(self, deficit_w: Array, *, w_prime_j: float) -> Array:
        """See `RecoveryLaw.return_rates_per_s`."""
        return 1.0 / self._tau_for(w_prime_j).tau_s(deficit_w)[None, :]

    @property
    def constants(self) -> dict[str, float]:
        """See `RecoveryLaw.constants`."""
        return dict(self._constants)

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
        if excess_w > -LEAST_DEFICIT_W:
            return (pools[0] - max(excess_w, 0.0) * duration_s,)
        debt = max(w_prime_j - pools[0], 0.0)
        tau = self._tau_for(w_prime_j).tau_s(-excess_w)
        return (w_prime_j - _debt_after(debt, -excess_w, duration_s, tau, capped=capped),)

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
        if excess_w > -LEAST_DEFICIT_W:
            return _spent(pools[0], max(excess_w, 0.0), duration_s)
        law = self._tau_for(w_prime_j)
        debt = max(w_prime_j - pools[0], 0.0)
        after = _debt_and_slopes(
            debt,
            -excess_w,
            duration_s,
            law.tau_s(-excess_w),
            law.slope_s_per_w(-excess_w),
            capped=capped,
        )
        # W′ left is W′ − debt and D is −excess, so two signs turn in the first and third.
        return Advance(
            (w_prime_j - after.debt_j,),
            ((after.d_debt,),),
            (after.d_deficit,),
            (-after.d_duration,),
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
        left, excess, duration, w_prime = np.broadcast_arrays(
            pools[0], excess_w, duration_s, w_prime_j
        )
        after = left - np.maximum(excess, 0.0) * duration
        below = excess <= -LEAST_DEFICIT_W
        deficit, time = -excess[below], duration[below]
        tau = self._tau_for_many(w_prime[below], deficit)
        debt = np.maximum(w_prime[below] - left[below], 0.0)
        if capped:
            linear = np.clip((debt - deficit * tau) / deficit, 0.0, time)
            debt, time = debt - deficit * linear, time - linear
        after[below] = w_prime[below] - debt * np.exp(-time / tau)
        return np.asarray(after[np.newaxis])

    def _tau_for_many(self, w_prime_j: Array, deficit_w: Array) -> Array:
        several = np.unique(w_prime_j)
        if several.size <= 1:
            return self._tau_for(float(several[0]) if several.size else 1.0).tau_s(deficit_w)
        pairs = zip(w_prime_j.tolist(), deficit_w.tolist(), strict=True)
        return np.array([self._tau_for(w).tau_s(d) for w, d in pairs])


class _Debt(NamedTuple):
    debt_j: float
    d_debt: float
    d_deficit: float
    d_duration: float


def _spent(left_j: float, excess_w: float, duration_s: float) -> Advance:
    return Advance((left_j - excess_w * duration_s,), ((1.0,),), (-duration_s,), (-excess_w,))


def _debt_after(
    debt_j: float, deficit_w: float, duration_s: float, tau_s: float, *, capped: bool
) -> float:
    """Debt after a recovery: paid back at D as long as debt/τ exceeds that, then decaying."""
    over_j = debt_j - deficit_w * tau_s
    if not capped or over_j <= 0.0:
        return debt_j * math.exp(-duration_s / tau_s)
    if over_j >= deficit_w * duration_s:
        return debt_j - deficit_w * duration_s
    return deficit_w * tau_s * math.exp(-(duration_s - over_j / deficit_w) / tau_s)


def _debt_and_slopes(
    debt_j: float,
    deficit_w: float,
    duration_s: float,
    tau_s: float,
    tau_slope: float,
    *,
    capped: bool,
) -> _Debt:
    over_j = debt_j - deficit_w * tau_s
    if not capped or over_j <= 0.0:
        decay = math.exp(-duration_s / tau_s)
        debt = debt_j * decay
        return _Debt(debt, decay, debt * duration_s * tau_slope / tau_s**2, -debt / tau_s)
    if over_j >= deficit_w * duration_s:
        return _Debt(debt_j - deficit_w * duration_s, 1.0, -duration_s, -deficit_w)
    decay = math.exp(-(duration_s - over_j / deficit_w) / tau_s)
    debt = deficit_w * tau_s * decay
    paid_s = debt_j / deficit_w
    exponent_slope = paid_s / (deficit_w * tau_s) - (duration_s - paid_s) * tau_slope / tau_s**2
    d_deficit = (tau_s + deficit_w * tau_slope) * decay - debt * exponent_slope
    return _Debt(debt, decay, d_deficit, -debt / tau_s)
