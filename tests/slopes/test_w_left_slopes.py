"""Exact slopes of W′ and of all that the solver is told, against central differences.

Central differences of second order, common practice, no source. The course has slow places,
yaw, spin-out, poor grip and coasting, so that power falls short of its target in all ways.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.bike import DragArea
from pacing.motion import Mode
from pacing.motion.limits import with_braking
from pacing.plan.marginal import reduced_slope
from pacing.plan.problem import ride
from pacing.plan.solve import _Evenness, margins_j
from pacing.rider.budget import RECOVERY_LAWS

STARTS = np.array([0, 2, 22, 60, 110, 111, 170, 205, 260, 330, 360], dtype=np.intp)
POWER_W = np.array([700, 420, 300, 260, 390, 60, 310, 150, 340, 280, 410], dtype=float)
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


@pytest.fixture(scope="module")
def problem_of(make_problem: Callable[..., Any], road: Any) -> Callable[..., Any]:
    def problem(**changes: Any) -> Any:
        given = {"start_speed_m_s": 0.4, "power_share": 1.03, "w_prime_j": 16_000.0} | changes
        return make_problem(road, **given)

    return problem


def differences(problem: Any, of: Callable[[Any], Any]) -> Any:
    columns = []
    for piece in range(POWER_W.size):
        up, down = POWER_W.copy(), POWER_W.copy()
        up[piece] += STEP_W
        down[piece] -= STEP_W
        apart = of(ride(problem, STARTS, up)) - of(ride(problem, STARTS, down))
        columns.append(apart / (2.0 * STEP_W))
    return np.stack(columns, axis=-1)


def test_the_ride_spends_recovers_and_falls_short_of_its_targets(
    problem_of: Callable[..., Any],
) -> None:
    ridden = ride(problem_of(), STARTS, POWER_W)
    assert np.any(np.diff(ridden.balance_j) > 10.0)
    assert np.any(np.diff(ridden.balance_j) < -10.0)
    assert set(ridden.motion.mode.tolist()) == set(Mode) - {Mode.FLOOR}


@pytest.mark.parametrize("law", RECOVERY_LAWS)
def test_w_left_by_runs_is_w_left_by_cells(problem_of: Callable[..., Any], law: str) -> None:
    ridden = ride(problem_of(law=law), STARTS, POWER_W)
    ends = np.append(STARTS[1:], ridden.problem.cells)
    assert ridden.lowest.end_j == pytest.approx(ridden.balance_j[ends], abs=1e-4)
    # a piece's entry is the end of the piece before
    lowest = [ridden.balance_j[a : b + 1].min() for a, b in zip(STARTS, ends, strict=True)]
    entry = ridden.balance_j[STARTS]
    assert np.minimum(ridden.lowest.lowest_j, entry) == pytest.approx(lowest, abs=1e-4)
    assert ridden.runs.duration_s.sum() == pytest.approx(ridden.motion.total_s)
    assert ridden.runs.first.size < ridden.problem.cells


@pytest.mark.parametrize("start_j", [None, 9_000.0])
@pytest.mark.parametrize("law", RECOVERY_LAWS)
def test_lowest_and_last_w_left_of_every_piece_follow_every_power(
    problem_of: Callable[..., Any], law: str, start_j: float | None
) -> None:
    problem = problem_of(law=law, w_start_j=start_j)
    slopes = ride(problem, STARTS, POWER_W).lowest_slopes
    lowest = differences(problem, lambda ridden: ridden.lowest.lowest_j)
    end = differences(problem, lambda ridden: ridden.lowest.end_j)
    assert slopes.lowest == pytest.approx(lowest, rel=1e-5, abs=1e-4)
    assert slopes.end == pytest.approx(end, rel=1e-5, abs=1e-4)


def test_the_time_follows_every_power(problem_of: Callable[..., Any]) -> None:
    problem = problem_of()
    found = differences(problem, lambda ridden: np.array(ridden.motion.total_s))
    slopes = ride(problem, STARTS, POWER_W).time_slopes
    assert slopes == pytest.approx(found, rel=1e-5, abs=1e-8)
    assert np.all(slopes[[1, 2, 3, 6, 8]] < -1e-3)


@pytest.mark.parametrize("everywhere", [True, False])
@pytest.mark.parametrize("law", RECOVERY_LAWS)
def test_the_slope_of_the_lagrangian_in_the_power_of_each_cell_by_itself(
    problem_of: Callable[..., Any], law: str, everywhere: bool
) -> None:
    """`reduced_slope` with invented prices of W′, one cell cut out and its power moved.

    With two pools a watt is worth a little more early in a recovery than late; there the slope
    is spread evenly over the run, so that it holds to some per cent only.
    """
    within = 0.03 if law == "two-phase" else 2e-4
    problem = problem_of(law=law, reserve_everywhere=everywhere)
    ridden = ride(problem, STARTS, POWER_W)
    prices = np.linspace(0.004, 0.010, margins_j(ridden).size)
    exact = reduced_slope(ridden, prices)

    # the lowest end of a run of each piece, found again in the ride with a cell cut out
    run_ends = np.append(ridden.runs.first[1:], problem.cells)
    at = [
        int(min(run_ends[ridden.runs.piece == k], key=lambda node: ridden.balance_j[node]))
        for k in range(STARTS.size)
    ]
    at = at if everywhere else [problem.cells]

    def lagrangian(cell: int, change_w: float) -> float:
        target = ridden.target_w.copy()
        target[cell] += change_w
        whole = np.arange(problem.cells, dtype=np.intp)
        moved = ride(problem, whole, target)
        return float(moved.motion.total_s - prices @ moved.balance_j[at])

    # W′ full cannot grow: there the slope has two sides
    full = ridden.balance_j[:-1] > problem.w_prime_j - 1.0
    cells = [cell for cell in range(5, 400, 23) if not full[cell]]
    assert len(cells) > 12
    for cell in cells:
        found = (lagrangian(cell, 0.05) - lagrangian(cell, -0.05)) / 0.1
        assert exact[cell] == pytest.approx(found, rel=within, abs=2e-7), cell


def test_the_reduced_slopes_of_a_piece_add_up_to_that_of_its_power(
    problem_of: Callable[..., Any],
) -> None:
    ridden = ride(problem_of(), STARTS, POWER_W)
    prices = np.linspace(0.004, 0.010, STARTS.size)
    together = np.add.reduceat(reduced_slope(ridden, prices), STARTS)
    expected = ridden.time_slopes - prices @ ridden.lowest_slopes.lowest
    assert together == pytest.approx(expected, rel=1e-9, abs=1e-12)


def test_the_evenness_term_follows_every_power(problem_of: Callable[..., Any]) -> None:
    problem = problem_of()
    even = _Evenness(ride(problem, STARTS, POWER_W + 7.0), 0.05)
    found = differences(problem, lambda ridden: np.array(even.seconds(ridden)))
    assert even.slopes(ride(problem, STARTS, POWER_W)) == pytest.approx(found, rel=1e-5, abs=1e-9)
