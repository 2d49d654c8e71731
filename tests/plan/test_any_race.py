"""Any race in range ends in a plan that holds, or in a message meant for the rider."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from pacing.course.course import Bend, SlowPoint
from pacing.errors import CannotBeRiddenError, UnusableInputError
from pacing.plan import plan_race


def check(plan: Any) -> None:
    """What must hold of every plan, as printed."""
    race, trace = plan.race, plan.trace
    assert np.all(np.isfinite(trace.select_dtypes(float).drop(columns=list(LIMITS)).to_numpy()))
    assert trace["w_balance_to_j"].min() >= race.plan.reserve_j - 1e-6
    assert len(plan.cues) <= race.plan.max_cues
    if len(plan.cues) > 1:
        assert plan.cues["time_s"].min() >= race.plan.shortest_cue_s - 1e-6
    step = race.plan.power_step_w
    shown = plan.cues["power_w"].to_numpy()
    assert np.max(np.abs(shown - step * np.round(shown / step))) < 1e-6
    assert plan.cues["to_m"].iloc[-1] == pytest.approx(race.course.length_m)
    assert trace["time_s"].sum() == pytest.approx(plan.time_s)
    assert np.all(trace["speed_to_m_s"] <= trace["speed_limit_to_m_s"] + 1e-9)


LIMITS = ("speed_limit_from_m_s", "speed_limit_to_m_s")

RACES = st.fixed_dictionaries(
    {
        "hills": st.lists(st.floats(-0.12, 0.14), min_size=1, max_size=6),
        "cells_each": st.integers(5, 40),
        "air__wind_speed_m_s": st.sampled_from([0.0, 3.0, 15.0]),
        "air__wind_from_deg": st.floats(0.0, 360.0),
        "rider__mass_kg": st.floats(45.0, 110.0),
        "rider__critical_power_w": st.floats(120.0, 450.0),
        "rider__w_prime_kj": st.sampled_from([0.0, 2.0, 12.0, 25.0, 60.0]),
        "rider__recovery_law": st.sampled_from(["two-phase", "none", "skiba-2012", "bartram-2018"]),
        "plan__max_cues": st.integers(1, 12),
        "plan__shortest_cue_s": st.sampled_from([10.0, 30.0, 120.0]),
        "plan__power_step_w": st.sampled_from([1, 5, 25]),
        "plan__min_power_w": st.sampled_from([0.0, 100.0]),
        "plan__start_speed_m_s": st.sampled_from([0.0, 9.0]),
        "bike__top_gear": st.sampled_from([3.5, 5.0]),
        "slow": st.booleans(),
    }
)


@given(drawn=RACES)
@settings(
    max_examples=15, deadline=None, suppress_health_check=[HealthCheck.too_slow], derandomize=True
)
def test_random_small_races_are_planned_or_refused(
    make_race: Callable[..., Any], drawn: dict[str, Any]
) -> None:
    keys = dict(drawn)
    gradient = np.repeat(keys.pop("hills"), keys.pop("cells_each"))
    if keys.pop("slow"):
        middle = 5.0 * gradient.size
        keys["slow_points"] = (SlowPoint(middle, 3.0, 12.0),)
        keys["bends"] = (Bend(0.5 * middle, 20.0, 12.0, 100.0, 0.9),)
    try:
        plan = plan_race(make_race(gradient, np.linspace(0.0, 300.0, gradient.size), **keys))
    except (CannotBeRiddenError, UnusableInputError) as refusal:
        assert len(str(refusal)) > 30
    else:
        check(plan)


AT_M = 10.0 * np.arange(500)
ROLLING = 0.03 * np.sin(2.0 * np.pi * AT_M / 1700.0)
HARD: dict[str, dict[str, Any]] = {
    "1 km": {"gradient": ROLLING[:100]},
    "one cell": {"gradient": ROLLING[:1]},
    "200 m": {"gradient": ROLLING[:20]},
    "wind of 15 m/s": {"air__wind_speed_m_s": 15.0, "air__wind_from_deg": 80.0},
    "wind of 40 m/s": {"air__wind_speed_m_s": 40.0, "air__wind_from_deg": 10.0},
    "ramps of 25 %": {
        "gradient": np.repeat(np.tile([0.0, 0.25, 0.02, -0.20], 3), 20),
        "rider__critical_power_w": 340.0,
    },
    "one cue": {"plan__max_cues": 1},
    "cues longer than the race": {"plan__shortest_cue_s": 1800.0},
    "downhill all the way": {"gradient": np.full(400, -0.07)},
    "nearly all W′ kept back": {"plan__reserve_kj": 17.9},
    "narrow bounds": {"plan__min_power_w": 295.0, "plan__max_power_w": 310.0},
    "no cap at the start": {"plan__first_30_s_max_w": 2000.0, "plan__max_power_w": 1200.0},
    "a cap at the start below critical power": {"plan__first_30_s_max_w": 200.0},
    "steps of 50 W": {"plan__power_step_w": 50},
    "wet": {"plan__dry": False},
    "crawling past a slow place": {"slow_points": (SlowPoint(2_500.0, 1.2, 30.0),)},
    "fast rolling start": {"plan__start_speed_m_s": 25.0},
}


@pytest.mark.parametrize("name", HARD)
def test_hard_races_are_planned(make_race: Callable[..., Any], name: str) -> None:
    keys = {"gradient": ROLLING, **HARD[name]}
    gradient = keys.pop("gradient")
    plan = plan_race(make_race(gradient, np.linspace(0.0, 350.0, gradient.size), **keys))
    check(plan)
    assert plan.time_s <= plan.constant["time_s"] * 1.003
    length_m = plan.race.course.length_m
    assert 3.0 < 3.6 * length_m / plan.time_s < 95.0


@pytest.mark.slow
def test_three_hundred_kilometres_are_planned(make_race: Callable[..., Any]) -> None:
    at = 10.0 * np.arange(30_000)
    gradient = 0.02 * np.sin(2.0 * np.pi * at / 9_000.0) + 0.02 * np.sin(2.0 * np.pi * at / 2_300.0)
    race = make_race(
        gradient,
        np.mod(at / 100.0, 360.0),
        air__wind_speed_m_s=5.0,
        rider__critical_power_w=260.0,
        plan__max_cues=40,
        plan__shortest_cue_s=120.0,
    )
    plan = plan_race(race)
    check(plan)
    assert 28.0 < 3.6 * 300_000.0 / plan.time_s < 42.0
    assert 0.0 < 100.0 * (1.0 - plan.time_s / plan.constant["time_s"]) < 4.0
