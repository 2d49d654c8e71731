"""ISO 2533 standard atmosphere: printed densities, 0.01 %."""

from __future__ import annotations

import pytest

from pacing.air.density import DRY_AIR_J_PER_KG_K, lapsed_pressure_pa, lapsed_temperature_k

PRINTED_KG_M3 = {
    0: 1.22500,
    500: 1.16727,
    1000: 1.11164,
    1500: 1.05807,
    2000: 1.00649,
    3000: 0.90912,
}


@pytest.mark.parametrize("height_m", PRINTED_KG_M3)
def test_the_standard_column_has_the_printed_density(height_m: int) -> None:
    temperature = lapsed_temperature_k(height_m, temperature_k=288.15, at_height_m=0.0)
    pressure = lapsed_pressure_pa(
        height_m,
        pressure_pa=101_325.0,
        at_height_m=0.0,
        temperature_k=288.15,
        temperature_at_height_m=0.0,
    )
    density = pressure / (DRY_AIR_J_PER_KG_K * temperature)
    assert density == pytest.approx(PRINTED_KG_M3[height_m], rel=1e-4)
