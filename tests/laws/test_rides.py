"""Laws of whole rides: mirror, scaling, energy, and which way each thing works.

All follow from m dE/ds = η P/v − F − ½ρ CdA · flow · along by hand (common practice, no source).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pacing.bike import DragArea
from pacing.motion import road_for, simulate_motion
from pacing.motion.limits import with_braking
from pacing.plan.problem import ride
from pacing.plan.solve import solve

CELLS = 300
AT = 10.0 * np.arange(CELLS)
GRADIENT = 0.04 * np.sin(2.0 * np.pi * AT / 1500.0)
HEADING = 360.0 * AT / 3000.0
TARGET_W = np.repeat([400.0, 310.0, 280.0, 330.0, 290.0, 320.0], 50)
STARTS = np.arange(0, CELLS, 50, dtype=np.intp)
BY_YAW = {"yaw_deg": [0, 5, 10, 15], "m2": [0.235, 0.231, 0.224, 0.228]}


@pytest.fixture(scope="module")
def road(make_road: Callable[..., Any]) -> Any:
    limit = np.full(CELLS + 1, 17.0)
    limit[[120, 240]] = 7.0
    braking = np.full(CELLS, 2.3)
    return make_road(
        GRADIENT,
        wind_along_m_s=3.0 * np.cos(np.radians(HEADING)),
        wind_across_m_s=3.0 * np.sin(np.radians(HEADING)),
        drag_area=DragArea(tuple(BY_YAW["yaw_deg"]), tuple(BY_YAW["m2"])),
        limit_m_s=with_braking(limit, cell_m=np.full(CELLS, 10.0), braking_m_s2=braking),
        traction_n=200.0,
        spin_out_m_s=16.0,
    )


def seconds(road: Any, target_w: Any = TARGET_W, start_speed_m_s: float = 2.0) -> float:
    return simulate_motion(road, target_w, start_speed_m_s=start_speed_m_s).total_s


@given(wind_from=st.floats(0.0, 360.0), speed=st.floats(0.0, 12.0))
@settings(max_examples=25, deadline=None)
def test_a_course_mirrored_east_to_west_with_mirrored_wind_takes_as_long(
    make_race: Callable[..., Any], wind_from: float, speed: float
) -> None:
    def total(sign: float) -> float:
        race = make_race(
            GRADIENT,
            np.mod(sign * HEADING, 360.0),
            air__wind_speed_m_s=speed,
            air__wind_from_deg=(sign * wind_from) % 360.0,
            rider__positions=[{"name": "bars", "cda_m2": BY_YAW}],
        )
        return seconds(road_for(race))

    assert total(-1.0) == pytest.approx(total(1.0), rel=1e-12)


def test_course_and_wind_turned_together_take_as_long(make_race: Callable[..., Any]) -> None:
    def total(turn_deg: float) -> float:
        race = make_race(
            GRADIENT,
            HEADING + turn_deg,
            air__wind_speed_m_s=6.0,
            air__wind_from_deg=(30.0 + turn_deg) % 360.0,
            rider__positions=[{"name": "bars", "cda_m2": BY_YAW}],
        )
        return seconds(road_for(race))

    assert total(77.0) == pytest.approx(total(0.0), rel=1e-12)


@pytest.mark.parametrize("factor", [0.5, 3.0])
def test_all_masses_forces_and_powers_times_a_factor_is_the_same_ride(
    road: Any, factor: float
) -> None:
    scaled = replace(
        road,
        steady_n=factor * road.steady_n,
        half_density_kg_m3=factor * road.half_density_kg_m3,
        bearing_n_per_m_s=factor * road.bearing_n_per_m_s,
        effective_mass_kg=factor * road.effective_mass_kg,
        traction_n=factor * road.traction_n,
    )
    assert seconds(scaled, factor * TARGET_W) == pytest.approx(seconds(road), rel=1e-12)


@pytest.mark.parametrize("factor", [0.5, 3.0])
def test_a_course_longer_by_a_factor_with_forces_and_powers_shorter_by_it_takes_longer_by_it(
    road: Any, factor: float
) -> None:
    scaled = replace(
        road,
        cell_m=factor * road.cell_m,
        steady_n=road.steady_n / factor,
        half_density_kg_m3=road.half_density_kg_m3 / factor,
        bearing_n_per_m_s=road.bearing_n_per_m_s / factor,
        traction_n=road.traction_n / factor,
    )
    expected = factor * seconds(road)
    assert seconds(scaled, TARGET_W / factor) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize("factor", [0.8, 1.7])
def test_all_speeds_times_a_factor_take_its_square_in_forces_and_its_cube_in_power(
    road: Any, factor: float
) -> None:
    scaled = replace(
        road,
        steady_n=factor**2 * road.steady_n,
        wind_along_m_s=factor * road.wind_along_m_s,
        wind_across_m_s=factor * road.wind_across_m_s,
        bearing_n_per_m_s=factor * road.bearing_n_per_m_s,
        traction_n=factor**2 * road.traction_n,
        spin_out_m_s=factor * road.spin_out_m_s,
        limit_m_s=factor * road.limit_m_s,
    )
    total = seconds(scaled, factor**3 * TARGET_W, start_speed_m_s=factor * 2.0)
    assert total == pytest.approx(seconds(road) / factor, rel=1e-12)


@pytest.mark.parametrize("law", ["none", "skiba-2015"])
def test_the_optimum_scales_with_the_rider(
    make_road: Callable[..., Any], make_problem: Callable[..., Any], law: str
) -> None:
    """Twice the mass, drag, power and W′ on the same road: the same time at twice the power.

    Holds for the laws whose time constant is W′ over power or that have none.
    """
    small = make_problem(make_road(GRADIENT), law=law)
    large_road = replace(
        small.road,
        steady_n=2.0 * small.road.steady_n,
        half_density_kg_m3=2.0 * small.road.half_density_kg_m3,
        bearing_n_per_m_s=2.0 * small.road.bearing_n_per_m_s,
        effective_mass_kg=2.0 * small.road.effective_mass_kg,
    )
    large = make_problem(
        large_road,
        law=law,
        critical_power_w=600.0,
        w_prime_j=36_000.0,
        reserve_j=4_000.0,
        max_power_w=840.0,
        first_30_s_max_w=800.0,
    )
    one = solve(small, STARTS, np.full(STARTS.size, 330.0)).ride
    two = solve(large, STARTS, np.full(STARTS.size, 660.0)).ride
    assert two.motion.total_s == pytest.approx(one.motion.total_s, abs=2e-3)
    assert two.power_w == pytest.approx(2.0 * one.power_w, abs=3.0)


def test_over_the_whole_ride_work_is_climbing_drag_brakes_and_speed(road: Any) -> None:
    motion = simulate_motion(road, TARGET_W, start_speed_m_s=2.0)
    v0, v1 = motion.speed_m_s[:-1], motion.speed_m_s[1:]
    r0, _ = road.resistance_n_and_slope(v0)
    r1, _ = road.resistance_n_and_slope(v1)
    work_j = 0.976 * float(motion.power_w @ motion.time_s)
    against_j = float(road.cell_m @ (0.5 * (r0 + r1) + motion.braking_n))
    gained_j = 0.5 * road.effective_mass_kg * float(v1[-1] ** 2 - v0[0] ** 2)
    assert float(motion.braking_n @ road.cell_m) > 1_000.0
    assert work_j == pytest.approx(against_j + gained_j, abs=0.01)


@given(piece=st.integers(0, 5), more_w=st.floats(0.5, 60.0))
@settings(max_examples=25, deadline=None)
def test_more_power_anywhere_is_never_slower(road: Any, piece: int, more_w: float) -> None:
    target = TARGET_W.copy()
    target[50 * piece : 50 * piece + 50] += more_w
    assert seconds(road, target) <= seconds(road) + 1e-9


def test_each_thing_works_the_way_it_should(make_road: Callable[..., Any]) -> None:
    def total(**changes: Any) -> float:
        gradient = changes.pop("gradient", GRADIENT + 0.005)
        return seconds(make_road(gradient, **changes))

    plain = total()
    assert total(mass_kg=85.0, effective_mass_kg=86.25) > plain
    assert total(crr=0.005) > plain
    assert total(density_kg_m3=1.25) > plain
    assert total(drag_area=DragArea((0.0,), (0.23,))) < plain
    assert total(efficiency=0.98) < plain
    assert total(bearing_n=0.182, bearing_n_per_m_s=0.0174) > plain
    assert total(wind_along_m_s=2.0) > plain > total(wind_along_m_s=-2.0)
    assert total(wind_across_m_s=3.0) > plain
    assert total(gradient=GRADIENT + 0.006) > plain
    assert total(limit_m_s=11.0) > plain
    # wind costs more against than it gives with the rider
    out_and_back = np.repeat([3.0, -3.0], CELLS // 2)
    level = total(gradient=np.zeros(CELLS))
    assert total(gradient=np.zeros(CELLS), wind_along_m_s=out_and_back) > level


def test_a_better_rider_or_more_freedom_never_makes_the_optimum_slower(
    make_road: Callable[..., Any], make_problem: Callable[..., Any]
) -> None:
    def best(starts: Any = STARTS, **changes: Any) -> float:
        problem = make_problem(make_road(GRADIENT), **changes)
        found = solve(problem, starts, np.full(starts.size, 320.0), evenness=0.0)
        return found.ride.motion.total_s

    plain = best()
    assert best(critical_power_w=303.0) < plain - 0.1
    assert best(w_prime_j=19_000.0) < plain - 0.1
    assert best(reserve_j=3_000.0) > plain + 0.1
    assert best(max_power_w=380.0) >= plain - 1e-3
    assert best(min_power_w=280.0) >= plain - 1e-3
    assert best(law="none") >= plain - 1e-3
    assert best(start_speed_m_s=8.0) < plain - 0.5
    assert best(np.arange(0, CELLS, 25, dtype=np.intp)) <= plain + 1e-3


def test_the_ride_begins_at_the_start_speed(
    make_road: Callable[..., Any], make_problem: Callable[..., Any]
) -> None:
    problem = make_problem(make_road(GRADIENT), start_speed_m_s=7.5)
    ridden = ride(problem, STARTS, np.full(STARTS.size, 300.0))
    assert ridden.motion.speed_m_s[0] == 7.5
