"""Constant speed on a climb: Bos et al. 2024, arXiv 2403.03363, without an optimiser.

With the mean over time fixed and no wind a climb is fastest at constant ground speed. The case:
5 km at 4 % then 5 km at 8 %, 80 kg, mean 289 W, constants of Martin 1998; values computed from
these inputs.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from scipy.optimize import brentq

from pacing.bike.resistance import road_power_w

MEAN_W, HALF_M = 289.0, 5_000.0


@pytest.fixture
def climb(martin_1998: dict[str, Any]) -> dict[str, Any]:
    return {"mass_kg": 80.0, **martin_1998}


def test_constant_power_takes_1939_seconds(
    climb: dict[str, Any], steady_speed_m_s: Callable[..., float]
) -> None:
    seconds = sum(HALF_M / steady_speed_m_s(MEAN_W, gradient=g, **climb) for g in (0.04, 0.08))
    assert seconds == pytest.approx(1939.08, abs=0.005)


def test_constant_speed_of_equal_mean_power_takes_1913_62_seconds(climb: dict[str, Any]) -> None:
    def powers_w(speed: float) -> list[float]:
        return [float(road_power_w(speed, gradient=g, **climb).total_w) for g in (0.04, 0.08)]

    speed = brentq(lambda v: sum(powers_w(v)) / 2.0 - MEAN_W, 1.0, 20.0)
    assert speed == pytest.approx(5.2257, abs=0.00005)
    assert powers_w(speed) == pytest.approx([205.4, 372.6], abs=0.05)
    assert 2.0 * HALF_M / speed == pytest.approx(1913.62, abs=0.05)
