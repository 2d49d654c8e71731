"""Scaling, sign and mirror laws of the forces along the road and of the air."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pacing.air import Day, Weather
from pacing.bike import DragArea
from pacing.bike.resistance import air_force_n, air_force_n_and_slope, road_power_w

BY_YAW = DragArea((0.0, 5.0, 10.0, 15.0), (0.250, 0.246, 0.238, 0.241))
SPEED, WIND = st.floats(0.5, 25.0), st.floats(-12.0, 12.0)


@given(speed=SPEED, along=WIND, across=WIND, factor=st.floats(0.5, 3.0))
@settings(max_examples=60, deadline=None)
def test_all_speeds_times_a_factor_is_the_force_times_its_square(
    speed: float, along: float, across: float, factor: float
) -> None:
    def force(k: float) -> float:
        return float(
            air_force_n(
                k * speed,
                density_kg_m3=1.2,
                wind_along_m_s=k * along,
                wind_across_m_s=k * across,
                drag_area=BY_YAW,
            )
        )

    assert force(factor) == pytest.approx(factor**2 * force(1.0), rel=1e-9, abs=1e-9)


@given(speed=SPEED, along=WIND, across=WIND)
@settings(max_examples=60, deadline=None)
def test_force_is_proportional_to_density_and_to_the_drag_area(
    speed: float, along: float, across: float
) -> None:
    wind = {"wind_along_m_s": along, "wind_across_m_s": across}
    one = air_force_n(speed, density_kg_m3=1.0, drag_area=BY_YAW, **wind)
    denser = air_force_n(speed, density_kg_m3=1.3, drag_area=BY_YAW, **wind)
    larger = air_force_n(speed, density_kg_m3=1.0, drag_area=BY_YAW.scaled(1.3), **wind)
    assert denser == pytest.approx(1.3 * one, rel=1e-12)
    assert larger == pytest.approx(1.3 * one, rel=1e-12)


@given(speed=SPEED, along=WIND, across=WIND)
@settings(max_examples=100, deadline=None)
def test_with_a_nearly_constant_drag_area_more_speed_is_always_more_force(
    speed: float, along: float, across: float
) -> None:
    slope = air_force_n_and_slope(
        speed,
        density_kg_m3=1.2,
        wind_along_m_s=along,
        wind_across_m_s=across,
        drag_area=BY_YAW,
    ).slope_n_per_m_s
    assert slope >= 0.0


@given(heading=st.floats(0.0, 360.0), wind_from=st.floats(0.0, 360.0))
@settings(max_examples=60, deadline=None)
def test_turning_the_road_and_the_wind_together_changes_nothing(
    heading: float, wind_from: float
) -> None:
    def wind(turn_deg: float) -> tuple[float, float]:
        weather = Weather(288.0, 101_325.0, 5.0, wind_from + turn_deg, wind_height_m=1.0)
        along, across = Day((weather,)).wind_at_rider(heading + turn_deg)
        return float(along), float(across)

    assert wind(77.0) == pytest.approx(wind(0.0), abs=1e-9)
    assert math.hypot(*wind(0.0)) == pytest.approx(5.0)


def test_riding_the_other_way_turns_both_parts_of_the_wind() -> None:
    day = Day((Weather(288.0, 101_325.0, 5.0, 200.0),))
    heading = np.linspace(0.0, 359.0, 360)
    there, back = day.wind_at_rider(heading), day.wind_at_rider(heading + 180.0)
    assert there.along_m_s == pytest.approx(-back.along_m_s, abs=1e-12)
    assert there.across_m_s == pytest.approx(-back.across_m_s, abs=1e-12)


def test_wind_costs_more_out_than_it_gives_back_home() -> None:
    def power(along: float) -> float:
        return float(
            road_power_w(
                11.0,
                mass_kg=80.0,
                gradient=0.0,
                density_kg_m3=1.2,
                drag_area=BY_YAW,
                crr=0.004,
                wind_along_m_s=along,
            ).total_w
        )

    assert power(3.0) + power(-3.0) > 2.0 * power(0.0)
