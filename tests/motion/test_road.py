"""What a race asks in each cell is what its course, bicycle, rider and day say."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from pacing.bike import DragArea
from pacing.bike.resistance import road_power_w
from pacing.motion import road_for

GRADIENT = np.array([0.0, 0.05, -0.03, 0.12, -0.09])
HEADING = np.array([0.0, 40.0, 130.0, 200.0, 300.0])


def test_the_power_to_hold_a_speed_is_that_of_the_published_road_equation(
    make_race: Callable[..., Any],
) -> None:
    # Source: martin-1998, by `road_power_w`, which is checked against its worked example
    race = make_race(
        GRADIENT,
        HEADING,
        air__wind_speed_m_s=5.0,
        air__wind_from_deg=75.0,
        bike__wheel_rotation_m2=0.0044,
        bike__cda_by_yaw={"yaw_deg": [0, 10, 20], "delta_m2": [0.0, -0.004, -0.002]},
        rider__positions=[
            {"name": "bars", "cda_m2": {"yaw_deg": [0, 5, 15], "m2": [0.24, 0.236, 0.243]}}
        ],
        crr_factor=[1.0, 1.2, 1.0, 1.4, 1.0],
        wind_share=[1.0, 0.5, 1.0, 0.0, 1.0],
    )
    road = road_for(race)
    height = 0.5 * (race.course.elevation_m[1:] + race.course.elevation_m[:-1])
    along, across = race.day.wind_at_rider(HEADING, race.course.wind_share)
    for cell in range(GRADIENT.size):
        expected = road_power_w(
            9.3,
            mass_kg=race.mass_kg,
            gradient=GRADIENT[cell],
            density_kg_m3=float(race.day.density_kg_m3(height[cell])),
            drag_area=race.bike.drag_area(race.rider.positions[0].drag_area),
            crr=race.bike.crr * race.course.crr_factor[cell],
            wind_along_m_s=float(along[cell]),
            wind_across_m_s=float(across[cell]),
            bearing_n=race.bike.bearing_n,
            bearing_n_per_m_s=race.bike.bearing_n_per_m_s,
            efficiency=0.976,
        )
        assert road.steady_power_w(9.3, cell) == pytest.approx(float(expected.total_w), rel=1e-12)
    force, _ = road.resistance_n_and_slope(np.full(GRADIENT.size, 9.3))
    by_power = [road.steady_power_w(9.3, cell) for cell in range(GRADIENT.size)]
    assert force * 9.3 / road.efficiency == pytest.approx(by_power, rel=1e-12)


def test_all_that_multiplies_the_air_is_reported_as_one_drag_area(
    make_race: Callable[..., Any],
) -> None:
    race = make_race(GRADIENT, HEADING, air__wind_speed_m_s=5.0, bike__wheel_rotation_m2=0.01)
    road = road_for(race)
    area = road.drag_area_m2(np.full(GRADIENT.size, 10.0))
    assert area == pytest.approx(np.full(GRADIENT.size, 0.245), abs=1e-12)


def test_behind_the_chain_nothing_is_lost(make_race: Callable[..., Any]) -> None:
    crank = road_for(make_race(GRADIENT))
    hub = road_for(make_race(GRADIENT, bike__power_measured_at="hub"))
    assert (crank.efficiency, hub.efficiency) == (0.976, 1.0)
    assert hub.steady_power_w(8.0, 1) == pytest.approx(0.976 * crank.steady_power_w(8.0, 1))


def test_spin_out_is_gear_times_cadence_times_circumference(
    make_race: Callable[..., Any],
) -> None:
    # 53 x 11 teeth, 115 rpm, 2.10 m: 69.8 km/h (common practice, arithmetic)
    race = make_race(GRADIENT, bike__top_gear=53 / 11, bike__wheel_circumference_m=2.10)
    assert road_for(race).spin_out_m_s * 3.6 == pytest.approx(69.81, abs=0.01)
    assert road_for(make_race(GRADIENT)).spin_out_m_s == np.inf


def test_grip_at_the_wheel_ends_at_a_quarter_of_the_weight(
    make_race: Callable[..., Any],
) -> None:
    # common practice, no source
    race = make_race(GRADIENT)
    assert road_for(race).traction_n == pytest.approx(0.25 * 82.5 * 9.80665)


def test_wheels_add_their_inertia_to_what_is_accelerated(make_race: Callable[..., Any]) -> None:
    # Source: martin-1998, m + I/r²
    race = make_race(GRADIENT, bike__wheel_inertia_kg_m2=0.14, bike__wheel_circumference_m=2.10)
    radius = 2.10 / (2.0 * np.pi)
    assert road_for(race).effective_mass_kg == pytest.approx(82.5 + 0.14 / radius**2)


def test_higher_up_the_air_is_thinner(make_race: Callable[..., Any]) -> None:
    road = road_for(make_race(np.full(200, 0.10)))
    assert np.all(np.diff(road.half_density_kg_m3) < 0.0)


def test_each_cell_has_the_weather_of_the_hour_it_is_ridden_in(
    make_race: Callable[..., Any],
) -> None:
    hours = [
        {"at": "09:00", "wind_speed_m_s": 0.0, "wind_from_deg": 0.0},
        {"at": "10:00", "wind_speed_m_s": 4.0, "wind_from_deg": 0.0, "temperature_c": 28.0},
    ]
    race = make_race(np.zeros(3), air__hours=hours, air__wind_height_m=1.0, plan__start="09:00")
    road = road_for(race, clock_s=3600.0 * np.array([8.0, 9.5, 11.0]))
    assert road.wind_along_m_s == pytest.approx([0.0, 2.0, 4.0])
    assert road.half_density_kg_m3[2] < road.half_density_kg_m3[1] < road.half_density_kg_m3[0]


def test_each_cell_has_the_drag_of_the_position_it_is_ridden_in(
    make_road: Callable[..., Any],
) -> None:
    low, high = DragArea((0.0, 10.0), (0.23, 0.22)), DragArea((0.0,), (0.32,))
    wind = {"wind_along_m_s": 2.0, "wind_across_m_s": 3.0}
    speed = np.linspace(3.0, 16.0, 40)
    position = (np.arange(40) // 7 % 2).astype(np.intp)
    both = replace(
        make_road(0.02, cells=40, drag_area=low, **wind),
        drag_areas=(low, high),
        position=position,
    )
    mixed = both.resistance_n_and_slope(speed)
    for index, area in enumerate((low, high)):
        one = make_road(0.02, cells=40, drag_area=area, **wind).resistance_n_and_slope(speed)
        here = position == index
        for value, expected in zip(mixed, one, strict=True):
            assert value[here] == pytest.approx(expected[here], rel=1e-12)
    areas = both.drag_area_m2(speed)
    assert np.all(areas[position == 1] == 0.32)
    assert np.all((areas[position == 0] <= 0.23) & (areas[position == 0] >= 0.22))
