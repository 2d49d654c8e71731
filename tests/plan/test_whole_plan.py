"""What every plan promises: as printed it can be ridden, and it adds up."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.plan import plan_race


def cells(plan: Any, name: str) -> Any:
    return plan.trace[name].to_numpy(dtype=float)


def test_w_left_never_falls_below_the_reserve_as_printed(plan: Any) -> None:
    reserve = plan.inputs["model"]["reserve_j"]
    assert cells(plan, "w_balance_to_j").min() >= reserve - 1e-6


def test_printed_powers_are_whole_steps_within_bounds(plan: Any) -> None:
    step, model = plan.race.plan.power_step_w, plan.inputs["model"]
    factor = plan.race.rider.power_meter_factor
    shown = plan.cues["power_w"].to_numpy()
    assert shown == pytest.approx(np.round(shown / step) * step, abs=1e-6)
    assert np.all(shown * factor >= model["min_power_w"] - 1e-6)
    assert np.all(shown * factor <= model["max_power_w"] + 1e-6)


def test_the_trace_is_the_ride_of_the_printed_cues(plan: Any) -> None:
    factor = plan.race.rider.power_meter_factor
    cue = np.searchsorted(plan.cues["from_m"], cells(plan, "from_m") + 1e-6, side="right") - 1
    printed = plan.cues["power_w"].to_numpy()[cue] * factor
    assert cells(plan, "target_w") == pytest.approx(printed, abs=1e-5)


def test_the_first_half_minute_keeps_its_cap(plan: Any) -> None:
    clock = np.cumsum(cells(plan, "time_s")) - cells(plan, "time_s")
    early = cells(plan, "target_w")[clock < 30.0]
    assert early.max() <= plan.inputs["model"]["first_30_s_max_w"] + 1e-6
    assert plan.inputs["model"]["first_30_s_max_w"] == pytest.approx(1.3 * 300.0)


def test_no_more_cues_than_wanted_and_none_too_short(plan: Any) -> None:
    settings = plan.race.plan
    assert 1 <= len(plan.cues) <= settings.max_cues
    assert plan.cues["time_s"].min() >= settings.shortest_cue_s - 1e-6


def test_cues_follow_on_each_other_from_start_to_finish(plan: Any) -> None:
    cues = plan.cues
    assert cues["from_m"].iloc[0] == 0.0
    assert cues["to_m"].iloc[-1] == pytest.approx(plan.race.course.length_m)
    assert np.array_equal(cues["from_m"].to_numpy()[1:], cues["to_m"].to_numpy()[:-1])
    assert np.all(np.diff(cues["power_w"]) != 0.0)


def test_all_times_add_up_to_the_time(plan: Any) -> None:
    assert cells(plan, "time_s").sum() == pytest.approx(plan.time_s, abs=1e-9)
    assert plan.cues["time_s"].sum() == pytest.approx(plan.time_s, abs=1e-6)
    assert plan.splits["elapsed_s"].iloc[-1] == pytest.approx(plan.time_s, abs=1e-6)
    assert np.all(np.diff(plan.splits["elapsed_s"]) > 0.0)
    speed = (plan.cues["to_m"] - plan.cues["from_m"]) / plan.cues["time_s"]
    assert plan.cues["speed_kmh"].to_numpy() == pytest.approx(3.6 * speed.to_numpy())


def test_the_planned_power_above_critical_is_paid_from_w_prime_at_every_moment(
    plan: Any,
) -> None:
    """Mean P/share <= CP + (W′ start − W′ end)/T for every stretch: recovery is capped."""
    model, left = plan.inputs["model"], cells(plan, "w_balance_to_j")
    left = np.concatenate([[model["w_prime_j"]], left])
    excess = cells(plan, "power_w") / cells(plan, "power_share") - cells(plan, "critical_power_w")
    assert np.max(excess * cells(plan, "time_s") + np.diff(left)) < 1e-6


def test_brakes_are_never_heated_by_pedalling(plan: Any) -> None:
    assert np.max(np.minimum(cells(plan, "braking_n"), cells(plan, "power_w"))) < 1e-6
    assert np.all(cells(plan, "power_w") <= cells(plan, "target_w") + 1e-9)


def test_no_speed_limit_is_passed(plan: Any) -> None:
    limit = cells(plan, "speed_limit_to_m_s")
    assert np.all(cells(plan, "speed_to_m_s") <= limit + 1e-9)


def test_the_critical_power_planned_with_belongs_to_the_time_found(plan: Any) -> None:
    # Source: puchowicz-2020, CP − A ln(T/1800 s) beyond half an hour
    rider = plan.race.rider
    beyond = max(plan.time_s / 1800.0, 1.0)
    expected = rider.critical_power_w - rider.long_decline_w * math.log(beyond)
    assert plan.inputs["model"]["critical_power_w"] == pytest.approx(expected, abs=0.1)


def test_the_gain_over_constant_power_is_one_that_is_seen_in_racing(plan: Any) -> None:
    # 0.3 to 3.2 % in published courses (sources at tests/published/test_gain_bands.py)
    gain_pct = 100.0 * (1.0 - plan.time_s / plan.constant["time_s"])
    assert -0.15 < gain_pct < 4.0


def test_rounding_and_placing_cost_little(plan: Any) -> None:
    lost_pct = 100.0 * (plan.time_s / plan.solver["unrounded_time_s"] - 1.0)
    assert -0.02 < lost_pct < 0.35


def test_energy_over_the_whole_trace_adds_up(plan: Any) -> None:
    """Work in against climbing, tyres, bearings, air, brakes and speed, by the trace alone."""
    model = plan.inputs["model"]
    length = cells(plan, "to_m") - cells(plan, "from_m")
    cosine = 1.0 / np.sqrt(1.0 + cells(plan, "gradient") ** 2)
    weight = model["mass_kg"] * model["gravity_m_s2"]
    steady = weight * cosine * (cells(plan, "gradient") + cells(plan, "crr")) + model["bearing_n"]

    def resistance(speed: Any) -> Any:
        along = speed + cells(plan, "wind_along_m_s")
        flow = np.hypot(along, cells(plan, "wind_across_m_s"))
        air = 0.5 * cells(plan, "air_density_kg_m3") * cells(plan, "cda_m2") * flow * along
        return steady + model["bearing_n_per_m_s"] * speed + air

    v0, v1 = cells(plan, "speed_from_m_s"), cells(plan, "speed_to_m_s")
    against = 0.5 * (resistance(v0) + resistance(v1)) + cells(plan, "braking_n")
    gained = 0.5 * model["effective_mass_kg"] * (v1[-1] ** 2 - v0[0] ** 2)
    work = float((cells(plan, "efficiency") * cells(plan, "power_w")) @ cells(plan, "time_s"))
    # one drag area a cell, at its middle's yaw, stands for those at its ends
    assert work == pytest.approx(float(against @ length) + gained, rel=2e-5)


@pytest.mark.parametrize("name", ["rolling", "slow places"])
def test_the_same_race_twice_gives_the_same_bytes(
    race_named: Callable[[str], Any], plan_named: Callable[[str], Any], name: str
) -> None:
    again, before = plan_race(race_named(name)), plan_named(name)
    assert again.cues.to_csv().encode() == before.cues.to_csv().encode()
    assert again.trace.to_csv().encode() == before.trace.to_csv().encode()


def test_the_plan_is_plain_json_with_every_promised_key(plan: Any) -> None:
    document = plan.to_json_dict()
    assert document["schema"] == "plan/1"
    for key in ("time_s", "cues", "pieces", "splits", "sensitivities", "solver", "inputs"):
        assert key in document
    solver = (
        "method", "status", "iterations", "evaluations", "seconds", "pieces", "kkt_residual",
        "free_time_s", "unrounded_time_s", "gap_pct", "cutting_pct", "rounding_pct",
        "placing_pct",
    )  # fmt: skip
    assert set(solver) <= set(document["solver"])
    columns = (
        "from_m", "to_m", "lat_deg", "lon_deg", "elevation_m", "gradient", "heading_deg",
        "air_density_kg_m3", "wind_along_m_s", "wind_across_m_s", "crr", "position",
        "power_share", "critical_power_w", "efficiency", "cda_m2", "speed_limit_from_m_s",
        "speed_limit_to_m_s", "target_w", "power_w", "braking_n", "speed_from_m_s",
        "speed_to_m_s", "time_s", "w_balance_to_j",
    )  # fmt: skip
    assert tuple(plan.trace.columns[: len(columns)]) == columns
