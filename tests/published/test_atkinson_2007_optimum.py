"""The optimiser on the courses of Atkinson, Peacock & Passfield 2007, J Sports Sci 25:1001.

80 kg, constants of Martin 1998, 289 W. Savings of ±10 % at equal mean power over time, with
inertia: 89.5 s on 10 km of alternating hills and 26.3 s on 40 km of alternating wind; steadily
117.9 and 27.5 s. These hold the mean over time (computed, not printed: the printed 126 and
51 s hold it over distance). A free choice of power must do at least as well.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from scipy.optimize import brentq

from pacing.bike import DragArea
from pacing.plan.problem import ride
from pacing.plan.solve import solve

MARTIN: dict[str, Any] = {
    "mass_kg": 80.0,
    "effective_mass_kg": 80.0 + 0.14 / 0.311**2,
    "crr": 0.0032,
    "density_kg_m3": 1.2234,
    "drag_area": DragArea((0.0,), (0.2565 + 0.0044,)),
    "gravity_m_s2": 9.81,
}
MEAN_W = 289.0
# sections, cells in each, gradients, head winds; saved steadily and with inertia
COURSES = {
    "hills": (10, 100, (0.10, -0.10), (0.0, 0.0), 117.9, 89.5),
    "wind": (8, 500, (0.0, 0.0), (4.4, -4.4), 27.5, 26.3),
}


@pytest.fixture(params=sorted(COURSES))
def course(
    request: pytest.FixtureRequest,
    make_road: Callable[..., Any],
    make_problem: Callable[..., Any],
    mean_power_law: Any,
) -> tuple[Any, int, float, float]:
    sections, cells, gradients, winds, steady_s, inertia_s = COURSES[request.param]
    road = make_road(
        np.repeat(np.tile(gradients, sections // 2), cells),
        wind_along_m_s=np.repeat(np.tile(winds, sections // 2), cells),
        **MARTIN,
    )
    problem = make_problem(
        road,
        law=mean_power_law,
        critical_power_w=MEAN_W,
        w_prime_j=1e7,
        w_start_j=5e6,
        reserve_j=5e6,
        reserve_everywhere=False,
        start_speed_m_s=10.0,
        max_power_w=600.0,
        first_30_s_max_w=600.0,
    )
    return problem, sections, steady_s, inertia_s


def starts_of(problem: Any, pieces: int) -> Any:
    return np.arange(0, problem.cells, problem.cells // pieces, dtype=np.intp)


def ten_percent(problem: Any, sections: int) -> Any:
    """10 % more on the hard sections, and as much less on the easy ones as keeps the mean."""
    starts = starts_of(problem, sections)

    def at(easy_w: float) -> Any:
        power = np.tile([1.1 * MEAN_W, easy_w], sections // 2)
        return ride(problem, starts, power)

    easy_w = brentq(lambda watts: at(watts).balance_j[-1] - 5e6, 50.0, MEAN_W, xtol=1e-6)
    return at(easy_w)


def test_with_inertia_ten_percent_saves_what_the_sketch_of_the_study_gave(
    course: tuple[Any, int, float, float],
) -> None:
    problem, sections, _, inertia_s = course
    constant = ride(problem, np.zeros(1, dtype=np.intp), np.array([MEAN_W]))
    saved = constant.motion.total_s - ten_percent(problem, sections).motion.total_s
    # the sketch's start and grid are not recorded: 1 s, or 2 % of it
    assert saved == pytest.approx(inertia_s, abs=max(1.0, 0.02 * inertia_s))


def test_the_optimum_saves_at_least_what_ten_percent_saves(
    course: tuple[Any, int, float, float],
) -> None:
    problem, sections, steady_s, inertia_s = course
    constant = ride(problem, np.zeros(1, dtype=np.intp), np.array([MEAN_W]))
    by_rule = ten_percent(problem, sections)
    starts = starts_of(problem, sections)
    same_cuts = solve(problem, starts, np.full(starts.size, MEAN_W), evenness=0.0).ride
    saved = constant.motion.total_s - same_cuts.motion.total_s
    assert saved >= constant.motion.total_s - by_rule.motion.total_s - 1e-3
    assert saved >= inertia_s - 1.0
    starts = starts_of(problem, 5 * sections)
    finer = solve(problem, starts, np.full(starts.size, MEAN_W), evenness=0.0).ride
    assert finer.motion.total_s < same_cuts.motion.total_s
    assert constant.motion.total_s - finer.motion.total_s >= min(steady_s, inertia_s)
    for best in (same_cuts, finer):
        assert best.balance_j[-1] == pytest.approx(5e6, abs=1.0)
