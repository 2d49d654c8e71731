"""What several keys say together, and the defaults that follow from other keys."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from pacing.air.wind import LOW_HEIGHT_M
from pacing.bike import BEARINGS
from pacing.errors import CannotBeRiddenError
from pacing.race.check import Checked
from pacing.race.lines import Path
from pacing.race.origin import quoted
from pacing.rider import LONG_DECLINE_SHARE
from pacing.rider.power_time import three_parameter_power_w, two_parameter_power_w

FIRST_30_S_SHARE = 1.3
RESERVE_KJ = 2.5
HELD_S = 180.0
MAX_SPEED_DRY_KMH = 70.0
MAX_SPEED_WET_KMH = 65.0


def completed(table: dict[str, Any], checked: Checked) -> dict[str, Any]:
    """The checked ``table`` with every computed default that needs no course.

    Raises `UnusableInputError` where keys contradict each other, `CannotBeRiddenError` for a
    reserve above W′.
    """
    _positions(table["rider"], checked)
    _power(table["rider"], table["plan"], checked)
    _bike(table["bike"], checked)
    _air(table, checked)
    _stretches(table["course"], checked)
    rider, plan = table["rider"], table["plan"]
    if rider["max_speed_kmh"] is None:
        rider["max_speed_kmh"] = MAX_SPEED_DRY_KMH if plan["dry"] else MAX_SPEED_WET_KMH
    return table


def _positions(rider: dict[str, Any], checked: Checked) -> None:
    names: list[str] = []
    for number, position in enumerate(rider["positions"]):
        position["name"] = position["name"] or f"position {number + 1}"
        if position["name"] in names:
            raise checked.origins.error(
                ("rider", "positions", number, "name"),
                f"{quoted(position['name'])} a second time",
                expected="a name of its own for every position",
            )
        names.append(position["name"])
        slowest, fastest = position["min_speed_kmh"], position["max_speed_kmh"]
        if slowest is not None and fastest is not None and fastest <= slowest:
            raise checked.origins.error(
                ("rider", "positions", number, "max_speed_kmh"),
                f"{fastest:g} with min_speed_kmh {slowest:g}",
                expected=f"more than {slowest:g}",
            )
    tested = rider["tested_position"] or names[0]
    if tested not in names:
        raise checked.origins.error(
            ("rider", "tested_position"),
            f"no position is called {quoted(tested)}",
            expected="one of " + ", ".join(quoted(name) for name in names),
        )
    rider["tested_position"] = tested
    share = rider["positions"][names.index(tested)]["power_share"]
    if share != 1.0:
        raise checked.origins.error(
            ("rider", "positions", names.index(tested), "power_share"),
            f"{share:g} in the position that critical power was tested in",
            expected="1",
            mend="name the other position in rider.tested_position, or leave power_share out",
        )


def _power(rider: dict[str, Any], plan: dict[str, Any], checked: Checked) -> None:
    critical, w_prime_kj, peak = (
        rider["critical_power_w"], rider["w_prime_kj"], rider["peak_power_w"]
    )  # fmt: skip
    if rider["fit_form"] == "three-parameter" and peak is None:
        raise checked.origins.error(
            ("rider", "peak_power_w"), "missing", expected="the third parameter of the fit"
        )
    if peak is not None and peak <= critical:
        raise checked.origins.error(
            ("rider", "peak_power_w"),
            f"{peak:g}",
            expected=f"more than critical_power_w {critical:g}",
        )
    if rider["long_decline_w"] is None:
        rider["long_decline_w"] = LONG_DECLINE_SHARE * critical
    if plan["reserve_kj"] is None:
        plan["reserve_kj"] = min(RESERVE_KJ, w_prime_kj / 2.0)
    if plan["reserve_kj"] > w_prime_kj:
        error = checked.origins.error(
            ("plan", "reserve_kj"),
            f"{plan['reserve_kj']:g} kJ cannot be kept: W′ is {w_prime_kj:g} kJ from the start",
            expected=f"at most {w_prime_kj:g}",
        )
        raise CannotBeRiddenError(str(error))
    if plan["max_power_w"] is None:
        plan["max_power_w"] = _held_w(rider)
    if plan["first_30_s_max_w"] is None:
        plan["first_30_s_max_w"] = FIRST_30_S_SHARE * critical
    for name in ("max_power_w", "first_30_s_max_w"):
        if plan[name] < plan["min_power_w"]:
            raise checked.origins.error(
                ("plan", "min_power_w"),
                f"{plan['min_power_w']:g} is above {name} {plan[name]:g}",
                expected=f"at most {plan[name]:g}",
            )


def _held_w(rider: Mapping[str, Any]) -> float:
    """Power that can be held for three minutes, by the rider's own fit."""
    fit = {
        "critical_power_w": rider["critical_power_w"],
        "w_prime_j": rider["w_prime_kj"] * 1000.0,
    }
    peak = rider["peak_power_w"]
    if rider["fit_form"] == "three-parameter":
        return float(three_parameter_power_w(HELD_S, **fit, peak_power_w=peak))
    held = float(two_parameter_power_w(HELD_S, **fit))
    return held if peak is None else min(held, peak)


