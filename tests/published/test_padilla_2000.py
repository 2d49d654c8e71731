"""The hour record of 53,040 m: Padilla et al. 2000, J Appl Physiol 89:1522."""

from __future__ import annotations

import pytest

from pacing.bike import DragArea
from pacing.bike.resistance import road_power_w

ESTIMATED_W = 509.5


@pytest.mark.parametrize(("density_kg_m3", "computed_w"), [(1.18, 504.7), (1.20, 512.7)])
def test_the_hour_takes_the_estimated_power(density_kg_m3: float, computed_w: float) -> None:
    # CdA is the source's; total mass 89 kg, Crr 0.0025 and efficiency 0.976 are assumed.
    power = road_power_w(
        53_040.0 / 3600.0,
        mass_kg=89.0,
        gradient=0.0,
        density_kg_m3=density_kg_m3,
        drag_area=DragArea((0.0,), (0.244,)),
        crr=0.0025,
        efficiency=0.976,
        gravity_m_s2=9.81,
    ).total_w
    assert power == pytest.approx(computed_w, abs=0.05)
    assert power == pytest.approx(ESTIMATED_W, rel=0.05)
