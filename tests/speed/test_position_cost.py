"""Choosing positions costs at most three times a plan with one."""

from __future__ import annotations

from collections.abc import Callable
from time import process_time
from typing import Any

import numpy as np

from pacing.plan import plan_race

AT_M = 10.0 * np.arange(1600)
ROLLING = 0.045 * np.sin(2.0 * np.pi * AT_M / 3100.0) + 0.02 * np.sin(2.0 * np.pi * AT_M / 1100.0)


def test_a_plan_with_two_positions_takes_at_most_three_times_as_long(
    make_race: Callable[..., Any],
) -> None:
    low = {"name": "bars", "cda_m2": 0.235}
    high = {"name": "upright", "cda_m2": 0.32, "power_share": 1.04}
    took = []
    for positions in ([low], [low], [low, high]):  # the first time also loads what it needs
        race = make_race(ROLLING, rider__positions=positions)
        began = process_time()
        plan_race(race)
        took.append(process_time() - began)
    assert took[2] < 3.0 * took[1]
