"""One weather, or several by the hour."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from pacing.air import Day, Weather
from pacing.errors import UnusableInputError

NINE, ELEVEN = 9 * 3600.0, 11 * 3600.0
MORNING = Weather(
    temperature_k=288.15,
    pressure_pa=101_325.0,
    wind_speed_m_s=4.0,
    wind_from_deg=0.0,
    relative_humidity=0.0,
    wind_height_m=1.0,
    clock_s=NINE,
)
NOON = replace(MORNING, temperature_k=298.15, wind_from_deg=90.0, clock_s=ELEVEN)


def test_with_one_weather_the_clock_makes_no_difference() -> None:
    day = Day((MORNING,))
    assert day.density_kg_m3(100.0, 0.0) == day.density_kg_m3(100.0, 80_000.0)
    assert day.wind_at_rider(0.0, 1.0, 0.0) == day.wind_at_rider(0.0, 1.0, 5.0)


def test_wind_is_interpolated_as_components_and_held_outside_the_hours() -> None:
    day = Day((MORNING, NOON))
    clocks = np.array([0.0, NINE, 10 * 3600.0, ELEVEN, 90_000.0])
    wind = day.wind_at_rider(np.zeros(5), np.ones(5), clocks)
    assert wind.along_m_s == pytest.approx([4.0, 4.0, 2.0, 0.0, 0.0], abs=1e-12)
    assert wind.across_m_s == pytest.approx([0.0, 0.0, 2.0, 4.0, 4.0], abs=1e-12)


def test_density_between_two_hours_lies_between_theirs() -> None:
    day = Day((MORNING, NOON))
    nine, ten, eleven = day.density_kg_m3(0.0, np.array([NINE, 10 * 3600.0, ELEVEN]))
    assert eleven < ten < nine


def test_the_sheltered_share_of_the_wind_is_not_felt() -> None:
    wind = Day((MORNING,)).wind_at_rider(np.zeros(3), np.array([1.0, 0.5, 0.0]))
    assert wind.along_m_s == pytest.approx([4.0, 2.0, 0.0])


def test_station_and_sea_level_pressure_of_one_column_give_the_same_air() -> None:
    by_sea_level = replace(MORNING, temperature_height_m=640.0)
    # The station's own pressure, from the barometric formula worked out here.
    at_sea, at_station = 288.15 + 0.0065 * 640.0, 288.15
    station_pa = 101_325.0 * (at_station / at_sea) ** (9.80665 / (0.0065 * 287.05287))
    by_station = replace(by_sea_level, pressure_pa=station_pa, pressure_height_m=640.0)
    heights = np.array([0.0, 640.0, 1900.0])
    assert Day((by_station,)).density_kg_m3(heights) == pytest.approx(
        Day((by_sea_level,)).density_kg_m3(heights), rel=1e-12
    )


def test_air_thins_by_about_a_tenth_in_the_first_kilometre() -> None:
    # ISO 2533: 1.11164/1.22500
    sea, high = Day((MORNING,)).density_kg_m3(np.array([0.0, 1000.0]))
    assert high / sea == pytest.approx(1.11164 / 1.22500, rel=2e-4)


def test_hours_that_do_not_rise_are_refused() -> None:
    with pytest.raises(UnusableInputError, match="hours out of order"):
        Day((NOON, MORNING))
    with pytest.raises(UnusableInputError, match="no weather"):
        Day(())
