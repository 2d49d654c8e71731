"""What a physiologist would say of a set of efforts before trusting what they give."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from pacing.field.power_forms import FormFit

Array = NDArray[np.float64]

LONG_ENOUGH_S = 600.0
SHORT_S = 120.0
"""Below this the two-parameter curve asks for more power than there is (common practice)."""
LONG_S = 1800.0
"""Beyond this what is held falls below critical power (Source: puchowicz-2020)."""
NARROW_RATIO = 2.0
REPEATABLE = 0.02
"""Relative standard deviation of a good effort's power (a rider's time repeats to 1.1-1.5 %,
Tan & Aziz 2005, Clark 2014)."""
MOST_APART_DAYS = 60
OFF_CURVE = 3.0


def off_curve(fit: FormFit, duration_s: Array, power_w: Array) -> NDArray[np.bool_]:
    """The effort, if any, that lies off the curve of the others, (n,).

    Judged where two efforts more than the fit has numbers are there: the largest miss, scaled by
    the effort's own pull on the curve, beyond three times what a good effort repeats to.
    """
    flagged = np.zeros(duration_s.size, dtype=bool)
    if duration_s.size < len(fit.parameters) + 2:
        return flagged
    fitted = fit.power_w(duration_s)
    design = fit.slopes(duration_s) / fitted[:, None]
    design = design / np.linalg.norm(design, axis=0)
    pull = np.einsum("ij,jk,ik->i", design, np.linalg.pinv(design.T @ design), design)
    misses = (power_w / fitted - 1.0) / np.sqrt(np.maximum(1.0 - pull, 1e-3))
    worst = int(np.argmax(np.abs(misses)))
    flagged[worst] = abs(misses[worst]) > OFF_CURVE * REPEATABLE
    return flagged


def warnings_for(
    fit: FormFit, duration_s: Array, power_w: Array, flagged: NDArray[np.bool_]
) -> list[str]:
    """Sentences about the efforts a fit was made from; empty if there is nothing to say."""
    said: list[str] = []
    if duration_s.size < 3:
        said.append(
            "Fewer than three efforts: they lie on a curve by themselves, so nothing can be said"
            " of the error. Ride a third."
        )
    elif fit.degrees_of_freedom == 1:
        said.append(
            "One effort more than the fit has numbers: the errors themselves are little more than"
            " a guess."
        )
    if duration_s.max() < LONG_ENOUGH_S:
        said.append(
            "All efforts are shorter than 10 minutes, which overestimates critical power"
            " (Mattioni Maturana et al. 2018). Add one of 12 to 20 minutes."
        )
    if duration_s.max() < NARROW_RATIO * duration_s.min():
        said.append(
            f"The longest effort is only {duration_s.max() / duration_s.min():.1f} times the"
            " shortest: W′ is poorly known. Add one of about 3 minutes and one of 12 to 20."
        )
    if duration_s.min() < SHORT_S and len(fit.parameters) == 2:
        said.append(
            f"An effort of {duration_s.min():.0f} s is too short for the two-parameter form: it"
            " makes W′ too small and critical power too high."
        )
    if duration_s.max() > LONG_S:
        said.append(
            "An effort of more than 30 minutes lies in the decline that a plan takes off by"
            " itself: it would be counted twice."
        )
    said += _of_the_curve(fit, duration_s, power_w, flagged)
    return said


def _of_the_curve(
    fit: FormFit, duration_s: Array, power_w: Array, flagged: NDArray[np.bool_]
) -> list[str]:
    said = [
        f"The effort of {duration:.0f} s at {power:.0f} W lies off the curve of the others: was it"
        " maximal, evenly ridden, in the same position and with the same meter?"
        for duration, power in zip(duration_s[flagged], power_w[flagged], strict=True)
    ]
    order = np.argsort(duration_s)
    if any(later > sooner for sooner, later in pairwise(power_w[order].tolist())):
        said.append("A longer effort has more power than a shorter one: one was not maximal.")
    longest_w = float(power_w[order[-1]])
    if fit.critical_power_w >= longest_w:
        said.append(
            f"Critical power comes out at {fit.critical_power_w:.0f} W, above the longest effort's"
            f" {longest_w:.0f} W, which cannot be."
        )
    errors = fit.standard_errors
    if errors is not None and errors[0] > 0.05 * fit.critical_power_w:
        said.append(
            f"Critical power is only known to ± {100 * errors[0] / fit.critical_power_w:.0f} %"
            " (one standard error): repeat the efforts."
        )
    if not 5_000.0 <= fit.w_prime_j <= 40_000.0:
        said.append(
            f"W′ of {fit.w_prime_j / 1000.0:.1f} kJ is outside 5 to 40 kJ, where riders lie"
            " (common practice): look for an effort that was not maximal."
        )
    return said
