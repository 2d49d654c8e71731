"""From a file of efforts, or a ride, to a fit of critical power."""

from __future__ import annotations

from pathlib import Path
from typing import NamedTuple

from pacing.errors import UnusableInputError
from pacing.field.efforts import read_efforts
from pacing.field.highest_mean import HighestMean, highest_mean_power, is_recording, read_power
from pacing.field.power_fit import fit_power
from pacing.field.power_result import PowerFit
from pacing.field.power_warnings import MOST_APART_DAYS

FITTED_S = (180.0, 300.0, 480.0, 720.0, 1200.0)
"""Highest means of a ride that a fit is tried with."""


class PowerTest(NamedTuple):
    """A fit, the highest means it came from if it was a ride, and warnings beside the fit's."""

    fit: PowerFit | None
    means: HighestMean | None
    warnings: tuple[str, ...]


def evaluate(file: Path, *, form: str | None = None) -> PowerTest:
    """Fit critical power to a table of efforts or, with a warning, to the best of a ride.

    Raises `UnusableInputError` for a file that is neither, or efforts that give no curve.
    """
    if is_recording(file):
        return _of_a_ride(file, form)
    efforts = read_efforts(file)
    days = sorted(day for day in efforts.date if day is not None)
    warnings: tuple[str, ...] = ()
    if days and (days[-1] - days[0]).days > MOST_APART_DAYS:
        warnings = (
            f"The efforts lie {(days[-1] - days[0]).days} days apart; form changes in less.",
        )
    try:
        fit = fit_power(
            efforts.duration_s,
            efforts.power_w,
            positions=efforts.position if any(efforts.position) else None,
            form=form,
        )
    except UnusableInputError as problem:
        raise _in_file(problem, file) from None
    return PowerTest(fit, None, warnings)


def _of_a_ride(file: Path, form: str | None) -> PowerTest:
    means = highest_mean_power(*read_power(file))
    wanted = [i for i, d in enumerate(means.duration_s.tolist()) if d in FITTED_S]
    warning = (
        "Highest means of a ride are not efforts to exhaustion: what comes out is at most a lower"
        " bound. Test before you race on it.",
    )
    try:
        fit = fit_power(means.duration_s[wanted], means.power_w[wanted], form=form)
    except UnusableInputError as problem:
        return PowerTest(None, means, (*warning, f"No critical power from this ride: {problem}"))
    return PowerTest(fit, means, warning)


def _in_file(problem: UnusableInputError, file: Path) -> UnusableInputError:
    return UnusableInputError(
        problem.found,
        file=file,
        line=problem.line,
        key=problem.key,
        expected=problem.expected,
        mend=problem.mend,
    )
