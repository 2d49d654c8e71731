"""Position over 40 km: Jeukendrup & Martin 2001, Sports Med 31:559.

Printed, against elbows on the aero bars: brake hoods +5 to +7 min, drops +2 to +3, an optimised
position −2 to −2.5. The drag areas 0.358, 0.307, 0.269, 0.240 m² are from memory; the times were
computed with them: 80 kg, flat, calm, constants of Martin 1998.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from pacing.bike import DragArea

CDA_M2 = {"hoods": 0.358, "drops": 0.307, "aero": 0.269, "optimised": 0.240}
COMPUTED = {
    164.0: (71 * 60 + 35, {"hoods": 6.6, "drops": 3.0, "optimised": -2.5}),
    289.0: (58 * 60 + 13, {"hoods": 5.5, "drops": 2.5, "optimised": -2.1}),
    394.0: (52 * 60 + 8, {"hoods": 5.0, "drops": 2.2, "optimised": -1.9}),
}
PRINTED_MIN = {"hoods": (5.0, 7.0), "drops": (2.0, 3.0), "optimised": (-2.5, -2.0)}


@pytest.mark.parametrize("power_w", COMPUTED)
def test_forty_kilometres_change_with_position_as_published(
    martin_1998: dict[str, Any], steady_speed_m_s: Callable[..., float], power_w: float
) -> None:
    def seconds(cda_m2: float) -> float:
        road = {**martin_1998, "mass_kg": 80.0, "drag_area": DragArea((0.0,), (cda_m2,))}
        return 40_000.0 / steady_speed_m_s(power_w, gradient=0.0, **road)

    baseline_s, computed_min = COMPUTED[power_w]
    aero_s = seconds(CDA_M2["aero"])
    assert aero_s == pytest.approx(baseline_s, abs=0.5)
    for position, minutes in computed_min.items():
        change_min = (seconds(CDA_M2[position]) - aero_s) / 60.0
        assert change_min == pytest.approx(minutes, abs=0.06)
        low, high = PRINTED_MIN[position]
        assert low - 0.2 <= change_min <= high + 0.2
