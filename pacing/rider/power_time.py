"""How much power for how long, and what lowers it in long or high races."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.errors import UnusableInputError

Array = NDArray[np.float64]
Floats = float | Array

DECLINE_AFTER_S = 1800.0
"""Critical power is planned unchanged up to here (Source: puchowicz-2020)."""


def two_parameter_power_w(
    duration_s: Floats, *, critical_power_w: Floats, w_prime_j: Floats
) -> Array:
    """Highest power held for ``duration_s``, P = W′/t + CP. Source: simpson-2017."""
    return np.asarray(w_prime_j / np.asarray(duration_s, dtype=float) + critical_power_w)


def two_parameter_work_j(
    duration_s: Floats, *, critical_power_w: Floats, w_prime_j: Floats
) -> Array:
    """Most work done in ``duration_s``, W = CP t + W′. Source: simpson-2017."""
    return np.asarray(critical_power_w * np.asarray(duration_s, dtype=float) + w_prime_j)


def two_parameter_duration_s(
    power_w: Floats, *, critical_power_w: Floats, w_prime_j: Floats
) -> Array:
    """How long ``power_w`` is held, t = W′/(P − CP); infinite at CP and below.

    Source: simpson-2017.
    """
    return _over_excess(np.asarray(power_w, dtype=float) - critical_power_w, w_prime_j)


def three_parameter_power_w(
    duration_s: Floats, *, critical_power_w: Floats, w_prime_j: Floats, peak_power_w: Floats
) -> Array:
    """Highest power held for ``duration_s`` (0 allowed): `three_parameter_duration_s` inverted.

    Source: morton-1996.
    """
    asymptote_s = w_prime_j / (np.asarray(peak_power_w, dtype=float) - critical_power_w)
    return np.asarray(w_prime_j / (duration_s + asymptote_s) + critical_power_w)


def three_parameter_duration_s(
    power_w: Floats, *, critical_power_w: Floats, w_prime_j: Floats, peak_power_w: Floats
) -> Array:
    """How long ``power_w`` is held, t = W′/(P − CP) − W′/(Pmax − CP); infinite at CP and below.

    Negative above Pmax. Source: morton-1996.
    """
    excess = np.asarray(power_w, dtype=float) - critical_power_w
    asymptote_s = w_prime_j / (np.asarray(peak_power_w, dtype=float) - critical_power_w)
    return np.asarray(_over_excess(excess, w_prime_j) - asymptote_s)


def power_limit_now_w(
    w_left_j: Floats, *, critical_power_w: Floats, w_prime_j: Floats, peak_power_w: Floats
) -> Array:
    """Most power possible with ``w_left_j`` of W′ left, CP + (Pmax − CP) W/W′.

    Only with CP and W′ from the three-parameter fit. Source: morton-1996.
    """
    share = np.asarray(w_left_j, dtype=float) / w_prime_j
    return np.asarray(critical_power_w + (peak_power_w - np.asarray(critical_power_w)) * share)


def omni_domain_power_w(
    duration_s: Floats,
    *,
    critical_power_w: Floats,
    w_prime_j: Floats,
    peak_power_w: Floats,
    long_decline_w: Floats = 0.0,
) -> Array:
    """Highest power held for ``duration_s``, from a sprint to hours.

    (W′/t)(1 − exp(−t (Pmax − CP)/W′)) + CP, less A ln(t/1800 s) beyond half an hour.

    Source: puchowicz-2020.
    """
    duration = np.asarray(duration_s, dtype=float)
    bend = -np.expm1(-duration * (np.asarray(peak_power_w) - critical_power_w) / w_prime_j)
    declined = declined_critical_power_w(
        duration, critical_power_w=critical_power_w, long_decline_w=long_decline_w
    )
    return np.asarray(w_prime_j / duration * bend + declined)


def declined_critical_power_w(
    duration_s: Floats, *, critical_power_w: Floats, long_decline_w: Floats
) -> Array:
    """Critical power to plan with in a race of ``duration_s``: CP − A ln(T/1800 s) beyond that.

    Source: puchowicz-2020 (the form), clark-2018 and clark-2019 (the size of A).
    """
    beyond = np.log(np.maximum(np.asarray(duration_s, dtype=float), DECLINE_AFTER_S))
    return np.asarray(critical_power_w - long_decline_w * (beyond - math.log(DECLINE_AFTER_S)))


def highest_power_w(
    duration_s: Floats,
    *,
    critical_power_w: float,
    w_prime_j: float,
    fit_form: str = "two-parameter",
    peak_power_w: float | None = None,
    long_decline_w: float = 0.0,
) -> Array:
    """Highest power this rider holds for ``duration_s``, in the form their test was fitted in.

    With ``fit_form`` "three-parameter" the peak belongs to the curve, otherwise it is a flat
    cap. Raises `UnusableInputError` for the three-parameter form without a peak.

    Source: simpson-2017, morton-1996, puchowicz-2020 (the decline).
    """
    declined = declined_critical_power_w(
        duration_s, critical_power_w=critical_power_w, long_decline_w=long_decline_w
    )
    if fit_form == "three-parameter":
        if peak_power_w is None:
            raise UnusableInputError(
                "no peak power", expected="one, for it is part of a three-parameter fit"
            )
        asymptote_s = w_prime_j / (peak_power_w - critical_power_w)
        return np.asarray(declined + w_prime_j / (np.asarray(duration_s) + asymptote_s))
    power = declined + w_prime_j / np.asarray(duration_s, dtype=float)
    return power if peak_power_w is None else np.minimum(power, peak_power_w)


class Durability(NamedTuple):
    """What is left of critical power and of W′ (1 when rested)."""

    critical_power: Array
    w_prime: Array


DURABILITY_CRITICAL_POWER = 0.907
DURABILITY_W_PRIME = 0.81
"""Left after 2 h just below critical power: the mean of clark-2018 and clark-2019."""
DURABILITY_WORK_S = 7200.0


def durability_factors(work_j: Floats, *, critical_power_w: Floats) -> Durability:
    """What is left of CP and W′ after ``work_j`` done in all, the rested CP given.

    Falls in a straight line through what was measured after 2 h (work of CP · 7200 s), held
    beyond twice that. An alternative to the decline by duration, never to be used with it.

    Source: clark-2018, clark-2019.
    """
    done = np.asarray(work_j, dtype=float) / (np.asarray(critical_power_w) * DURABILITY_WORK_S)
    done = np.clip(done, 0.0, 2.0)
    return Durability(
        1.0 - (1.0 - DURABILITY_CRITICAL_POWER) * done, 1.0 - (1.0 - DURABILITY_W_PRIME) * done
    )


def altitude_factor(height_m: Floats, *, acclimatised: bool) -> Array:
    """Aerobic power at ``height_m`` over that at sea level (published to about 4 km).

    The acclimatised polynomial gives 99.9 % at sea level and is divided by that; the other is
    quoted from memory. Below sea level 1.

    Source: bassett-1999.
    """
    x = np.maximum(np.asarray(height_m, dtype=float), 0.0) / 1000.0
    if acclimatised:
        return np.asarray((-1.12 * x**2 - 1.90 * x + 99.9) / 99.9)
    return np.asarray((0.178 * x**3 - 1.43 * x**2 - 4.07 * x + 100.0) / 100.0)


def _over_excess(excess_w: Array, w_prime_j: Floats) -> Array:
    above = excess_w > 0.0
    return np.asarray(np.where(above, w_prime_j / np.where(above, excess_w, 1.0), np.inf))
