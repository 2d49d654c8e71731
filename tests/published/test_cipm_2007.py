"""Moist-air density: Picard et al. 2008, Metrologia 45:149 (CIPM-2007).

The values were computed from the published constants; CoolProp's mixture model of humid air
(Herrmann, Kretzschmar and Gatley) is an independent second witness.
"""

from __future__ import annotations

import math

import pytest

from pacing.air.density import moist_air_density_kg_m3

# Pa, °C, relative humidity, kg/m³
CASES = [
    (101_325.0, 20.0, 0.50, 1.19931),
    (101_325.0, 15.0, 0.00, 1.22552),
    (101_325.0, 30.0, 0.60, 1.15368),
    (100_000.0, 25.0, 0.50, 1.16182),
    (95_000.0, 10.0, 0.80, 1.16478),
]


@pytest.mark.parametrize(("pressure_pa", "celsius", "humidity", "printed"), CASES)
def test_moist_air_has_the_density_of_the_published_constants(
    pressure_pa: float, celsius: float, humidity: float, printed: float
) -> None:
    density = moist_air_density_kg_m3(
        temperature_k=celsius + 273.15, pressure_pa=pressure_pa, relative_humidity=humidity
    )
    assert density == pytest.approx(printed, abs=0.5e-5)


@pytest.mark.parametrize(("pressure_pa", "celsius", "humidity"), [case[:3] for case in CASES])
def test_an_ideal_mixture_of_two_gases_agrees_within_6_in_10000(
    pressure_pa: float, celsius: float, humidity: float
) -> None:
    # Vapour pressure by Magnus (WMO Guide No. 8): 6.112 hPa · exp(17.62 t/(243.12 + t)).
    vapour_pa = humidity * 611.2 * math.exp(17.62 * celsius / (243.12 + celsius))
    ideal = ((pressure_pa - vapour_pa) / 287.05 + vapour_pa / 461.5) / (celsius + 273.15)
    density = moist_air_density_kg_m3(
        temperature_k=celsius + 273.15, pressure_pa=pressure_pa, relative_humidity=humidity
    )
    assert density == pytest.approx(ideal, rel=6e-4)


@pytest.mark.parametrize(
    ("pressure_pa", "celsius", "humidity"),
    [*(case[:3] for case in CASES), (78_000.0, -5.0, 0.3), (103_500.0, 38.0, 0.9)],
)
def test_an_independent_property_library_agrees_within_3_in_10000(
    pressure_pa: float, celsius: float, humidity: float
) -> None:
    humid_air = pytest.importorskip("CoolProp.HumidAirProp", reason="CoolProp is not installed")
    kelvin = celsius + 273.15
    state = ("T", kelvin, "P", pressure_pa, "R", humidity)
    # Vha is volume per kg of dry air and W water per kg of dry air.
    density = (1.0 + humid_air.HAPropsSI("W", *state)) / humid_air.HAPropsSI("Vda", *state)
    ours = moist_air_density_kg_m3(
        temperature_k=kelvin, pressure_pa=pressure_pa, relative_humidity=humidity
    )
    assert ours == pytest.approx(density, rel=3e-4)
