"""A race with some values replaced."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from pacing.errors import UnusableInputError
from pacing.race import Race, load_race, vary

Write = Callable[..., Path]


@pytest.fixture
def race(write_race: Write, small_race: str) -> Race:
    extra = "[bike]\ntop_gear = 4.9\ncda_by_yaw = { yaw_deg = [0, 10], delta_m2 = [0.0, -0.004] }\n"
    landmark = '[[course.landmarks]]\nat_km = 1\nname = "church"\n\n[rider]'
    text = small_race.replace("[bike]\n", extra).replace("[rider]", landmark)
    return load_race(write_race(text))


def test_a_value_replaces_and_the_rest_stays(race: Race) -> None:
    other = vary(race, {"bike.crr": 0.003})
    assert other.bike.crr == 0.003
    assert other.rider == race.rider
    assert race.bike.crr == 0.004


@pytest.mark.parametrize(
    ("change", "value"),
    [("-0.001", 0.003), ("+0.001", 0.005), ("-3 %", 0.00388), ("+50%", 0.006), ("- 0.001", 0.003)],
)
def test_a_signed_text_changes_the_value(race: Race, change: str, value: float) -> None:
    assert vary(race, {"bike.crr": change}).bike.crr == pytest.approx(value)


def test_an_entry_of_a_list_is_called_by_its_name(race: Race) -> None:
    option = {"name": "low", "rider": {"positions": {"aero bars": {"cda_m2": "-0.010"}}}}
    assert vary(race, option).rider.positions[0].drag_area.m2 == pytest.approx((0.225,))
    dotted = vary(race, {'rider.positions."aero bars".cda_m2': "-0.010"})
    assert dotted.rider == vary(race, option).rider


def test_a_change_to_a_table_by_yaw_changes_each_of_its_values(race: Race) -> None:
    other = vary(race, {"bike.cda_by_yaw": "+0.001"})
    assert other.inputs["bike"]["cda_by_yaw"]["delta_m2"] == pytest.approx([0.001, -0.003])
    assert other.inputs["bike"]["cda_by_yaw"]["yaw_deg"] == [0.0, 10.0]


def test_a_change_to_a_default_counts_from_the_default(race: Race) -> None:
    assert vary(race, {"rider.kit_mass_kg": "-0.5"}).rider.kit_mass_kg == 1.5


def test_defaults_that_follow_from_other_keys_follow_them_again(race: Race) -> None:
    other = vary(race, {"rider.critical_power_w": "+10"})
    assert other.rider.long_decline_w == pytest.approx(0.07 * 314.0)
    assert other.plan.first_30_s_max_w == pytest.approx(1.3 * 314.0)
    assert other.plan.max_power_w == pytest.approx(race.plan.max_power_w + 10.0)


def test_a_wind_turned_past_north_goes_on_from_zero(race: Race) -> None:
    assert vary(race, {"air.wind_from_deg": "+200"}).day.weathers[0].wind_from_deg == 80.0


def test_one_way_of_giving_the_pressure_replaces_the_other(race: Race) -> None:
    other = vary(race, {"air.station_pressure_hpa": 990, "air.station_height_m": 200})
    assert other.day.weathers[0].pressure_pa == 99000.0


def test_the_course_is_read_again_only_when_it_is_touched(
    race: Race, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(*_: object) -> None:
        raise AssertionError("the course was read")

    monkeypatch.setattr("pacing.race.build.load_course", refuse)
    assert vary(race, {"bike.mass_kg": 7}).course is race.course
    with pytest.raises(AssertionError, match="the course was read"):
        vary(race, {"course.surface": "coarse"})


def test_a_landmark_can_be_moved(race: Race) -> None:
    moved = vary(race, {"course.landmarks.church.at_km": "+0.5"})
    assert [mark.at_m for mark in moved.course.landmarks] == [1500.0]


def test_changing_back_gives_the_same_race(race: Race) -> None:
    back = vary(vary(race, {"bike.crr": 0.005}), {"bike.crr": 0.004})
    assert back.inputs == race.inputs
    assert back.bike == race.bike


@pytest.mark.parametrize(
    ("override", "message"),
    [
        ({"bike.crrr": 1}, "bike.crrr: unknown key. Did you mean crr?"),
        ({"wheels.crr": 1}, "wheels.crr: unknown key. Did you mean bike?"),
        (
            {"bike.crr": 2},
            "bike.crr: 2 is out of range; expected a number from 0.0005 to 0.03.",
        ),
        (
            {"bike.crr": "3%"},
            'bike.crr: the text "3%"; expected a number from 0.0005 to 0.03, '
            'or a change such as "-0.004" or "-3 %".',
        ),
        (
            {"rider.positions.hoods.cda_m2": 0.3},
            'rider.positions.hoods.cda_m2: no entry is called "hoods"; '
            'expected one of "aero bars".',
        ),
        (
            {"rider.peak_power_w": "+10"},
            'rider.peak_power_w: a change of "+10" to what is not given; '
            "expected a number from 100 to 3000.",
        ),
        (
            {"bike.file": "b.toml"},
            "bike.file: a file cannot be exchanged; expected the keys themselves.",
        ),
        ({"bike": 1}, "bike: 1; expected the keys of a race below this."),
        ({"bike..crr": 1}, '"bike..crr": not a dotted name; expected a key such as rider.mass_kg.'),
    ],
    ids=lambda part: next(iter(part)) if isinstance(part, dict) else "",
)
def test_an_override_that_cannot_be_is_named(
    race: Race, override: dict[str, Any], message: str
) -> None:
    with pytest.raises(UnusableInputError) as refused:
        vary(race, override)
    assert str(refused.value) == message


def test_options_are_echoed_as_written(write_race: Write, small_race: str) -> None:
    text = small_race + '[[options]]\nname = "light"\nbike.mass_kg = "-1.2"\n'
    race = load_race(write_race(text))
    assert race.options == ({"name": "light", "bike": {"mass_kg": "-1.2"}},)
    assert race.inputs["options"] == list(race.options)
    assert vary(race, race.options[0]).bike.mass_kg == pytest.approx(7.4)
