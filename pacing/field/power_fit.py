"""Critical power and W′ from maximal efforts: which form, which efforts, how sure."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pacing.errors import UnusableInputError
from pacing.field.power_forms import (
    LONGEST_ASYMPTOTE_S,
    FormFit,
    power_against_inverse_time,
    three_parameter,
    time_against_power,
    work_against_time,
)
from pacing.field.power_result import Effort, PowerFit
from pacing.field.power_shares import PositionShare, fit_shares
from pacing.field.power_warnings import LONG_S, SHORT_S, off_curve, warnings_for

Array = NDArray[np.float64]

LEAST_S, MOST_S = 5.0, 6.0 * 3600.0
LEAST_W, MOST_W = 20.0, 3000.0
HIGHEST_PEAK_W = 2500.0
FORMS = ("two-parameter", "three-parameter")


def fit_power(
    times_s: ArrayLike,
    powers_w: ArrayLike,
    *,
    positions: Sequence[str] | None = None,
    form: str | None = None,
) -> PowerFit:
    """Critical power and W′ from maximal efforts.

    ``times_s`` and ``powers_w`` (n,), at least two durations; ``positions`` (n,) names the
    position of each. ``form`` is "two-parameter" or "three-parameter"; by default the second
    only where four efforts or more include one under two minutes. Efforts outside 2 to 30
    minutes are left out of the two-parameter fit while two others remain.

    Raises `UnusableInputError` for efforts out of range or that give no such curve.

    Source: simpson-2017, morton-1996, mattioni-2018 (the warnings).
    """
    duration, power = _checked_efforts(times_s, powers_w)
    names = _checked_positions(positions, duration.size)
    if form is not None and form not in FORMS:
        raise UnusableInputError(f"a form {form!r}", expected=" or ".join(FORMS))
    shares: tuple[PositionShare, ...] = ()
    share = np.ones(duration.size)
    spent = len(set(names)) - 1
    if spent:
        used = _used_in_positions(duration, names)
        shares, chosen = fit_shares(
            duration[used], power[used], tuple(np.array(names)[used].tolist())
        )
        by_name = {found.position: found.power_share for found in shares}
        share = np.array([by_name[name] for name in names])
        why = "all positions on one curve, each effort's power uncertain by an equal share"
    alike = power / share
    if not spent or form == "three-parameter":
        chosen, used, why = _choose(duration, alike, form)
        chosen = _less_freedom(chosen, spent)
    flagged = np.zeros(duration.size, dtype=bool)
    flagged[used] = off_curve(chosen, duration[used], alike[used])
    two = (power_against_inverse_time, work_against_time, time_against_power)
    fair = used & (duration >= SHORT_S)
    if np.unique(duration[fair]).size < 2:
        fair = used
    forms = [_less_freedom(of(duration[fair], alike[fair]), spent) for of in two]
    if chosen.name == "three-parameter":
        forms.append(chosen)
    errors: tuple[float | None, ...] = chosen.standard_errors or (None,) * 3
    peak = chosen.parameters[2] if len(chosen.parameters) == 3 else None
    fitted = chosen.power_w(duration) * share
    return PowerFit(
        critical_power_w=chosen.critical_power_w,
        critical_power_se_w=errors[0],
        w_prime_j=chosen.w_prime_j,
        w_prime_se_j=errors[1],
        peak_power_w=peak,
        peak_power_se_w=None if peak is None else errors[2],
        form="two-parameter" if peak is None else "three-parameter",
        why=why,
        chosen=chosen,
        forms=tuple(forms),
        efforts=tuple(
            Effort(
                duration_s=float(duration[i]),
                power_w=float(power[i]),
                residual_w=float(power[i] - fitted[i]),
                flagged=_why_flagged(float(duration[i]), bool(used[i]), bool(flagged[i])),
                used=bool(used[i]),
                position=names[i],
            )
            for i in range(duration.size)
        ),
        shares=shares,
        warnings=tuple(warnings_for(chosen, duration[used], alike[used], flagged[used])),
    )


def _used_in_positions(duration: Array, names: tuple[str, ...]) -> NDArray[np.bool_]:
    """Efforts of 2 to 30 minutes, or all where that would lose a position or too many."""
    used = (duration >= SHORT_S) & (duration <= LONG_S)
    kept = {name for name, use in zip(names, used.tolist(), strict=True) if use}
    if kept != set(names) or used.sum() < 2 + len(kept) - 1:
        return np.ones(duration.size, dtype=bool)
    return used


def _choose(
    duration: Array, power: Array, form: str | None
) -> tuple[FormFit, NDArray[np.bool_], str]:
    """The fit to use, the efforts it is made from, and why."""
    not_long = duration <= LONG_S
    if np.unique(duration[not_long]).size < 2:
        not_long = np.ones(duration.size, dtype=bool)
    short = bool(np.any(duration < SHORT_S))
    if form == "three-parameter" or (form is None and short and not_long.sum() >= 4):
        if np.unique(duration[not_long]).size < 3:
            raise UnusableInputError(
                f"{duration.size} efforts", expected="three durations for three parameters"
            )
        fit = three_parameter(duration[not_long], power[not_long])
        sound = 0.1 < fit.asymptote_s < 0.99 * LONGEST_ASYMPTOTE_S
        if form is not None or (sound and fit.parameters[2] <= HIGHEST_PEAK_W):
            why = (
                "asked for" if form is not None else "an effort under 2 minutes needs a peak power"
            )
            return fit, not_long, why
    used = not_long & (duration >= SHORT_S)
    if np.unique(duration[used]).size < 2:
        used = not_long
    why = (
        "power against 1/time, each effort's power uncertain by an equal share:"
        " efforts of set duration between 2 and 30 minutes"
    )
    return power_against_inverse_time(duration[used], power[used]), used, why


def _less_freedom(fit: FormFit, spent: int) -> FormFit:
    """``fit`` after ``spent`` further numbers (power shares) were taken from the same efforts."""
    if spent == 0 or fit.covariance is None:
        return fit
    free = fit.degrees_of_freedom - spent
    if free <= 0:
        return FormFit(fit.name, fit.parameters, None, 0, None)
    wider = fit.degrees_of_freedom / free
    scatter = None if fit.scatter is None else fit.scatter * wider**0.5
    return FormFit(fit.name, fit.parameters, fit.covariance * wider, free, scatter)


def _why_flagged(duration_s: float, used: bool, flagged: bool) -> str:
    if not used:
        return "left out: under 2 minutes" if duration_s < SHORT_S else "left out: over 30 minutes"
    return "off the curve" if flagged else ""


def _checked_efforts(times_s: ArrayLike, powers_w: ArrayLike) -> tuple[Array, Array]:
    duration = np.atleast_1d(np.asarray(times_s, dtype=float))
    power = np.atleast_1d(np.asarray(powers_w, dtype=float))
    if duration.shape != power.shape or duration.ndim != 1:
        raise UnusableInputError(
            f"{duration.size} durations and {power.size} powers", expected="one of each an effort"
        )
    for name, unit, values, low, high in (
        ("duration_s", "s", duration, LEAST_S, MOST_S),
        ("power_w", "W", power, LEAST_W, MOST_W),
    ):
        wrong = values[~((values >= low) & (values <= high))]
        if wrong.size:
            raise UnusableInputError(
                f"{wrong[0]:g} {unit}", key=name, expected=f"{low:g} to {high:g} {unit}"
            )
    if np.unique(duration).size < 2:
        raise UnusableInputError(
            f"{duration.size} effort{'s' if duration.size != 1 else ''} of one duration",
            expected="at least two durations, such as 3 and 12 minutes",
        )
    return duration, power


def _checked_positions(positions: Sequence[str] | None, efforts: int) -> tuple[str, ...]:
    names = ("",) * efforts if positions is None else tuple(positions)
    if len(names) != efforts:
        raise UnusableInputError(
            f"{len(names)} positions for {efforts} efforts", expected="one for each"
        )
    return names
