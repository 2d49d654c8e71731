"""From a race file to a Race: what is read, merged, and filled in.

Where no source is named the expectation is the interface as the README states it.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from pacing.race import load_race
from pacing.race.build import build
from pacing.race.origin import Origins

Write = Callable[..., Path]


def test_the_required_keys_alone_make_a_race_with_every_default(
    write_race: Write, small_race: str
) -> None:
    race = load_race(write_race(small_race))
    rider, bike, plan = race.rider, race.bike, race.plan
    assert race.cautions == ()
    assert (rider.mass_kg, rider.kit_mass_kg, rider.critical_power_w) == (72.0, 2.0, 304.0)
    assert (rider.w_prime_j, rider.fit_form, rider.recovery_law) == (
        18000.0,
        "two-parameter",
        "two-phase",
    )
    assert rider.long_decline_w == pytest.approx(0.07 * 304.0)
    assert (rider.tested_position, rider.peak_power_w) == ("aero bars", None)
    assert rider.max_speed_m_s == pytest.approx(70.0 / 3.6)
    assert (bike.drivetrain_efficiency, bike.power_measured_at) == (0.976, "crank")
    assert (bike.bearing_n, bike.bearing_n_per_m_s) == (0.091, 0.0087)
    assert (bike.wheel_rotation_m2, bike.wheel_inertia_kg_m2, bike.top_gear) == (0.0, 0.14, None)
    assert (plan.reserve_j, plan.max_cues, plan.shortest_cue_s, plan.power_step_w) == (
        2500.0,
        16,
        30.0,
        5,
    )
    assert plan.first_30_s_max_w == pytest.approx(1.3 * 304.0)
    assert (plan.dry, plan.units, plan.start_speed_m_s, plan.min_power_w) == (
        True,
        "metric",
        0.0,
        0.0,
    )
    assert race.uncertainty.wind_at_rider_pct == 20.0
    assert race.inputs["air"]["humidity_pct"] == 60.0
    assert race.inputs["air"]["temperature_height_m"] == pytest.approx(race.course.elevation_m[0])


def test_mass_is_rider_kit_and_bike_and_the_wheels_add_their_inertia(write_race: Write) -> None:
    race = load_race(write_race())
    assert race.mass_kg == pytest.approx(72.0 + 2.0 + 8.6)
    radius_m = 2.10 / (2.0 * 3.141592653589793)
    assert race.effective_mass_kg == pytest.approx(82.6 + 0.14 / radius_m**2)


def test_power_is_capped_at_what_can_be_held_for_three_minutes(
    write_race: Write, small_race: str
) -> None:
    # Simpson & Kordi 2017, IJSPP 12:825, group means: 387 W for 180 s with CP 283.0 W and
    # W′ 18,720 J.
    text = small_race.replace("304.0", "283.0").replace("18.0\n\n[[", "18.72\n\n[[")
    assert load_race(write_race(text)).plan.max_power_w == pytest.approx(387.0, abs=0.05)


def test_the_three_parameter_cap_can_be_held_for_just_three_minutes(
    write_race: Write, small_race: str
) -> None:
    # Morton 1996: t = W′/(P − CP) − W′/(Pmax − CP).
    text = small_race.replace(
        "w_prime_kj = 18.0",
        'w_prime_kj = 18.0\nfit_form = "three-parameter"\npeak_power_w = 900',
    )
    power = load_race(write_race(text)).plan.max_power_w
    assert power is not None
    assert 18000.0 / (power - 304.0) - 18000.0 / (900.0 - 304.0) == pytest.approx(180.0)


def test_the_echo_is_json_and_makes_the_same_race_again(write_race: Write, small_race: str) -> None:
    file = write_race(
        small_race
        + '[[air.hours]]\nat = "09:00"\n[[air.hours]]\nat = 10:00:00\nwind_speed_m_s = 5\n'
        + '[plan]\nstart = "09:30"\n[[options]]\nname = "light"\nbike.mass_kg = "-1"\n'
    )
    race = load_race(file)
    echo = json.loads(json.dumps(race.inputs, allow_nan=False))
    again = build(_without_nulls(echo), Origins(), file=file)
    assert again.inputs == race.inputs
    assert again.plan == race.plan
    assert again.bike == race.bike
    assert again.rider == race.rider
    assert again.day == race.day


def _without_nulls(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _without_nulls(inner) for key, inner in value.items() if inner is not None}
    return [_without_nulls(inner) for inner in value] if isinstance(value, list) else value


def test_a_clock_may_be_text_or_a_toml_time(write_race: Write, small_race: str) -> None:
    clocks = [
        load_race(write_race(f"{small_race}[plan]\nstart = {clock}\n")).plan.start_clock_s
        for clock in ('"09:30"', '"9:30"', "09:30:00")
    ]
    assert clocks == [34200.0] * 3


def test_a_rider_may_live_in_a_file_and_keys_beside_it_override(
    write_race: Write, small_race: str
) -> None:
    rider = small_race[small_race.index("[rider]") : small_race.index("[bike]")]
    Path(write_race(rider.replace("[rider]\n", "").replace("rider.", ""), "anna.toml"))
    race = load_race(
        write_race(small_race.replace(rider, '[rider]\nfile = "anna.toml"\nmass_kg = 65\n'))
    )
    assert (race.rider.mass_kg, race.rider.critical_power_w) == (65.0, 304.0)
    assert race.rider.positions[0].name == "aero bars"
    assert "file" not in race.inputs["rider"]


def test_such_a_file_may_keep_the_name_of_its_table(write_race: Write, small_race: str) -> None:
    bike = small_race[small_race.index("[bike]") : small_race.index("[air]")]
    write_race(bike, "bike.toml")
    race = load_race(write_race(small_race.replace(bike, '[bike]\nfile = "bike.toml"\n')))
    assert race.bike.crr == 0.004


def test_a_pressure_beside_the_file_replaces_the_other_kind(
    write_race: Write, small_race: str
) -> None:
    air = small_race[small_race.index("[air]") :]
    write_race(air, "day.toml")
    beside = '[air]\nfile = "day.toml"\nstation_pressure_hpa = 990\nstation_height_m = 200\n'
    weather = load_race(write_race(small_race.replace(air, beside))).day.weathers[0]
    assert (weather.pressure_pa, weather.pressure_height_m) == (99000.0, 200.0)


def test_paths_are_relative_to_the_file_that_names_them(
    write_race: Write, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    file = write_race()
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    monkeypatch.chdir(elsewhere)
    assert load_race(Path("..") / file.name).course.length_m > 2900.0


def test_a_day_a_start_and_a_number_of_cues_can_stand_in(
    write_race: Write, small_race: str
) -> None:
    day = small_race[small_race.index("[air]") :].replace("18.0", "5.0")
    race = load_race(write_race(), air=write_race(day, "day.toml"), start="14:05", cues=9)
    assert race.day.weathers[0].temperature_k == pytest.approx(278.15)
    assert (race.plan.start_clock_s, race.plan.max_cues) == (50700.0, 9)
    assert race.inputs["plan"]["start"] == "14:05"


def test_hours_take_from_the_air_what_they_do_not_say(write_race: Write, small_race: str) -> None:
    hours = (
        '[[air.hours]]\nat = "09:00"\nwind_speed_m_s = 1\n[[air.hours]]\nat = "11:00"\n'
        'temperature_c = 24\n[plan]\nstart = "10:00"\n'
    )
    first, second = load_race(write_race(small_race + hours)).day.weathers
    assert (first.clock_s, first.wind_speed_m_s, first.temperature_k) == (32400.0, 1.0, 291.15)
    assert (second.clock_s, second.wind_speed_m_s, second.temperature_k) == (39600.0, 3.0, 297.15)


def test_a_wet_road_lowers_the_default_speed_downhill(write_race: Write, small_race: str) -> None:
    race = load_race(write_race(small_race + "[plan]\ndry = false\n"))
    assert race.rider.max_speed_m_s == pytest.approx(65.0 / 3.6)


def test_the_default_reserve_is_at_most_half_of_w_prime(write_race: Write, small_race: str) -> None:
    text = small_race.replace("w_prime_kj = 18.0", "w_prime_kj = 3.0")
    assert load_race(write_race(text)).plan.reserve_j == 1500.0


def test_surroundings_that_are_not_given_are_said_to_be_assumed(
    write_race: Write, small_race: str
) -> None:
    text = small_race.replace('surroundings = "farmland"\n', "")
    assert load_race(write_race(text)).cautions == (
        'Check air.surroundings: not given, so "farmland" (about half the forecast wind).',
    )
    at_the_rider = load_race(write_race(text + "wind_height_m = 2\n"))
    assert at_the_rider.cautions == ()


def test_minus_zero_is_zero(write_race: Write, small_race: str) -> None:
    race = load_race(write_race(small_race.replace("speed_m_s = 3.0", "speed_m_s = -0.0")))
    assert str(race.inputs["air"]["wind_speed_m_s"]) == "0.0"


@pytest.mark.parametrize("mark", ["bom", "windows"])
def test_a_byte_order_mark_and_windows_line_ends_are_read(
    write_race: Write, small_race: str, mark: str
) -> None:
    data = small_race.encode()
    data = b"\xef\xbb\xbf" + data if mark == "bom" else data.replace(b"\n", b"\r\n")
    assert load_race(write_race(data)).rider.mass_kg == 72.0


def test_a_race_cannot_be_changed(write_race: Write) -> None:
    race = load_race(write_race())
    with pytest.raises(AttributeError):
        race.plan.dry = False  # type: ignore[misc]


def test_a_value_at_the_edge_gives_a_caution(write_race: Write, small_race: str) -> None:
    race = load_race(write_race(small_race.replace("= 72.0", "= 130")), cues=90)
    assert race.cautions == (
        "Check rider.mass_kg: 130 is at the edge, 40 to 120 is usual.",
        "Check --cues: 90 is at the edge, 1 to 60 is usual.",
    )
