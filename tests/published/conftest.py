"""Road power with published constants, and the steady speed that a power gives."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from scipy.optimize import brentq

from pacing.bike import DragArea
from pacing.bike.resistance import road_power_w

# Source: Martin et al. 1998, J Appl Biomech 14(3):276-291 (read at second hand)
MARTIN_1998: dict[str, Any] = {
    "wheel_rotation_m2": 0.0044,
    "bearing_n": 0.091,
    "bearing_n_per_m_s": 0.0087,
    "crr": 0.0032,
    "efficiency": 0.976,
    "gravity_m_s2": 9.81,
    "density_kg_m3": 1.2234,
    "drag_area": DragArea((0.0,), (0.2565,)),
}


@pytest.fixture
def martin_1998() -> dict[str, Any]:
    """The constants of Martin et al. 1998, as keywords of `road_power_w`."""
    return dict(MARTIN_1998)


@pytest.fixture
def steady_speed_m_s() -> Callable[..., float]:
    """Speed without acceleration at a power, by bracketing `road_power_w`."""

    def steady(power_w: float, **road: Any) -> float:
        return float(
            brentq(
                lambda v: float(road_power_w(v, **road).total_w) - power_w, 0.1, 45.0, xtol=1e-12
            )
        )

    return steady