def _bike(bike: dict[str, Any], checked: Checked) -> None:
    given = checked.given.get("bike", {})
    numbers = [name for name in ("bearing_n", "bearing_n_per_m_s") if given.get(name) is not None]
    words = given.get("bearing_drag")
    if words is not None and (bike["bearing_n"], bike["bearing_n_per_m_s"]) == BEARINGS[words]:
        return
    if numbers and words is not None:
        raise checked.origins.error(
            ("bike", "bearing_drag"),
            f"given beside {' and '.join(numbers)}",
            expected="either the words or the two numbers",
        )
    if len(numbers) == 1:
        other = "bearing_n_per_m_s" if numbers[0] == "bearing_n" else "bearing_n"
        raise checked.origins.error(
            ("bike", other), "missing", expected=f"a number, since {numbers[0]} is given"
        )
    if numbers:
        bike["bearing_drag"] = None
    else:
        bike["bearing_n"], bike["bearing_n_per_m_s"] = BEARINGS[bike["bearing_drag"]]


def _air(table: dict[str, Any], checked: Checked) -> None:
    air, plan = table["air"], table["plan"]
    hours = air["hours"]
    for path, weather in _weathers(air):
        _pressure(weather, path, checked)
    if hours:
        for number in range(1, len(hours)):
            if hours[number]["at"] <= hours[number - 1]["at"]:
                raise checked.origins.error(
                    ("air", "hours", number, "at"),
                    f"{hours[number]['at']} after {hours[number - 1]['at']}",
                    expected="hours in the order of the clock",
                )
        if plan["start"] is None:
            raise checked.origins.error(
                ("plan", "start"),
                "missing",
                expected='a clock such as "09:30", since air.hours depends on it',
            )
    if plan["start"] is None:
        plan["start"] = "00:00"
    path, weather = _weathers(air)[0]
    given = checked.given.get("air", {})
    named = "surroundings" in given or any(
        "surroundings" in hour for hour in given.get("hours", [])
    )
    if not named and weather["wind_speed_m_s"] and weather["wind_height_m"] > LOW_HEIGHT_M:
        checked.caution(
            ("air", "surroundings"), 'not given, so "farmland" (about half the forecast wind)'
        )


def _weathers(air: dict[str, Any]) -> list[tuple[Path, dict[str, Any]]]:
    if not air["hours"]:
        return [(("air",), air)]
    return [(("air", "hours", number), hour) for number, hour in enumerate(air["hours"])]


def _pressure(weather: dict[str, Any], path: Path, checked: Checked) -> None:
    station, height = weather["station_pressure_hpa"], weather["station_height_m"]
    if station is not None and weather["pressure_hpa"] is not None:
        raise checked.origins.error(
            (*path, "station_pressure_hpa"),
            "given beside pressure_hpa",
            expected="one of the two",
            mend="keep the one at mean sea level, or the station's with its height",
        )
    if station is not None and height is None:
        raise checked.origins.error(
            (*path, "station_height_m"), "missing", expected="the station's height in metres"
        )
    if station is None and height is not None:
        raise checked.origins.error(
            (*path, "station_height_m"),
            "given without station_pressure_hpa",
            expected="both or neither",
        )


def _stretches(course: dict[str, Any], checked: Checked) -> None:
    for number, stretch in enumerate(course["stretches"]):
        if stretch["to_km"] <= stretch["from_km"]:
            raise checked.origins.error(
                ("course", "stretches", number, "to_km"),
                f"{stretch['to_km']:g} after from_km {stretch['from_km']:g}",
                expected=f"more than {stretch['from_km']:g}",
            )
    start, end = course["from_km"], course["to_km"]
    if start is not None and end is not None and end <= start:
        raise checked.origins.error(
            ("course", "to_km"), f"{end:g} after from_km {start:g}", expected=f"more than {start:g}"
        )
