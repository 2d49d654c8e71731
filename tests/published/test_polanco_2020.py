"""Lower aero bars: Polanco et al. 2020, Appl Sci 10:6546: CdA −10.7 ± 3.1 %, power −9.5 ± 5.4 %."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from pacing.bike import DragArea

CDA_SHARE, POWER_SHARE = 1.0 - 0.107, 1.0 - 0.095


@pytest.mark.parametrize(
    ("gradient", "low", "high"), [(0.0, -0.01, 0.02), (0.05, -0.12, -0.02)], ids=["flat", "climb"]
)
def test_lower_bars_are_nearly_a_draw_on_the_flat_and_lose_on_a_climb(
    martin_1998: dict[str, Any],
    steady_speed_m_s: Callable[..., float],
    gradient: float,
    low: float,
    high: float,
) -> None:
    road = {**martin_1998, "mass_kg": 80.0, "gradient": gradient}
    higher = steady_speed_m_s(289.0, **road)
    road["drag_area"] = DragArea((0.0,), (0.2565 * CDA_SHARE,))
    lower = steady_speed_m_s(289.0 * POWER_SHARE, **road)
    assert low < lower / higher - 1.0 < high
