"""Positions chosen with the power: against every assignment there is, within every bound."""

from __future__ import annotations

from collections.abc import Callable
from itertools import product
from typing import Any

import numpy as np
import pytest

from pacing.course.course import Bend, SlowPoint
from pacing.plan import plan_race
from pacing.plan.position_choice import choose_positions
from pacing.plan.position_prices import outside_s, position_changes_s
from pacing.plan.position_road import asked_in_pieces, with_pieces
from pacing.plan.prepare import prepare
from pacing.plan.problem import ride
from pacing.plan.solve import solve

LOW = {"name": "bars", "cda_m2": 0.235}
HIGH = {"name": "upright", "cda_m2": 0.32, "power_share": 1.04}
HILLS = {
    "climbs and flats": np.repeat([0.0, 0.07, -0.03, 0.05, 0.01, 0.09, 0.0, -0.05], 45),
    "near the crossover": np.repeat([0.02, 0.035, 0.045, 0.03, 0.05, 0.02], 60),
    "one long climb": np.repeat([0.0, 0.03, 0.06, 0.08, 0.05], 80),
}
RIDERS = {
    "two": [LOW, HIGH],
    "upright tested": [{**HIGH, "power_share": 1.0}, {**LOW, "power_share": 0.95}],
}


def _solved(race: Any, pieces: int) -> Any:
    prepared = prepare(race)
    problem = prepared.problem
    starts = np.arange(pieces) * (problem.cells // pieces)
    power = np.full(pieces, prepared.constant.power_w[-1])
    return solve(problem, starts, power)


@pytest.mark.parametrize(
    ("hills", "rider"),
    [
        ("climbs and flats", "two"),
        ("near the crossover", "two"),
        ("near the crossover", "upright tested"),
        ("one long climb", "upright tested"),
    ],
)
def test_no_assignment_of_positions_to_pieces_is_faster(
    make_race: Callable[..., Any], hills: str, rider: str
) -> None:
    """Every assignment solved from where the choice stands; up to 2^8 of them."""
    gradient = HILLS[hills]
    race = make_race(gradient, rider__positions=RIDERS[rider], plan__start_speed_m_s=8.0)
    pieces = {"climbs and flats": 8, "near the crossover": 6, "one long climb": 5}[hills]
    base = _solved(race, pieces)
    choice = choose_positions(base, most_pieces=pieces, shortest_s=30.0, cut=False)
    ridden = choice.solution.ride
    shares = np.array([p.power_share for p in race.rider.positions])
    chosen = asked_in_pieces(ridden.problem, ridden.starts)
    best_s, best = np.inf, chosen
    for asked in product(range(2), repeat=pieces):
        there = np.array(asked)
        power = ridden.power_w * shares[there] / shares[chosen]
        tried = solve(
            with_pieces(ridden.problem, ridden.starts, there),
            ridden.starts,
            np.clip(power, 0.0, ridden.problem.max_power_w),
            guess_m_s=ridden.motion.speed_m_s,
        ).ride.motion.total_s
        if tried < best_s:
            best_s, best = tried, there
    assert ridden.motion.total_s <= best_s + 5e-3, (chosen, best)


def test_the_adjoint_tells_what_a_short_stretch_in_another_position_costs(
    make_race: Callable[..., Any],
) -> None:
    """One cell switched at the same effort, ridden and counted, against the adjoint's number."""
    gradient = HILLS["climbs and flats"]
    nearly = {"name": "nearly", "cda_m2": 0.2355, "power_share": 1.0005}
    race = make_race(gradient, rider__positions=[LOW, nearly], plan__start_speed_m_s=8.0)
    base = _solved(race, 8)
    ridden, problem = base.ride, base.ride.problem
    now = int(problem.sitting.asked[0])
    changes = position_changes_s(base)[1 - now]
    shares = [p.power_share for p in race.rider.positions]
    for a, b in ((95, 130), (185, 220), (320, 355)):
        starts = np.unique([*ridden.starts, a, b])
        asked = np.where(starts == a, 1 - now, now)
        power = ridden.target_w[starts].copy()
        power[starts == a] *= shares[1 - now] / shares[now]
        there = ride(with_pieces(problem, starts, asked), starts, power)
        time_s = there.motion.total_s - ridden.motion.total_s
        same = np.isin(starts, ridden.starts)
        ends = np.append(np.flatnonzero(same)[1:], starts.size) - 1
        lowest = np.minimum.reduceat(there.lowest.lowest_j, np.flatnonzero(same))
        assert ends.size == lowest.size
        counted = time_s - base.multipliers_s_per_j @ (lowest - ridden.lowest.lowest_j)
        assert changes[a:b].sum() == pytest.approx(counted, rel=0.05, abs=2e-4)


BOUND = {
    "not below": {"positions": [{**LOW, "min_speed_kmh": 25.0}, HIGH]},
    "not above": {"positions": [LOW, {**HIGH, "max_speed_kmh": 24.0}]},
    "no longer than": {"positions": [{**LOW, "longest_s": 200.0}, HIGH]},
}


@pytest.mark.parametrize("bound", BOUND)
def test_speeds_and_times_of_a_position_are_kept(make_race: Callable[..., Any], bound: str) -> None:
    gradient = np.tile(np.repeat([0.0, 0.07, -0.02, 0.03], 70), 2)
    race = make_race(gradient, rider__positions=BOUND[bound]["positions"], plan__max_cues=14)
    plan = plan_race(race)
    trace, cues = plan.trace, plan.cues
    kmh = 3.6 * trace["speed_to_m_s"].to_numpy()
    cue_of = np.searchsorted(cues["from_m"], trace["from_m"].to_numpy() + 1e-6) - 1
    asked = cues["position"].to_numpy()[cue_of]
    time = trace["time_s"].to_numpy()
    if bound == "not below":
        assert time[(asked == "bars") & (kmh < 24.5)].sum() < 3.0
    elif bound == "not above":
        assert time[(asked == "upright") & (kmh > 24.5)].sum() < 3.0
    else:
        change = np.concatenate([[0], np.flatnonzero(asked[1:] != asked[:-1]) + 1])
        held = np.add.reduceat(time, change)
        assert np.max(held[asked[change] == "bars"]) < 203.0
    assert cues["time_s"].min() >= 30.0 - 1e-6


def test_hands_are_off_the_bars_in_slow_bends_and_at_the_brakes(
    make_race: Callable[..., Any],
) -> None:
    race = make_race(
        np.full(500, -0.01),
        rider__positions=[LOW, HIGH],
        slow_points=(SlowPoint(2_600.0, 4.0, 15.0, "dead turn"),),
        bends=(Bend(4_000.0, 40.0, 18.0, 95.0, 0.9),),
    )
    trace = plan_race(race).trace
    in_bend = (trace["from_m"] >= 3_990.0) & (trace["to_m"] <= 4_010.0)
    assert set(trace["position"][in_bend]) == {"upright"}
    hard = trace["braking_n"] > 30.0
    assert hard.sum() > 3
    assert set(trace["position"][hard]) == {"upright"}
    assert set(trace["power_share"]) == {1.0}
    assert np.allclose(trace["cda_m2"][hard], 0.32)


def test_a_rider_with_one_position_sees_nothing_of_it(make_race: Callable[..., Any]) -> None:
    plan = plan_race(make_race(HILLS["near the crossover"], rider__positions=[LOW]))
    assert set(plan.cues["position"]) == {"bars"}
    assert "positions" not in plan.to_json_dict()


def test_bounds_that_nothing_meets_are_said(make_race: Callable[..., Any]) -> None:
    positions = [{**LOW, "min_speed_kmh": 30.0}, {**HIGH, "min_speed_kmh": 28.0}]
    plan = plan_race(make_race(np.full(300, 0.06), rider__positions=positions))
    assert any("outside" in caution for caution in plan.cautions)


def test_two_equal_positions_change_nothing(make_race: Callable[..., Any]) -> None:
    base = _solved(make_race(HILLS["near the crossover"], rider__positions=[LOW]), 6)
    same = [LOW, {**LOW, "name": "the same"}]
    twin = _solved(make_race(HILLS["near the crossover"], rider__positions=same), 6)
    choice = choose_positions(twin, most_pieces=6, shortest_s=30.0)
    assert choice.solution.ride.motion.total_s == pytest.approx(base.ride.motion.total_s, abs=0.02)
    assert outside_s(choice.solution.ride) == 0.0


def test_what_changing_is_worth_is_not_won_by_cutting_alone(make_race: Callable[..., Any]) -> None:
    """From two pieces that hide a climb: the single position is given the pieces found, too."""
    gradient = np.repeat([0.0, 0.06, 0.0, 0.0], 160)
    base = _solved(make_race(gradient, rider__positions=RIDERS["two"]), 2)
    choice = choose_positions(base, most_pieces=8, shortest_s=30.0)
    found = choice.solution.ride
    asked = asked_in_pieces(found.problem, found.starts)
    assert set(asked.tolist()) == {0, 1}
    assert choice.single_s is not None
    bars = with_pieces(found.problem, found.starts, np.zeros_like(asked))
    alone = solve(bars, found.starts, np.clip(found.power_w, 0.0, 400.0)).ride.motion.total_s
    assert found.motion.total_s < choice.single_s <= alone + 0.01


def test_a_change_that_only_the_cap_would_pay_for_is_seen_through(
    make_race: Callable[..., Any],
) -> None:
    """On a climb short enough for the highest power in both, the same effort misleads."""
    gradient = np.repeat([0.0, 0.06, 0.0, 0.0], 80)
    base = _solved(make_race(gradient, rider__positions=RIDERS["two"]), 2)
    choice = choose_positions(base, most_pieces=8, shortest_s=30.0)
    assert choice.single_s is not None
    assert choice.solution.ride.motion.total_s <= choice.single_s + 1e-3
