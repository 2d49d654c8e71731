"""The default law's constants come from the committed fit."""

from __future__ import annotations

import math

import pytest

from pacing.rider import recovery_fit
from pacing.rider.budget import RECOVERY_LAWS, recovery_law
from pacing.rider.recovery_data import INTERMITTENT, MEASURED
from pacing.rider.recovery_two_phase import TwoPhase
from pacing.sources import SOURCES


def test_the_shipped_constants_are_the_fitted_ones() -> None:
    fitted = recovery_fit.fit_two_phase().constants
    assert fitted == pytest.approx(TwoPhase().constants, rel=1e-3)


def test_the_table_has_every_law_and_every_measurement() -> None:
    lines = recovery_fit.table().splitlines()
    assert all(name in lines[0] for name in RECOVERY_LAWS)
    assert len(lines) == 1 + 4 + 3


def test_a_law_without_recovery_is_exhausted_in_the_fourth_bout() -> None:
    # 21,100 J at 88 W last 239.8 s of work: three bouts of 60 s, then 59.8 s after three rests
    for bouts in INTERMITTENT:
        seconds = recovery_fit.seconds_to_exhaustion(recovery_law("none"), bouts)
        assert seconds == pytest.approx(3 * 90.0 + 59.77, abs=0.01)


def test_a_law_that_recovers_all_is_never_exhausted() -> None:
    assert (
        recovery_fit.seconds_to_exhaustion(recovery_law("bartram-2018"), INTERMITTENT[2])
        == math.inf
    )


def test_every_measurement_names_a_source_in_the_list() -> None:
    assert {row.source for row in (*MEASURED, *INTERMITTENT)} <= set(SOURCES)
