"""The optimiser on the climb of Bos et al. 2024, arXiv 2403.03363: constant ground speed wins.

5 km at 4 % then 5 km at 8 %, 80 kg, mean power over time 289 W, constants of Martin 1998,
quasi-steady: constant power 1939.08 s, optimum 1913.62 s (± 0.05) at 5.2257 m/s with 205.4
then 372.6 W. The budget is a law that pays back every watt below "critical power" 289 W, looked
at at the finish alone: that is mean power over time. Quasi-steady is an inertia of 1 kg and a
start at the steady speed.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.bike import DragArea
from pacing.plan.problem import ride
from pacing.plan.solve import solve

CELLS = 1000
# Source: martin-1998: CdA and Fw together multiply ½ρ·flow·along
MARTIN: dict[str, Any] = {
    "mass_kg": 80.0,
    "crr": 0.0032,
    "density_kg_m3": 1.2234,
    "drag_area": DragArea((0.0,), (0.2565 + 0.0044,)),
    "gravity_m_s2": 9.81,
    "bearing_n": 0.091,
    "bearing_n_per_m_s": 0.0087,
    "efficiency": 0.976,
}


@pytest.fixture
def climb(
    make_road: Callable[..., Any], make_problem: Callable[..., Any], mean_power_law: Any
) -> Callable[..., Any]:
    def problem(inertia_kg: float) -> Any:
        return make_problem(
            make_road(np.repeat([0.04, 0.08], CELLS // 2), effective_mass_kg=inertia_kg, **MARTIN),
            law=mean_power_law,
            critical_power_w=289.0,
            w_prime_j=1e7,
            w_start_j=5e6,
            reserve_j=5e6,
            reserve_everywhere=False,
            start_speed_m_s=5.2257,
            max_power_w=2000.0,
            first_30_s_max_w=2000.0,
        )

    return problem


def optimum(problem: Any, pieces: int) -> Any:
    starts = np.arange(0, CELLS, CELLS // pieces, dtype=np.intp)
    return solve(problem, starts, np.full(pieces, 289.0), evenness=0.0).ride


@pytest.mark.parametrize("pieces", [2, 4, 10])
def test_the_optimum_takes_1913_62_seconds(climb: Callable[..., Any], pieces: int) -> None:
    best = optimum(climb(1.0), pieces)
    assert best.motion.total_s == pytest.approx(1913.62, abs=0.05)
    mean_w = float(np.sum(best.motion.power_w * best.motion.time_s) / best.motion.total_s)
    assert mean_w == pytest.approx(289.0, abs=1e-5)


def test_it_is_ridden_at_5_2257_m_s_with_205_4_then_372_6_w(climb: Callable[..., Any]) -> None:
    best = optimum(climb(1.0), 2)
    assert best.power_w == pytest.approx([205.4, 372.6], abs=0.15)
    inside = best.motion.speed_m_s[20:-1]
    assert inside == pytest.approx(np.full(inside.size, 5.2257), abs=0.002)


def test_constant_power_takes_1939_08_seconds(climb: Callable[..., Any]) -> None:
    # 5 kg: 1 kg is thrown to and fro by the step from one slope to the other
    constant = ride(climb(5.0), np.zeros(1, dtype=np.intp), np.array([289.0]))
    assert constant.motion.total_s == pytest.approx(1939.08, abs=0.1)


def test_inertia_of_the_whole_bicycle_changes_the_time_by_what_speed_saves_at_the_end(
    climb: Callable[..., Any],
) -> None:
    """Two pieces leave no room to spend speed at the end: the published time stands."""
    best = optimum(climb(81.4), 2)
    assert best.motion.total_s == pytest.approx(1913.62, abs=0.05)
