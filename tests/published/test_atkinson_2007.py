"""Varying power on hills and in wind: Atkinson, Peacock & Passfield 2007, J Sports Sci 25:1001.

80 kg, 289 W, power 10 % up against the hill or the wind and 10 % down with it. Steady speeds,
section by section. The printed savings (126 s, 51 s) hold mean power over distance, so they are
no equal-power gains; the others here do hold the mean over time, computed, not printed.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from scipy.optimize import brentq

POWER_W = 289.0
# section length over the whole course, keywords hard way, keywords easy way
HILLS = (5_000.0, {"gradient": 0.10}, {"gradient": -0.10})
WIND = (
    20_000.0,
    {"gradient": 0.0, "wind_along_m_s": 4.4},
    {"gradient": 0.0, "wind_along_m_s": -4.4},
)


@pytest.fixture
def times_s(
    martin_1998: dict[str, Any], steady_speed_m_s: Callable[..., float]
) -> Callable[..., tuple[float, float]]:
    """Seconds for the hard and for the easy half at two powers."""

    def times(
        course: tuple[float, dict, dict], hard_w: float, easy_w: float
    ) -> tuple[float, float]:
        half_m, hard, easy = course
        road = {"mass_kg": 80.0, **martin_1998}
        return (
            half_m / steady_speed_m_s(hard_w, **road, **hard),
            half_m / steady_speed_m_s(easy_w, **road, **easy),
        )

    return times


@pytest.mark.parametrize(
    ("course", "constant_s", "saved_s", "printed_s"),
    [(HILLS, 1677.0, 125.6, 126.0), (WIND, 3592.0, 50.2, 51.0)],
    ids=["hills", "wind"],
)
def test_ten_percent_up_and_down_saves_as_printed(
    times_s: Callable[..., tuple[float, float]],
    course: tuple[float, dict, dict],
    constant_s: float,
    saved_s: float,
    printed_s: float,
) -> None:
    constant = sum(times_s(course, POWER_W, POWER_W))
    saved = constant - sum(times_s(course, 1.1 * POWER_W, 0.9 * POWER_W))
    assert constant == pytest.approx(constant_s, abs=0.5)
    assert saved == pytest.approx(saved_s, abs=0.05)
    assert saved == pytest.approx(printed_s, abs=2.0)


@pytest.mark.parametrize(
    ("course", "saved_s"), [(HILLS, 117.9), (WIND, 27.5)], ids=["hills", "wind"]
)
def test_at_equal_mean_power_over_time_less_is_saved(
    times_s: Callable[..., tuple[float, float]],
    course: tuple[float, dict, dict],
    saved_s: float,
) -> None:
    hard_w = 1.1 * POWER_W

    def mean_less_w(easy_w: float) -> float:
        hard_s, easy_s = times_s(course, hard_w, easy_w)
        return (hard_w * hard_s + easy_w * easy_s) / (hard_s + easy_s) - POWER_W

    easy_w = brentq(mean_less_w, 60.0, POWER_W)
    saved = sum(times_s(course, POWER_W, POWER_W)) - sum(times_s(course, hard_w, easy_w))
    assert saved == pytest.approx(saved_s, abs=0.05)
