"""Density and its change with height."""

from __future__ import annotations

import numpy as np
import pytest

from pacing.air.density import (
    lapsed_pressure_pa,
    lapsed_temperature_k,
    moist_air_density_kg_m3,
)


def test_temperature_falls_6_5_kelvin_a_kilometre_from_where_it_was_measured() -> None:
    # Source: ISO 2533
    assert lapsed_temperature_k(1500.0, temperature_k=290.0, at_height_m=500.0) == pytest.approx(
        283.5
    )


def test_pressure_is_unchanged_at_the_height_it_was_measured_at() -> None:
    pressure = lapsed_pressure_pa(
        740.0,
        pressure_pa=93_000.0,
        at_height_m=740.0,
        temperature_k=301.0,
        temperature_at_height_m=20.0,
    )
    assert pressure == pytest.approx(93_000.0, rel=1e-14)


def test_pressure_balances_the_weight_of_the_column() -> None:
    # Hydrostatics: dp/dh = −ρ g with ρ = p/(R T), whatever the column's temperature.
    height, step = 1200.0, 0.5
    column = {
        "pressure_pa": 100_400.0,
        "at_height_m": 150.0,
        "temperature_k": 303.0,
        "temperature_at_height_m": 90.0,
    }
    above, below = (
        float(lapsed_pressure_pa(height + sign * step, **column)) for sign in (1.0, -1.0)
    )
    temperature = float(lapsed_temperature_k(height, temperature_k=303.0, at_height_m=90.0))
    density = float(lapsed_pressure_pa(height, **column)) / (287.05287 * temperature)
    assert (below - above) / (2 * step) == pytest.approx(9.80665 * density, rel=1e-6)


def test_a_warm_column_loses_pressure_more_slowly_than_a_cold_one() -> None:
    warm, cold = (
        lapsed_pressure_pa(
            2000.0,
            pressure_pa=101_325.0,
            at_height_m=0.0,
            temperature_k=kelvin,
            temperature_at_height_m=0.0,
        )
        for kelvin in (305.0, 265.0)
    )
    assert warm > cold + 1500.0


def test_damp_air_is_lighter_than_dry_air() -> None:
    dry, damp = moist_air_density_kg_m3(
        temperature_k=303.15, pressure_pa=101_325.0, relative_humidity=np.array([0.0, 1.0])
    )
    assert 0.01 < 1.0 - damp / dry < 0.02
