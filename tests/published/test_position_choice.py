"""Positions chosen along a course, against what was published of whole rides in each.

Jeukendrup & Martin 2001, Sports Med 31:559: over 40 km, against elbows on the aero bars, brake
hoods +5 to +7 min, drops +2 to +3, an optimised position −2 to −2.5 (drag areas from memory, see
`test_jeukendrup_2001`). Polanco et al. 2020, Appl Sci 10:6546: lower bars, CdA −10.7 ± 3.1 %,
power −9.5 ± 5.4 %: nearly a draw on the flat; the lower must lose on a climb.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.plan.crossover import break_even_share
from pacing.plan.position_choice import Choice, choose_positions
from pacing.plan.position_road import asked_in_pieces
from pacing.plan.prepare import prepare
from pacing.plan.solve import solve

CDA_M2 = {"hoods": 0.358, "drops": 0.307, "aero": 0.269, "optimised": 0.240}
POLANCO = [
    {"name": "higher", "cda_m2": 0.2565},
    {"name": "lower", "cda_m2": 0.2565 * (1.0 - 0.107), "power_share": 1.0 - 0.095},
]


def _chosen(race: Any, pieces: int) -> Choice:
    prepared = prepare(race)
    starts = np.arange(pieces) * (prepared.problem.cells // pieces)
    power = np.full(pieces, prepared.constant.power_w[-1])
    return choose_positions(
        solve(prepared.problem, starts, power), most_pieces=pieces, shortest_s=30.0
    )


def _asked(choice: Choice) -> list[int]:
    ridden = choice.solution.ride
    return np.unique(asked_in_pieces(ridden.problem, ridden.starts)).tolist()


def _race(make_race: Callable[..., Any], gradient: Any, positions: Any, **keys: Any) -> Any:
    return make_race(
        gradient,
        rider__positions=positions,
        rider__mass_kg=69.5,  # 80 kg with kit and bike
        rider__critical_power_w=289.0,
        rider__w_prime_kj=5.0,
        rider__long_decline_w=0.0,
        bike__crr=0.0032,
        bike__wheel_rotation_m2=0.0044,
        **keys,
    )


def test_over_forty_kilometres_the_lowest_is_chosen_and_the_others_lose_as_published(
    make_race: Callable[..., Any],
) -> None:
    positions = [{"name": name, "cda_m2": area} for name, area in CDA_M2.items()]
    choice = _chosen(_race(make_race, np.zeros(400), positions, cell_m=100.0), 3)
    assert _asked(choice) == [3]
    assert choice.single == 3
    times = {
        name: found.ride.motion.total_s / 60.0
        for name, found in zip(CDA_M2, choice.singles, strict=True)
    }
    printed = {"hoods": (5.0, 7.0), "drops": (2.0, 3.0), "optimised": (-2.5, -2.0)}
    for name, (low, high) in printed.items():
        assert low - 0.2 <= times[name] - times["aero"] <= high + 0.2


def test_lower_bars_are_nearly_a_draw_on_the_flat(make_race: Callable[..., Any]) -> None:
    race = _race(make_race, np.zeros(400), POLANCO, cell_m=50.0)
    choice = _chosen(race, 3)
    higher, lower = (found.ride.motion.total_s for found in choice.singles)
    assert abs(lower / higher - 1.0) < 0.01
    share = break_even_share(choice.singles[0].ride, 1, now=POLANCO[1]["power_share"])
    assert share == pytest.approx(POLANCO[1]["power_share"], abs=0.01)


@pytest.mark.parametrize("gradient", [0.05, 0.08])
def test_lower_bars_lose_on_a_climb_and_are_not_chosen(
    make_race: Callable[..., Any], gradient: float
) -> None:
    race = _race(make_race, np.full(400, gradient), POLANCO)
    choice = _chosen(race, 3)
    assert _asked(choice) == [0]
    higher, lower = (found.ride.motion.total_s for found in choice.singles)
    assert 0.02 < lower / higher - 1.0 < 0.12
    share = break_even_share(choice.singles[0].ride, 1, now=POLANCO[1]["power_share"])
    assert share > POLANCO[1]["power_share"] + 0.02


def test_on_a_course_with_both_the_bars_are_left_for_the_climb_alone(
    make_race: Callable[..., Any],
) -> None:
    lower_is_better = [POLANCO[0], {**POLANCO[1], "power_share": 0.95}]
    gradient = np.repeat([0.0, 0.08, 0.0], 200)
    choice = _chosen(_race(make_race, gradient, lower_is_better), 3)
    ridden = choice.solution.ride
    assert asked_in_pieces(ridden.problem, ridden.starts).tolist() == [1, 0, 1]
    assert choice.single_s is not None
    assert ridden.motion.total_s < choice.single_s
