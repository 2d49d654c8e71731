"""Speed along the course: what decides it in each cell, and that it is found from anywhere."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pacing.bike import DragArea
from pacing.motion import Mode, simulate_motion
from pacing.motion.limits import with_braking
from pacing.motion.simulate import FLOOR_M_S

BY_YAW = DragArea((0.0, 5.0, 10.0, 20.0), (0.24, 0.236, 0.228, 0.233))
EVERY_MODE_BUT_FLOOR = {Mode.POWER, Mode.TRACTION, Mode.COAST, Mode.SPIN_OUT, Mode.LIMIT}


@pytest.fixture(scope="module")
def hard_road(make_road: Callable[..., Any]) -> Any:
    """4 km with a steep descent, spin-out, slow places, gusts from all sides and poor grip."""
    at = 10.0 * np.arange(401)
    gradient = 0.07 * np.sin(2.0 * np.pi * at[:-1] / 2000.0) - 0.01
    limit = np.full(401, 17.5)
    limit[[150, 151, 260]] = 6.0
    braking = np.full(400, 2.2)
    return make_road(
        gradient,
        limit_m_s=with_braking(limit, cell_m=np.full(400, 10.0), braking_m_s2=braking),
        wind_along_m_s=4.0 * np.cos(at[:-1] / 300.0),
        wind_across_m_s=3.0 * np.sin(at[:-1] / 170.0),
        drag_area=BY_YAW,
        traction_n=90.0,
        spin_out_m_s=14.5,
    )


@pytest.fixture(scope="module")
def hard_targets() -> Any:
    """Powers (400,) that change every 200 m."""
    return np.repeat([420.0, 300.0, 180.0, 350.0, 260.0] * 4, 20)


def balance_n(road: Any, motion: Any) -> Any:
    """Driving force less resistance, inertia and braking in each cell: 0 by Newton's law."""
    v0, v1 = motion.speed_m_s[:-1], motion.speed_m_s[1:]
    r0, _ = road.resistance_n_and_slope(v0)
    r1, _ = road.resistance_n_and_slope(v1)
    work = road.efficiency * motion.power_w * motion.time_s
    gained = 0.5 * road.effective_mass_kg * (v1**2 - v0**2)
    return (work - gained) / road.cell_m - 0.5 * (r0 + r1) - motion.braking_n


def test_the_hard_road_has_every_way_to_decide_the_speed(hard_road: Any, hard_targets: Any) -> None:
    motion = simulate_motion(hard_road, hard_targets, start_speed_m_s=0.0)
    assert set(motion.mode.tolist()) == EVERY_MODE_BUT_FLOOR


def test_in_every_cell_forces_and_inertia_balance(hard_road: Any, hard_targets: Any) -> None:
    motion = simulate_motion(hard_road, hard_targets, start_speed_m_s=0.0)
    assert np.max(np.abs(balance_n(hard_road, motion))) < 1e-6


def test_time_is_cell_length_over_mean_speed(hard_road: Any, hard_targets: Any) -> None:
    motion = simulate_motion(hard_road, hard_targets, start_speed_m_s=0.0)
    mean = 0.5 * (motion.speed_m_s[1:] + motion.speed_m_s[:-1])
    assert motion.time_s == pytest.approx(hard_road.cell_m / mean, rel=1e-12)
    assert motion.total_s == pytest.approx(float(motion.time_s.sum()))
    assert motion.elapsed_s[-1] == pytest.approx(motion.total_s)


def test_no_limit_is_passed_and_brakes_work_only_where_one_holds(
    hard_road: Any, hard_targets: Any
) -> None:
    motion = simulate_motion(hard_road, hard_targets, start_speed_m_s=0.0)
    assert np.all(motion.speed_m_s <= hard_road.limit_m_s + 1e-9)
    assert np.all(motion.braking_n >= 0.0)
    assert np.any(motion.braking_n > 50.0)
    at_limit = motion.speed_m_s[1:] >= hard_road.limit_m_s[1:] - 1e-6
    assert np.all(at_limit[motion.braking_n > 1e-6])


def test_brakes_and_pedals_do_not_work_against_each_other(
    hard_road: Any, hard_targets: Any
) -> None:
    motion = simulate_motion(hard_road, hard_targets, start_speed_m_s=0.0)
    assert np.max(np.minimum(motion.braking_n, motion.power_w)) < 1e-6


def test_power_is_the_target_save_at_a_limit_spin_out_or_want_of_grip(
    hard_road: Any, hard_targets: Any
) -> None:
    motion = simulate_motion(hard_road, hard_targets, start_speed_m_s=0.0)
    assert np.all(motion.power_w >= 0.0)
    assert np.all(motion.power_w <= hard_targets + 1e-9)
    powered = motion.mode == Mode.POWER
    assert np.all(motion.power_w[powered] == hard_targets[powered])
    assert np.all(motion.power_w[motion.mode == Mode.COAST] == 0.0)


def test_above_spin_out_nothing_drives_and_at_it_the_speed_stays(
    hard_road: Any, hard_targets: Any
) -> None:
    motion = simulate_motion(hard_road, hard_targets, start_speed_m_s=0.0)
    above = motion.speed_m_s[1:] > hard_road.spin_out_m_s + 1e-9
    assert np.any(above)
    assert np.all(motion.power_w[above] == 0.0)
    spinning = motion.mode == Mode.SPIN_OUT
    assert motion.speed_m_s[1:][spinning] == pytest.approx(hard_road.spin_out_m_s)


