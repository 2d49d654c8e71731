"""The integral form of W′ left, as first published: kept to check its printed results."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from pacing.rider.time_constants import SKIBA_2012

Array = NDArray[np.float64]


def integral_balance_j(
    power_w: Array, *, step_s: float, critical_power_w: float, w_prime_j: float
) -> Array:
    """W′ left at the end of each step of ``power_w`` (n,), W′ − ∫ spent · e^(−(t − u)/τ) du.

    Recovery goes on while spending, and τ is one number for the whole ride, from D = CP less
    the mean of all power below CP. Without power below CP nothing is recovered.

    Source: skiba-2012.
    """
    power = np.asarray(power_w, dtype=float)
    easy = power[power < critical_power_w]
    tau_s = math.inf
    if easy.size:
        tau_s = SKIBA_2012.tau_s(critical_power_w - float(easy.mean()))
    decay = math.exp(-step_s / tau_s)
    gain_s = step_s if math.isinf(tau_s) else -tau_s * math.expm1(-step_s / tau_s)
    debts, debt = [], 0.0
    for excess_w in np.maximum(power - critical_power_w, 0.0).tolist():
        debt = debt * decay + excess_w * gain_s
        debts.append(debt)
    return np.asarray(w_prime_j - np.array(debts))
