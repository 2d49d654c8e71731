"""A few small races and their plans, solved once."""

from __future__ import annotations

from collections.abc import Callable
from functools import cache
from typing import Any

import numpy as np
import pytest

from pacing.course.course import Bend, Landmark, SlowPoint

CELLS = 800
AT_M = 10.0 * np.arange(CELLS)
ROLLING = 0.035 * np.sin(2.0 * np.pi * AT_M / 2600.0) + 0.015 * np.sin(2.0 * np.pi * AT_M / 900.0)

RACES: dict[str, dict[str, Any]] = {
    "rolling": {"gradient": ROLLING},
    "level": {"gradient": np.zeros(CELLS)},
    "climb": {"gradient": np.repeat([0.04, 0.08, 0.06, 0.02], 150)},
    "wind all round": {
        "gradient": 0.3 * ROLLING,
        "heading_deg": 360.0 * AT_M / AT_M[-1],
        "air__wind_speed_m_s": 8.0,
        "air__wind_from_deg": 240.0,
        "rider__positions": [
            {"name": "bars", "cda_m2": {"yaw_deg": [0, 8, 16], "m2": [0.235, 0.229, 0.231]}}
        ],
    },
    "slow places": {
        "gradient": ROLLING - 0.01,
        "slow_points": (SlowPoint(2_600.0, 4.0, 15.0, "dead turn"), SlowPoint(5_210.0, 6.0)),
        "bends": (Bend(4_000.0, 40.0, 30.0, 95.0, 0.9), Bend(6_700.0, 30.0, 18.0, -120.0, 0.9)),
        "landmarks": (Landmark(3_300.0, "church"),),
        "bike__top_gear": 4.91,
        "rider__max_speed_kmh": 58.0,
    },
    "three parameters": {
        "gradient": ROLLING,
        "rider__fit_form": "three-parameter",
        "rider__peak_power_w": 700.0,
        "plan__max_power_w": 600.0,
        "plan__reserve_kj": 0.5,
    },
    "no recovery": {"gradient": ROLLING, "rider__recovery_law": "none"},
    "many short cues in steps of 10 W": {
        "gradient": ROLLING,
        "plan__max_cues": 30,
        "plan__shortest_cue_s": 20.0,
        "plan__power_step_w": 10,
    },
    "few long cues": {"gradient": ROLLING, "plan__max_cues": 4, "plan__shortest_cue_s": 90.0},
    "meter reads low": {"gradient": ROLLING, "rider__power_meter_factor": 1.03},
}


@pytest.fixture(scope="session")
def race_named(make_race: Callable[..., Any]) -> Callable[[str], Any]:
    """One of the small races by name."""

    @cache
    def race(name: str) -> Any:
        keys = dict(RACES[name])
        return make_race(keys.pop("gradient"), keys.pop("heading_deg", 90.0), **keys)

    return race


@pytest.fixture(scope="session")
def plan_named(race_named: Callable[[str], Any]) -> Callable[[str], Any]:
    """The plan of one of the small races by name."""
    from pacing.plan import plan_race

    return cache(lambda name: plan_race(race_named(name)))


@pytest.fixture(scope="session", params=sorted(RACES))
def plan(request: pytest.FixtureRequest, plan_named: Callable[[str], Any]) -> Any:
    """The plan of every small race in turn."""
    return plan_named(request.param)