def test_the_wheel_never_pushes_harder_than_it_grips(hard_road: Any, hard_targets: Any) -> None:
    motion = simulate_motion(hard_road, hard_targets, start_speed_m_s=0.0)
    push = hard_road.efficiency * motion.power_w * motion.time_s / hard_road.cell_m
    assert np.max(push) <= hard_road.traction_n + 1e-9
    slipping = motion.mode == Mode.TRACTION
    assert push[slipping] == pytest.approx(hard_road.traction_n)
    assert slipping[0]


@pytest.mark.parametrize("guess_m_s", [1.5, 6.0, 25.0])
def test_a_guess_changes_the_effort_and_not_the_ride(
    hard_road: Any, hard_targets: Any, guess_m_s: float
) -> None:
    plain = simulate_motion(hard_road, hard_targets, start_speed_m_s=0.0)
    guessed = simulate_motion(
        hard_road, hard_targets, start_speed_m_s=0.0, guess_m_s=np.full(401, guess_m_s)
    )
    assert guessed.speed_m_s == pytest.approx(plain.speed_m_s, rel=1e-9)
    assert guessed.total_s == pytest.approx(plain.total_s, abs=1e-8)
    assert np.array_equal(guessed.mode, plain.mode)


def test_a_guess_is_not_written_into(hard_road: Any, hard_targets: Any) -> None:
    guess = np.full(401, 8.0)
    simulate_motion(hard_road, hard_targets, start_speed_m_s=3.0, guess_m_s=guess)
    assert np.all(guess == 8.0)


def test_a_rolling_start_above_the_limit_is_taken_at_the_limit(
    make_road: Callable[..., Any],
) -> None:
    road = make_road(cells=20, limit_m_s=5.0)
    motion = simulate_motion(road, np.full(20, 400.0), start_speed_m_s=12.0)
    assert motion.speed_m_s[0] == 5.0


def test_where_the_power_is_not_enough_to_stay_upright_the_rider_stalls(
    make_road: Callable[..., Any],
) -> None:
    gradient = np.zeros(100)
    gradient[40:60] = 0.25
    road = make_road(gradient)
    motion = simulate_motion(road, np.full(100, 150.0), start_speed_m_s=8.0)
    # 82 kg up 25 % at 1 m/s is 82 · 9.80665 · 0.2425 · 1 W at the wheel and more in all
    assert motion.stalled_cells.size > 0
    assert 40 <= motion.stalled_cells[0] < 50
    assert motion.stalled_cells[-1] == 59
    assert np.all(motion.speed_m_s[1:] >= FLOOR_M_S)
    assert np.all(np.isfinite(motion.time_s))
    enough = simulate_motion(road, np.full(100, 350.0), start_speed_m_s=8.0)
    assert enough.stalled_cells.size == 0


def test_ten_metre_cells_give_the_time_of_one_metre_cells(
    make_road: Callable[..., Any],
) -> None:
    """The error falls with the square of the cell (trapezoid), tried without a standing start."""
    at = np.arange(3000) + 0.5

    def seconds(cells_in_one: int) -> float:
        gradient = 0.05 * np.sin(2.0 * np.pi * at / 1500.0)
        coarse = gradient.reshape(-1, cells_in_one).mean(axis=1)
        road = make_road(coarse, cell_m=float(cells_in_one))
        return simulate_motion(road, np.full(coarse.size, 280.0), start_speed_m_s=9.0).total_s

    fine = seconds(1)
    errors = [abs(seconds(width) - fine) for width in (5, 10, 20)]
    assert errors[1] < 0.002
    assert errors[0] < 0.4 * errors[1] < 0.16 * errors[2]


@given(data=st.data())
@settings(max_examples=80, deadline=None)
def test_any_road_and_any_powers_are_ridden(make_road: Callable[..., Any], data: Any) -> None:
    count = data.draw(st.integers(1, 40))

    def column(low: float, high: float, size: int = count) -> Any:
        return np.array(data.draw(st.lists(st.floats(low, high), min_size=size, max_size=size)))

    limit = column(1.5, 30.0, count + 1)
    cell = column(1.0, 60.0)
    road = make_road(
        column(-0.25, 0.25),
        cell_m=cell,
        wind_along_m_s=column(-15.0, 15.0),
        wind_across_m_s=column(-15.0, 15.0),
        drag_area=data.draw(st.sampled_from([BY_YAW, DragArea((0.0,), (0.3,))])),
        traction_n=data.draw(st.sampled_from([np.inf, 200.0, 60.0])),
        spin_out_m_s=data.draw(st.sampled_from([np.inf, 15.0, 6.0])),
        limit_m_s=with_braking(limit, cell_m=cell, braking_m_s2=np.full(count, 2.0)),
    )
    target = column(0.0, 900.0)
    start = data.draw(st.floats(0.0, 20.0))
    motion = simulate_motion(road, target, start_speed_m_s=start)
    moving = motion.mode != Mode.FLOOR
    assert np.all(np.isfinite(motion.speed_m_s))
    assert np.all(motion.speed_m_s[1:] >= FLOOR_M_S - 1e-9)
    assert np.all(motion.speed_m_s[1:][moving] <= road.limit_m_s[1:][moving] + 1e-9)
    assert np.all((motion.power_w >= 0.0) & (motion.power_w <= target + 1e-6))
    scale = 1.0 + road.effective_mass_kg * motion.speed_m_s[1:] ** 2 / road.cell_m
    assert np.max(np.abs(balance_n(road, motion) / scale)[moving], initial=0.0) < 1e-6
