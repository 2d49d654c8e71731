"""Rides whose speed can be written down: steady riding, coasting, pushing off.

All follow from m v dv/ds = η P/v − F₀ − k v² solved by hand (common practice, no source).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.motion import Mode, simulate_motion

PLAIN: dict[str, Any] = {"bearing_n": 0.0, "bearing_n_per_m_s": 0.0, "crr": 0.004}
MASS_KG, FORCE_N, PER_V2 = 83.25, 0.004 * 82.0 * 9.80665, 0.5 * 1.2 * 0.235


def real_root(*coefficients: float) -> float:
    """The one positive real root of a polynomial, highest power first."""
    roots = np.roots(coefficients)
    real = roots[(np.abs(roots.imag) < 1e-9) & (roots.real > 0.0)].real
    assert real.size == 1
    return float(real[0])


@pytest.mark.parametrize("power_w", [150.0, 300.0, 450.0])
def test_on_the_level_the_speed_settles_at_the_root_of_the_cubic(
    make_road: Callable[..., Any], power_w: float
) -> None:
    road = make_road(0.0, cells=800, **PLAIN)
    motion = simulate_motion(road, np.full(800, power_w), start_speed_m_s=5.0)
    steady = real_root(PER_V2, 0.0, FORCE_N, -0.976 * power_w)
    assert motion.speed_m_s[-1] == pytest.approx(steady, rel=1e-9)


@pytest.mark.parametrize("wind_m_s", [-6.0, 2.5, 9.0])
def test_with_wind_along_the_road_too(make_road: Callable[..., Any], wind_m_s: float) -> None:
    road = make_road(0.0, cells=1500, wind_along_m_s=wind_m_s, **PLAIN)
    motion = simulate_motion(road, np.full(1500, 300.0), start_speed_m_s=9.0)
    # k (v + w)² v + F₀ v − η P = 0 while v + w > 0
    steady = real_root(
        PER_V2, 2.0 * PER_V2 * wind_m_s, PER_V2 * wind_m_s**2 + FORCE_N, -0.976 * 300.0
    )
    assert steady + wind_m_s > 0.0
    assert motion.speed_m_s[-1] == pytest.approx(steady, rel=1e-9)


def test_on_a_climb_too(make_road: Callable[..., Any]) -> None:
    road = make_road(0.08, cells=300, **PLAIN)
    motion = simulate_motion(road, np.full(300, 300.0), start_speed_m_s=9.0)
    cosine = 1.0 / math.sqrt(1.0 + 0.08**2)
    force = 82.0 * 9.80665 * cosine * (0.08 + 0.004)
    steady = real_root(PER_V2, 0.0, force, -0.976 * 300.0)
    assert motion.speed_m_s[-1] == pytest.approx(steady, rel=1e-9)


def test_rolling_down_a_hill_ends_at_the_speed_where_drag_holds_the_weight(
    make_road: Callable[..., Any],
) -> None:
    road = make_road(-0.06, cells=1000, **PLAIN)
    motion = simulate_motion(road, np.zeros(1000), start_speed_m_s=3.0)
    cosine = 1.0 / math.sqrt(1.0 + 0.06**2)
    terminal = math.sqrt(82.0 * 9.80665 * cosine * (0.06 - 0.004) / PER_V2)
    assert motion.speed_m_s[-1] == pytest.approx(terminal, rel=1e-7)


def test_coasting_to_a_halt_follows_the_exponential_in_distance(
    make_road: Callable[..., Any],
) -> None:
    # v² = (v₀² + F₀/k) exp(−2 k s/m) − F₀/k
    def error(cell_m: float) -> float:
        road = make_road(0.0, cells=round(400 / cell_m), cell_m=cell_m, **PLAIN)
        motion = simulate_motion(road, np.zeros(road.cell_m.size), start_speed_m_s=14.0)
        at = cell_m * np.arange(road.cell_m.size + 1)
        rest = FORCE_N / PER_V2
        exact = np.sqrt((14.0**2 + rest) * np.exp(-2.0 * PER_V2 * at / MASS_KG) - rest)
        return float(np.max(np.abs(motion.speed_m_s - exact)))

    assert error(10.0) < 2e-3
    assert error(5.0) == pytest.approx(error(10.0) / 4.0, rel=0.05)


def test_against_rolling_resistance_alone_the_time_to_coast_is_that_of_uniform_deceleration(
    make_road: Callable[..., Any],
) -> None:
    road = make_road(0.0, cells=60, **PLAIN | {"density_kg_m3": 0.0})
    motion = simulate_motion(road, np.zeros(60), start_speed_m_s=10.0)
    deceleration = FORCE_N / MASS_KG
    end = math.sqrt(10.0**2 - 2.0 * deceleration * 600.0)
    assert motion.speed_m_s[-1] == pytest.approx(end, rel=1e-12)
    assert motion.total_s == pytest.approx((10.0 - end) / deceleration, rel=1e-12)


def test_pushing_off_at_the_limit_of_grip_is_uniform_acceleration(
    make_road: Callable[..., Any],
) -> None:
    road = make_road(
        0.0, cells=10, cell_m=1.0, **PLAIN | {"density_kg_m3": 0.0, "traction_n": 200.0}
    )
    motion = simulate_motion(road, np.full(10, 5000.0), start_speed_m_s=0.0)
    assert np.all(motion.mode == Mode.TRACTION)
    acceleration = (200.0 - FORCE_N) / MASS_KG
    at = np.arange(11.0)
    assert motion.speed_m_s == pytest.approx(np.sqrt(2.0 * acceleration * at), rel=1e-9)
    assert motion.total_s == pytest.approx(math.sqrt(2.0 * 10.0 / acceleration), rel=1e-9)


@pytest.mark.parametrize(("cell_m", "within"), [(10.0, 3e-3), (1.0, 3e-5)])
def test_without_resistance_constant_power_raises_the_cube_of_speed_with_distance(
    make_road: Callable[..., Any], cell_m: float, within: float
) -> None:
    # v³ = v₀³ + 3 η P s/m
    free = {"density_kg_m3": 0.0, "crr": 0.0, "bearing_n": 0.0, "bearing_n_per_m_s": 0.0}
    road = make_road(0.0, cells=round(500 / cell_m), cell_m=cell_m, **free)
    motion = simulate_motion(road, np.full(road.cell_m.size, 300.0), start_speed_m_s=4.0)
    at = cell_m * np.arange(road.cell_m.size + 1)
    exact = np.cbrt(4.0**3 + 3.0 * 0.976 * 300.0 * at / MASS_KG)
    assert motion.speed_m_s == pytest.approx(exact, rel=within)
    # work = η P t = ½ m (v₁² − v₀²): exact in any cell
    gained = 0.5 * MASS_KG * (motion.speed_m_s[-1] ** 2 - 16.0)
    assert 0.976 * 300.0 * motion.total_s == pytest.approx(gained, rel=1e-12)


def test_a_standing_start_takes_the_time_of_constant_power(
    make_road: Callable[..., Any],
) -> None:
    # from rest without resistance s = ∫v dt with v = √(2 η P t/m): t³ = 9 m s²/(8 η P)
    free = {"density_kg_m3": 0.0, "crr": 0.0, "bearing_n": 0.0, "bearing_n_per_m_s": 0.0}
    for cell_m, within in ((10.0, 0.03), (1.0, 0.003)):
        road = make_road(0.0, cells=round(200 / cell_m), cell_m=cell_m, **free)
        motion = simulate_motion(road, np.full(road.cell_m.size, 300.0), start_speed_m_s=0.0)
        exact = (9.0 * MASS_KG * 200.0**2 / (8.0 * 0.976 * 300.0)) ** (1.0 / 3.0)
        assert motion.total_s == pytest.approx(exact, rel=within)


def test_a_speed_limit_on_the_level_is_ridden_at_the_power_it_takes(
    make_road: Callable[..., Any],
) -> None:
    road = make_road(0.0, cells=200, limit_m_s=9.0, **PLAIN)
    motion = simulate_motion(road, np.full(200, 400.0), start_speed_m_s=9.0)
    takes = (PER_V2 * 9.0**2 + FORCE_N) * 9.0 / 0.976
    assert motion.power_w == pytest.approx(np.full(200, takes), rel=1e-9)
    assert motion.braking_n == pytest.approx(np.zeros(200), abs=1e-6)
    assert motion.total_s == pytest.approx(2000.0 / 9.0, rel=1e-12)


def test_down_a_hill_the_brakes_hold_what_drag_does_not(make_road: Callable[..., Any]) -> None:
    road = make_road(-0.08, cells=100, limit_m_s=10.0, **PLAIN)
    motion = simulate_motion(road, np.full(100, 300.0), start_speed_m_s=10.0)
    cosine = 1.0 / math.sqrt(1.0 + 0.08**2)
    brake = 82.0 * 9.80665 * cosine * (0.08 - 0.004) - PER_V2 * 10.0**2
    assert motion.braking_n == pytest.approx(np.full(100, brake), rel=1e-9)
    assert np.all(motion.power_w == 0.0)
