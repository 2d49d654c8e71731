"""Where two positions are equal: v³ = η E (s₂ − s₁)/(½ρ (A₂ − A₁)), and riding there."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.bike import DragArea
from pacing.plan.crossover import (
    Seat,
    Still,
    break_even_share,
    crossover,
    equal_speed_m_s,
    steady_speed_m_s,
)
from pacing.plan.position_choice import choose_positions
from pacing.plan.prepare import prepare
from pacing.plan.solve import solve

STILL = Still(0.6, 82.0 * 9.80665, 0.004, 0.091, 0.0087, 0.976)
LOW, HIGH = Seat(0.235, 1.0), Seat(0.32, 1.04)


def test_at_the_crossover_both_positions_ask_for_the_same_effort(
    make_road: Callable[..., Any],
) -> None:
    """By the road's own forces, which know nothing of the formula."""
    speed, gradient = crossover(LOW, HIGH, STILL, effort_w=300.0)
    assert speed**3 == pytest.approx(0.976 * 300.0 * 0.04 / (0.6 * 0.085))
    for seat in (LOW, HIGH):
        road = make_road(gradient, cells=1, drag_area=DragArea((0.0,), (seat.area_m2,)))
        assert road.steady_power_w(speed, 0) / seat.power_share == pytest.approx(300.0, abs=0.01)


@pytest.mark.parametrize(("change", "faster"), [(0.01, HIGH), (-0.01, LOW)])
def test_steeper_the_upper_is_faster_and_flatter_the_lower(change: float, faster: Seat) -> None:
    _, gradient = crossover(LOW, HIGH, STILL, effort_w=300.0)
    speeds = {
        seat: steady_speed_m_s(seat, STILL, gradient + change, effort_w=300.0)
        for seat in (LOW, HIGH)
    }
    assert max(speeds, key=lambda seat: speeds[seat]) is faster


def test_the_line_of_equal_effort_passes_through_every_crossover() -> None:
    for effort in (150.0, 300.0, 450.0):
        speed, gradient = crossover(LOW, HIGH, STILL, effort_w=effort)
        assert equal_speed_m_s(LOW, HIGH, STILL, np.array([gradient]))[0] == pytest.approx(speed)


def test_there_is_no_crossover_where_one_position_is_better_in_both() -> None:
    assert np.isnan(crossover(LOW, Seat(0.32, 1.0), STILL, effort_w=300.0)).all()
    assert np.isnan(crossover(LOW, Seat(0.235, 1.04), STILL, effort_w=300.0)).all()
    assert np.isnan(equal_speed_m_s(LOW, Seat(0.32, 0.9), STILL, np.array([0.1]))).all()


def test_on_one_gradient_the_break_even_share_is_the_ratio_of_steady_powers(
    make_race: Callable[..., Any], make_road: Callable[..., Any]
) -> None:
    """A long level course without wind: the powers that hold one speed in both positions."""
    positions = [{"name": "low", "cda_m2": 0.235}, {"name": "high", "cda_m2": 0.32}]
    race = make_race(np.zeros(400), cell_m=50.0, rider__positions=positions)
    prepared = prepare(race)
    starts = np.arange(2) * 200
    base = solve(prepared.problem, starts, np.full(2, prepared.constant.power_w[-1]))
    choice = choose_positions(base, most_pieces=2, shortest_s=30.0)
    upper = choice.singles[1].ride
    speed = float(upper.motion.speed_m_s[300])
    density = 2.0 * float(upper.problem.road.half_density_kg_m3[0])
    held = [
        make_road(
            0.0, cells=1, drag_area=DragArea((0.0,), (area,)), density_kg_m3=density, mass_kg=82.5
        ).steady_power_w(speed, 0)
        for area in (0.235, 0.32)
    ]
    share = break_even_share(upper, 0, now=1.0)
    assert share == pytest.approx(held[0] / held[1], abs=0.003)
