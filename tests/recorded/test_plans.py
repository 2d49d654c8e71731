"""Plans on recorded courses: they end in a plan, and the numbers make sense to a racer.

Bounds on speeds are common practice, no source: a club rider of 300 W and 72 kg climbs 6 % at
some 16 km/h and averages 35 to 43 km/h on rolling roads with aero bars.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from pacing import load_race
from pacing.plan import plan_race

RACE = """\
[course]
file = "{course}"

[rider]
mass_kg = 72.0
critical_power_w = {critical_power_w}
w_prime_kj = 18.0

[[rider.positions]]
name = "aero bars"
cda_m2 = {cda_m2}

[bike]
mass_kg = 8.5
crr = 0.0042

[air]
temperature_c = 18.0
pressure_hpa = 1013.0
wind_speed_m_s = 3.0
wind_from_deg = 250.0

[plan]
max_cues = {cues}
shortest_cue_s = {shortest_s}
"""

# file: km, critical power, drag area, cues, slowest and fastest mean speed
COURSES: dict[str, tuple[float, float, float, int, float, float]] = {
    "ridge_climb_48km_no_time": (48.3, 300.0, 0.27, 24, 26.0, 34.0),
    "rolling_170km": (170.3, 270.0, 0.27, 40, 33.0, 40.0),
    "flat_coast_175km": (174.7, 270.0, 0.27, 40, 33.0, 41.0),
    "valley_167km_duplicates": (167.3, 270.0, 0.27, 40, 31.0, 39.0),
}
QUICK = "ridge_climb_48km_no_time"
ALL = [pytest.param(name, marks=[] if name == QUICK else [pytest.mark.slow]) for name in COURSES]


@pytest.fixture(scope="module")
def plan_of(
    recorded_courses: Path, tmp_path_factory: pytest.TempPathFactory
) -> Callable[[str], Any]:
    @cache
    def plan(name: str) -> Any:
        _, critical_power_w, cda_m2, cues, _, _ = COURSES[name]
        file = tmp_path_factory.mktemp(name) / "race.toml"
        file.write_text(
            RACE.format(
                course=(recorded_courses / f"{name}.gpx").as_posix(),
                critical_power_w=critical_power_w,
                cda_m2=cda_m2,
                cues=cues,
                shortest_s=60.0 if COURSES[name][0] > 60.0 else 30.0,
            ),
            encoding="utf-8",
        )
        return plan_race(load_race(file))

    return plan


def column(plan: Any, name: str) -> Any:
    return plan.trace[name].to_numpy(dtype=float)


@pytest.mark.parametrize("name", ALL)
def test_the_length_and_the_mean_speed_are_a_racers(
    plan_of: Callable[[str], Any], name: str
) -> None:
    km, _, _, _, slowest, fastest = COURSES[name]
    plan = plan_of(name)
    assert plan.race.course.length_m / 1000.0 == pytest.approx(km, rel=0.01)
    assert slowest < 3.6 * plan.race.course.length_m / plan.time_s < fastest


@pytest.mark.parametrize("name", ALL)
def test_the_gain_over_constant_power_is_between_0_and_4_percent(
    plan_of: Callable[[str], Any], name: str
) -> None:
    plan = plan_of(name)
    gain_pct = 100.0 * (1.0 - plan.time_s / plan.constant["time_s"])
    assert 0.05 < gain_pct < 4.0


@pytest.mark.parametrize("name", ALL)
def test_the_reserve_holds_and_is_used(plan_of: Callable[[str], Any], name: str) -> None:
    plan = plan_of(name)
    left = column(plan, "w_balance_to_j")
    assert left.min() >= 2_500.0 - 1e-6
    assert left.min() < 3_200.0
    assert left[-1] < 6_000.0


@pytest.mark.parametrize("name", ALL)
def test_cues_are_few_long_enough_and_in_whole_steps(
    plan_of: Callable[[str], Any], name: str
) -> None:
    plan = plan_of(name)
    assert len(plan.cues) <= plan.race.plan.max_cues
    assert plan.cues["time_s"].min() >= plan.race.plan.shortest_cue_s - 1e-6
    assert set(plan.cues["power_w"] % 5.0) == {0.0}


@pytest.mark.parametrize("name", ALL)
def test_speeds_on_climbs_and_descents_are_a_racers(
    plan_of: Callable[[str], Any], name: str
) -> None:
    plan = plan_of(name)
    metres = np.cumsum(column(plan, "to_m") - column(plan, "from_m"))
    seconds = np.cumsum(column(plan, "time_s"))
    # windows of half a kilometre
    edges = np.searchsorted(metres, np.arange(0.0, metres[-1], 500.0))
    kmh = 3.6 * np.diff(metres[edges]) / np.diff(seconds[edges])
    climb = np.diff(plan.trace["elevation_m"].to_numpy()[edges]) / np.diff(metres[edges])
    assert kmh.min() > 7.0
    assert kmh.max() < 70.5
    for low, high, slowest, fastest in (
        (0.055, 0.065, 13.0, 24.0),
        (0.02, 0.03, 20.0, 42.0),
        (-0.005, 0.005, 26.0, 52.0),
        (-0.045, -0.035, 35.0, 70.5),
    ):
        there = kmh[1:][(climb[1:] > low) & (climb[1:] < high)]
        if there.size > 3:
            assert slowest < np.median(there) < fastest, (low, high)


@pytest.mark.parametrize("name", ALL)
def test_climbs_are_ridden_harder_than_descents(plan_of: Callable[[str], Any], name: str) -> None:
    plan = plan_of(name)
    gradient, time = column(plan, "gradient"), column(plan, "time_s")
    power = column(plan, "power_w")

    def mean_w(where: Any) -> float:
        return float(power[where] @ time[where] / time[where].sum())

    assert mean_w(gradient > 0.02) > mean_w(gradient < -0.02) + 5.0


@pytest.mark.parametrize("name", ALL)
def test_critical_power_is_planned_for_the_hours_it_takes(
    plan_of: Callable[[str], Any], name: str
) -> None:
    # Source: puchowicz-2020, CP − 0.07 CP ln(T/1800 s)
    plan = plan_of(name)
    expected = COURSES[name][1] * (1.0 - 0.07 * np.log(plan.time_s / 1800.0))
    assert plan.inputs["model"]["critical_power_w"] == pytest.approx(expected, abs=0.2)


@pytest.mark.parametrize("name", ALL)
def test_the_printed_plan_is_close_to_power_free_in_every_cell(
    plan_of: Callable[[str], Any], name: str
) -> None:
    assert -0.02 <= plan_of(name).solver["gap_pct"] < 1.0
