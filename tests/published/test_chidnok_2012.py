"""Intermittent work to exhaustion: Chidnok et al. 2012, Med Sci Sports Exerc 44:966.

60 s at 329 W and 30 s at 173, 95 or 20 W in turn; CP 241 W, W′ 21.1 kJ.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest

from pacing.rider.budget import DEFAULT_LAW, recovery_law
from pacing.rider.power_time import two_parameter_duration_s
from pacing.rider.recovery_data import INTERMITTENT
from pacing.rider.recovery_fit import seconds_to_exhaustion
from pacing.rider.recovery_integral import integral_balance_j


def test_steady_work_at_329_w_lasts_239_8_seconds() -> None:
    # As used by Weigend et al. 2022 (second hand)
    duration = two_parameter_duration_s(329.0, critical_power_w=241.0, w_prime_j=21_100.0)
    assert duration == pytest.approx(239.8, abs=0.05)


@pytest.mark.parametrize("bouts", INTERMITTENT, ids=lambda bouts: f"{bouts.recovery_w:.0f}W")
def test_the_default_law_is_exhausted_within_15_percent_of_the_measured_time(bouts) -> None:
    seconds = seconds_to_exhaustion(recovery_law(DEFAULT_LAW), bouts)
    assert seconds == pytest.approx(bouts.exhausted_s, rel=0.15)


def test_the_default_law_keeps_the_order_of_the_measured_times() -> None:
    times = [seconds_to_exhaustion(recovery_law(DEFAULT_LAW), bouts) for bouts in INTERMITTENT]
    assert all(a < b for a, b in pairwise(times))


@pytest.mark.parametrize(
    ("recovery_w", "computed_s"), [(173.0, 506.0), (95.0, 678.3), (20.0, 954.5)]
)
def test_the_integral_form_of_2012_gives_its_computed_times(
    recovery_w: float, computed_s: float
) -> None:
    # Skiba et al. 2012 with group means, D from the recovery power, steps of 0.1 s; ± 0.2 s
    one_round = np.concatenate([np.full(600, 329.0), np.full(300, recovery_w)])
    left = integral_balance_j(
        np.tile(one_round, 15), step_s=0.1, critical_power_w=241.0, w_prime_j=21_100.0
    )
    assert 0.1 * (np.argmax(left <= 0.0) + 1) == pytest.approx(computed_s, abs=0.2)
