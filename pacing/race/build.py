"""From the checked table to a Race, and from a Race to another with some values replaced."""

from __future__ import annotations

import os
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from pacing.air import Day, Weather
from pacing.bike import Bike, DragArea
from pacing.course import load_course
from pacing.course.course import Course, CourseSpec
from pacing.errors import UnusableInputError
from pacing.race.check import Checked
from pacing.race.complete import completed
from pacing.race.option_list import checked_options
from pacing.race.origin import Origins, path_of
from pacing.race.race import PlanSettings, Race, Uncertainty
from pacing.race.value import clock_s
from pacing.rider import Position, Rider
from pacing.units import KMH_PER_M_S, ZERO_CELSIUS_K


def build(
    given: Mapping[str, Any], origins: Origins, *, file: Path, course: Course | None = None
) -> Race:
    """The race of a table as written; ``course`` saves reading it where it is known already.

    Raises as `pacing.race.load_race` does.
    """
    checked = Checked(given, origins)
    table = completed(checked.table(), checked)
    if course is None:
        course = _course(table["course"], file, origins)
    _fill_heights(table["air"], float(course.elevation_m[0]))
    options = checked_options(given, origins, filled=table)
    return Race(
        course=course,
        rider=_rider(table["rider"], origins),
        bike=_bike(table["bike"], origins),
        day=_day(table["air"]),
        plan=_settings(table["plan"]),
        uncertainty=Uncertainty(**table["uncertainty"]),
        options=options,
        inputs=_echo(table, options),
        file=file,
        cautions=(*checked.cautions, *course.report.cautions),
        given=given,
    )


def _course(course: dict[str, Any], file: Path, origins: Origins) -> Course:
    """The course; an error about one of its keys is told as one about the race file."""
    spec = _spec(course, file)
    if not os.path.exists(spec.file):  # noqa: PTH110 - does not raise on a name too long
        raise origins.error(
            ("course", "file"), f"no such file: {spec.file}", expected="a GPX or CSV course file"
        )
    try:
        return load_course(spec)
    except UnusableInputError as problem:
        if problem.file is not None or not problem.key:
            raise
        path = path_of(problem.key.split(",")[0])
        raise origins.error(
            path, problem.found, expected=problem.expected, mend=problem.mend
        ) from None


def _spec(course: dict[str, Any], file: Path) -> CourseSpec:
    keys = dict(course)
    keys["file"] = file.parent / keys["file"]
    keys["ignore_bends_km"] = tuple(keys.pop("ignore_bends"))
    for name in ("slow_points", "stretches", "landmarks"):
        keys[name] = tuple(
            {key: value for key, value in entry.items() if value is not None}
            for entry in keys[name]
        )
    return CourseSpec(**keys)


def _fill_heights(air: dict[str, Any], start_height_m: float) -> None:
    for weather in (air, *air["hours"]):
        if weather["temperature_height_m"] is None:
            weather["temperature_height_m"] = start_height_m


def _rider(rider: dict[str, Any], origins: Origins) -> Rider:
    return Rider(
        mass_kg=rider["mass_kg"],
        kit_mass_kg=rider["kit_mass_kg"],
        critical_power_w=rider["critical_power_w"],
        w_prime_j=rider["w_prime_kj"] * 1000.0,
        positions=tuple(
            _position(position, number, origins)
            for number, position in enumerate(rider["positions"])
        ),
        fit_form=rider["fit_form"],
        peak_power_w=rider["peak_power_w"],
        long_decline_w=rider["long_decline_w"],
        recovery_law=rider["recovery_law"],
        power_meter_factor=rider["power_meter_factor"],
        tested_position=rider["tested_position"],
        max_cadence_rpm=rider["max_cadence_rpm"],
        max_speed_m_s=rider["max_speed_kmh"] / KMH_PER_M_S,
    )


def _position(position: dict[str, Any], number: int, origins: Origins) -> Position:
    area = position["cda_m2"]
    yaw, m2 = (area["yaw_deg"], area["m2"]) if isinstance(area, dict) else ([0.0], [area])
    try:
        drag_area = DragArea.from_convention(yaw, m2, position["cda_convention"])
    except UnusableInputError as problem:
        path = ("rider", "positions", number, "cda_m2")
        raise origins.error(path, problem.found, expected=problem.expected) from None
    slowest, fastest = position["min_speed_kmh"], position["max_speed_kmh"]
    return Position(
        position["name"],
        drag_area,
        position["power_share"],
        min_speed_m_s=None if slowest is None else slowest / KMH_PER_M_S,
        max_speed_m_s=None if fastest is None else fastest / KMH_PER_M_S,
        longest_s=position["longest_s"],
    )


def _bike(bike: dict[str, Any], origins: Origins) -> Bike:
    change = bike["cda_by_yaw"]
    names = (
        "mass_kg", "crr", "drivetrain_efficiency", "power_measured_at", "bearing_n",
        "bearing_n_per_m_s", "wheel_rotation_m2", "wheel_inertia_kg_m2", "top_gear",
        "wheel_circumference_m",
    )  # fmt: skip
    return Bike(
        **{name: bike[name] for name in names},
        cda_by_yaw=change and DragArea(tuple(change["yaw_deg"]), tuple(change["delta_m2"])),
    )


def _day(air: dict[str, Any]) -> Day:
    return Day(tuple(_weather(weather) for weather in air["hours"] or [air]))


def _weather(air: dict[str, Any]) -> Weather:
    at_station = air["station_pressure_hpa"] is not None
    return Weather(
        temperature_k=air["temperature_c"] + ZERO_CELSIUS_K,
        pressure_pa=100.0 * (air["station_pressure_hpa"] if at_station else air["pressure_hpa"]),
        wind_speed_m_s=air["wind_speed_m_s"],
        wind_from_deg=air["wind_from_deg"],
        relative_humidity=air["humidity_pct"] / 100.0,
        temperature_height_m=air["temperature_height_m"],
        pressure_height_m=air["station_height_m"] if at_station else 0.0,
        wind_height_m=air["wind_height_m"],
        surroundings=air["surroundings"],
        clock_s=_seconds(air.get("at", "00:00")),
    )


def _settings(plan: dict[str, Any]) -> PlanSettings:
    keys = dict(plan)
    keys["start_clock_s"] = _seconds(keys.pop("start"))
    keys["reserve_j"] = keys.pop("reserve_kj") * 1000.0
    return PlanSettings(**keys)


def _seconds(clock: str) -> float:
    return clock_s(clock, (), Origins(), "a clock")


def _echo(table: dict[str, Any], options: tuple[Any, ...]) -> dict[str, Any]:
    """The race with every default filled in, in the shape of the race file."""
    echo = {name: dict(section) for name, section in table.items()}
    for name in ("rider", "bike", "air"):
        echo[name].pop("file", None)
    return {**echo, "options": [dict(option) for option in options]}
