"""Exact slopes of a ride against central differences, with everything active that can be.

Central differences of second order, common practice, no source.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.bike import DragArea
from pacing.motion import Mode, simulate_motion, simulate_motion_and_slopes
from pacing.motion.limits import with_braking
from pacing.motion.slopes import cell_end_slopes, piece_slopes, time_adjoint

STARTS = np.array([0, 1, 2, 22, 60, 110, 111, 170, 205, 260, 330, 360], dtype=np.intp)
POWER_W = np.array([700, 500, 420, 300, 260, 390, 30, 310, 150, 340, 280, 410], dtype=float)
START_M_S = 0.4
STEP_W = 0.02


@pytest.fixture(scope="module")
def road(make_road: Callable[..., Any]) -> Any:
    at = 10.0 * np.arange(401)
    limit = np.full(401, 16.5)
    limit[[90, 190, 191, 300]] = [9.0, 6.0, 6.0, 8.0]
    return make_road(
        0.06 * np.sin(2.0 * np.pi * at[:-1] / 1900.0) - 0.012,
        limit_m_s=with_braking(limit, cell_m=np.full(400, 10.0), braking_m_s2=np.full(400, 2.2)),
        wind_along_m_s=3.0 * np.cos(at[:-1] / 310.0),
        wind_across_m_s=4.0 * np.sin(at[:-1] / 190.0),
        drag_area=DragArea((0.0, 5.0, 10.0, 20.0), (0.24, 0.236, 0.228, 0.233)),
        traction_n=150.0,
        spin_out_m_s=14.0,
    )


def spread(power_w: Any) -> Any:
    return np.repeat(power_w, np.diff(np.append(STARTS, 400)))


def ridden(road: Any, power_w: Any) -> Any:
    return simulate_motion(road, spread(power_w), start_speed_m_s=START_M_S)


def differences(road: Any, of: Callable[[Any], Any]) -> Any:
    """Central differences of ``of(motion)`` in every piece power, pieces last."""
    columns = []
    for piece in range(POWER_W.size):
        up, down = POWER_W.copy(), POWER_W.copy()
        up[piece] += STEP_W
        down[piece] -= STEP_W
        columns.append((of(ridden(road, up)) - of(ridden(road, down))) / (2.0 * STEP_W))
    return np.stack(columns, axis=-1)


def slopes_of(road: Any) -> tuple[Any, Any]:
    motion, cells = simulate_motion_and_slopes(road, spread(POWER_W), start_speed_m_s=START_M_S)
    return motion, piece_slopes(road, motion, cells, starts=STARTS, target_w=spread(POWER_W))


def by_all_powers(own: Any, entry: Any, entry_energy: Any) -> Any:
    """Slopes per cell (N,) in a piece's own power and entry energy as slopes (N, n) in all."""
    piece = np.searchsorted(STARTS, np.arange(own.size), side="right") - 1
    matrix = entry[:, None] * entry_energy[piece]
    matrix[np.arange(own.size), piece] += own
    return matrix


def test_the_course_has_every_way_to_decide_the_speed(road: Any) -> None:
    motion, _ = slopes_of(road)
    assert set(motion.mode.tolist()) == set(Mode) - {Mode.FLOOR}
    partly = (motion.power_w > 1.0) & (motion.power_w < spread(POWER_W) - 1.0)
    assert {Mode.SPIN_OUT, Mode.LIMIT, Mode.TRACTION} <= set(motion.mode[partly].tolist())


def test_the_time_in_every_cell_follows_every_power(road: Any) -> None:
    _, slopes = slopes_of(road)
    exact = by_all_powers(slopes.time_own, slopes.time_entry, slopes.entry_energy)
    found = differences(road, lambda motion: motion.time_s)
    assert exact == pytest.approx(found, rel=1e-5, abs=1e-9)


def test_what_the_rider_puts_out_in_every_cell_follows_every_power(road: Any) -> None:
    _, slopes = slopes_of(road)
    exact = by_all_powers(slopes.power_own, slopes.power_entry, slopes.entry_energy)
    found = differences(road, lambda motion: motion.power_w)
    assert exact == pytest.approx(found, rel=1e-5, abs=1e-7)


def test_the_speed_at_each_pieces_start_follows_every_power_before(road: Any) -> None:
    _, slopes = slopes_of(road)
    found = differences(road, lambda motion: 0.5 * motion.speed_m_s[STARTS] ** 2)
    assert slopes.entry_energy == pytest.approx(found, rel=1e-5, abs=1e-8)
    assert np.all(np.triu(slopes.entry_energy) == 0.0)


def test_the_adjoint_gives_the_time_lost_to_a_little_more_force_anywhere(road: Any) -> None:
    motion, cells = simulate_motion_and_slopes(road, spread(POWER_W), start_speed_m_s=START_M_S)
    ends = cell_end_slopes(road, motion, spread(POWER_W))
    multiplier = time_adjoint(ends, cells)
    # limits, spin-out and the floor hold whatever the force
    held = np.isin(motion.mode, (Mode.LIMIT, Mode.SPIN_OUT, Mode.FLOOR))
    assert 0 < held.sum() < held.size
    for cell in range(3, 400, 9):
        seconds = []
        for force in (0.01, -0.01):
            road.steady_n[cell] += force
            seconds.append(ridden(road, POWER_W).total_s)
            road.steady_n[cell] -= force
        found = (seconds[0] - seconds[1]) / 0.02
        shift = -road.cell_m[cell] / road.effective_mass_kg
        exact = 0.0 if held[cell] else multiplier[cell] * shift
        assert exact == pytest.approx(found, rel=1e-4, abs=1e-8), cell


def test_the_adjoint_adds_up_to_the_slope_of_the_time_in_each_pieces_power(road: Any) -> None:
    motion, cells = simulate_motion_and_slopes(road, spread(POWER_W), start_speed_m_s=START_M_S)
    ends = cell_end_slopes(road, motion, spread(POWER_W))
    by_cell = time_adjoint(ends, cells) * cells.power
    found = differences(road, lambda motion: np.array(motion.total_s))
    assert np.add.reduceat(by_cell, STARTS) == pytest.approx(found, rel=1e-5, abs=1e-9)


def test_slopes_of_a_ride_that_stalls_are_finite(make_road: Callable[..., Any]) -> None:
    gradient = np.zeros(60)
    gradient[20:40] = 0.3
    steep = make_road(gradient)
    starts = np.array([0, 20, 40], dtype=np.intp)
    target = np.repeat([200.0, 150.0, 200.0], 20)
    motion, cells = simulate_motion_and_slopes(steep, target, start_speed_m_s=0.0)
    assert motion.stalled_cells.size
    slopes = piece_slopes(steep, motion, cells, starts=starts, target_w=target)
    for column in slopes:
        assert np.all(np.isfinite(column))
