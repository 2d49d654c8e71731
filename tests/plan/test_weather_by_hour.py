"""Weather that changes while one rides, and the decline of critical power: both settle."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.motion import road_for
from pacing.plan import plan_race
from pacing.plan.prepare import planned_critical_power_w, prepare
from pacing.rider.power_time import declined_critical_power_w

HOURS = [
    {"at": "09:00", "wind_speed_m_s": 0.0, "wind_from_deg": 0.0},
    {"at": "09:20", "wind_speed_m_s": 10.0, "wind_from_deg": 0.0, "temperature_c": 30.0},
]


@pytest.fixture(scope="module")
def changing(make_race: Callable[..., Any]) -> Any:
    return make_race(
        0.01 * np.sin(np.arange(900) / 50.0),
        air__hours=HOURS,
        plan__start="09:00",
        plan__max_cues=8,
    )


@pytest.fixture(scope="module")
def plan(changing: Any) -> Any:
    return plan_race(changing)


def test_the_wind_in_each_cell_is_that_of_the_clock_there(changing: Any, plan: Any) -> None:
    time = plan.trace["time_s"].to_numpy()
    clock = 9.0 * 3600.0 + np.cumsum(time) - 0.5 * time
    met = road_for(changing, clock_s=clock)
    # 10 m/s come up within 20 min: 1.4 s late are 0.01 m/s
    along = plan.trace["wind_along_m_s"].to_numpy()
    assert along == pytest.approx(met.wind_along_m_s, abs=0.03)
    assert np.ptp(along) > 2.0
    density = plan.trace["air_density_kg_m3"].to_numpy()
    assert density == pytest.approx(2.0 * met.half_density_kg_m3, rel=1e-4)


def test_a_later_start_meets_other_weather(make_race: Callable[..., Any], plan: Any) -> None:
    late = plan_race(
        make_race(
            0.01 * np.sin(np.arange(900) / 50.0),
            air__hours=HOURS,
            plan__start="09:30",
            plan__max_cues=8,
        )
    )
    assert late.time_s > plan.time_s + 20.0


def test_weather_that_does_not_change_is_one_weather(make_race: Callable[..., Any]) -> None:
    gradient = 0.01 * np.sin(np.arange(400) / 50.0)
    same = {"wind_speed_m_s": 4.0, "wind_from_deg": 30.0}
    by_hours = plan_race(
        make_race(
            gradient,
            air__hours=[{"at": "09:00", **same}, {"at": "10:00", **same}],
            plan__start="09:00",
        )
    )
    plain = plan_race(
        make_race(gradient, **{f"air__{name}": value for name, value in same.items()})
    )
    assert by_hours.time_s == pytest.approx(plain.time_s, abs=1e-6)
    assert by_hours.cues["power_w"].tolist() == plain.cues["power_w"].tolist()


@pytest.mark.parametrize("time_s", [600.0, 1800.0, 3600.0, 7200.0])
def test_planned_critical_power_is_that_of_the_published_form(
    make_race: Callable[..., Any], time_s: float
) -> None:
    # Source: puchowicz-2020; 0.07 CP by default: −4.9 % at 60 min, −9.7 % at 2 h
    race = make_race(np.zeros(100))
    expected = declined_critical_power_w(
        time_s, critical_power_w=300.0, long_decline_w=race.rider.long_decline_w
    )
    assert planned_critical_power_w(race, time_s) == pytest.approx(float(expected))
    assert race.rider.long_decline_w == pytest.approx(21.0)
    share = planned_critical_power_w(race, time_s) / 300.0
    assert share == pytest.approx(1.0 - 0.07 * max(math.log(time_s / 1800.0), 0.0))


def test_beyond_half_an_hour_the_decline_settles_on_the_time_it_gives(
    make_race: Callable[..., Any],
) -> None:
    prepared = prepare(make_race(np.zeros(4000), cell_m=20.0, plan__max_cues=4))
    time_s = prepared.constant.motion.total_s
    assert time_s > 5_000.0
    planned = float(prepared.problem.critical_power_w[0])
    assert planned == pytest.approx(300.0 - 21.0 * math.log(time_s / 1800.0), abs=0.02)


def test_without_a_decline_critical_power_stays(make_race: Callable[..., Any]) -> None:
    race = make_race(np.zeros(2000), cell_m=20.0, rider__long_decline_w=0.0)
    assert float(prepare(race).problem.critical_power_w[0]) == 300.0
