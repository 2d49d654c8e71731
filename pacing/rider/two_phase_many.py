"""The two-phase law for many riders at once, equal to the one-rider form to rounding."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


def spend_many(pools: Array, spent_j: Array, *, quick_share: float) -> Array:
    """Pools (2, n) after ``spent_j`` (n,), see `pacing.rider.recovery_two_phase.TwoPhase`."""
    shares = np.array([[quick_share], [1.0 - quick_share]])
    held = np.maximum(pools, 0.0)
    rest = np.maximum(spent_j - held.sum(axis=0), 0.0)
    # One pool empty: the other gives what it holds, then both fall by size.
    one_empty = pools - np.minimum(held, spent_j) - shares * rest
    total = pools.sum(axis=0)
    left = total - spent_j
    both = np.all(pools > 0.0, axis=0)
    kept = left / np.where(both, total, 1.0)
    return np.asarray(np.where(both, np.where(left > 0.0, pools * kept, shares * left), one_empty))


def recover_many(
    pools: Array,
    full_j: Array,
    tau_s: Array,
    deficit_w: Array,
    duration_s: Array,
    *,
    capped: bool,
) -> Array:
    """Pools (2, n) after a recovery; ``full_j`` and ``tau_s`` (2, n), the others (n,)."""
    debts = np.maximum(full_j - pools, 0.0)
    rates = 1.0 / tau_s
    time = np.array(duration_s, dtype=float)
    slow = (debts * rates).sum(axis=0) > deficit_w if capped else np.zeros(time.shape, dtype=bool)
    if np.any(slow):
        time[slow] = _own_time_many(debts[:, slow], rates[:, slow], deficit_w[slow], time[slow])
    return np.asarray(full_j - debts * np.exp(-time * rates))


def _own_time_many(debts: Array, rates: Array, deficit_w: Array, duration_s: Array) -> Array:
    slowed = _decay_time_many(debts * rates, rates, deficit_w)
    paid_s = (debts * -np.expm1(-slowed * rates)).sum(axis=0) / deficit_w
    time: Array = slowed + np.maximum(duration_s - paid_s, 0.0)
    still = paid_s > duration_s
    if np.any(still):
        goal = debts[:, still].sum(axis=0) - deficit_w[still] * duration_s[still]
        time[still] = _decay_time_many(debts[:, still], rates[:, still], goal)
    return time


def _decay_time_many(amounts: Array, rates: Array, goal: Array) -> Array:
    """Where Σ amount·e^(−rate·t) has fallen to ``goal`` (n,): Newton on the logarithm."""
    time: Array = np.log(amounts.sum(axis=0) / goal) / rates.max(axis=0)
    alone = np.log(np.maximum(amounts, goal) / goal) / rates
    time = np.maximum(time, alone.max(axis=0))
    for _ in range(60):
        parts = amounts * np.exp(-time * rates)
        whole = parts.sum(axis=0)
        step = np.log(whole / goal) * whole / (parts * rates).sum(axis=0)
        time += step
        if np.all(np.abs(step) <= 1e-9 * time):
            break
    return time
