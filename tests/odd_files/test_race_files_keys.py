"""Race files whose keys cannot be used: the exact message, and the status it leads to."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from pacing.errors import CannotBeRiddenError, PacingError, UnusableInputError
from pacing.race import check as checking
from pacing.race import load_race

Write = Callable[..., Path]

MASS = "rider.mass_kg: {}; expected a number from 25 to 200."
CDA = "expected a number from 0.05 to 1.5 or a table { yaw_deg = [...], m2 = [...] }"
CLOCK = 'plan.start: {}; expected a clock such as "09:30".'
OPTION = '[[options]]\nname = "x"\n'
HOURS = '[[air.hours]]\nat = "09:00"\n[[air.hours]]\nat = "10:00"\n'

# What is put in place of what, the line told (None: none), the message after the file.
VALUES = {
    "infinite": ("= 72.0", "= inf", 5, MASS.format("inf (not a finite number)")),
    "minus infinite": ("= 72.0", "= -inf", 5, MASS.format("-inf (not a finite number)")),
    "not a number": ("= 72.0", "= nan", 5, MASS.format("nan (not a finite number)")),
    "too large for a float": ("= 72.0", "= 1e999", 5, MASS.format("inf (not a finite number)")),
    "out of range": ("= 72.0", "= 7200", 5, MASS.format("7200 is out of range")),
    "negative": ("= 72.0", "= -72", 5, MASS.format("-72 is out of range")),
    "a huge integer": (
        "= 72.0",
        "= " + "9" * 400,
        5,
        MASS.format("a whole number of some 401 digits is out of range"),
    ),
    "a huge hexadecimal": (
        "= 72.0",
        "= 0x" + "f" * 9000,
        5,
        MASS.format("a whole number of some 10838 digits is out of range"),
    ),
    "a flag": ("= 72.0", "= true", 5, MASS.format("true")),
    "quoted": (
        "= 72.0",
        '= "72"',
        5,
        MASS.format('the text "72"') + " Write the number without quotes.",
    ),
    "a list": ("= 72.0", "= [72]", 5, MASS.format("a list of 1")),
    "a date": ("= 72.0", "= 2020-01-01", 5, MASS.format("the date or time 2020-01-01")),
    "a table": ("mass_kg = 72.0", "mass_kg = { a = 1 }", 5, MASS.format("a table")),
    "a fraction of a lap": (
        "[rider]",
        "laps = 1.5\n[rider]",
        4,
        "course.laps: 1.5; expected a whole number from 1 to 200.",
    ),
    "no lap": (
        "[rider]",
        "laps = 0\n[rider]",
        4,
        "course.laps: 0 is out of range; expected a whole number from 1 to 200.",
    ),
    "a number for a flag": (
        "[rider]",
        "reverse = 1\n[rider]",
        4,
        "course.reverse: 1; expected true or false.",
    ),
    "no such choice": (
        "[rider]",
        'surface = "smoth"\n[rider]',
        4,
        'course.surface: the text "smoth"; expected one of "smooth", "average", "coarse". '
        "Did you mean smooth?",
    ),
    "an empty path": (
        '"course.gpx"',
        '""',
        2,
        "course.file: an empty text; expected a path in quotes.",
    ),
    "a path with a nul": (
        "course.gpx",
        "a\\u0000b",
        2,
        'course.file: the text "a\\x00b"; expected text in one line.',
    ),
    "a name with a terminal's escape": (
        "aero bars",
        "a\\u001b[31m",
        10,
        'rider.positions[0].name: the text "a\\x1b[31m"; expected text in one line.',
    ),
    "a name without end": (
        "aero bars",
        "a" * 500_000,
        10,
        "rider.positions[0].name: a text of 500000 characters; expected at most 300.",
    ),
    "a clock with a dot": (
        "[rider]",
        '[plan]\nstart = "9.30"\n[rider]',
        5,
        CLOCK.format('the text "9.30"'),
    ),
    "a clock beyond the day": (
        "[rider]",
        '[plan]\nstart = "24:00"\n[rider]',
        5,
        CLOCK.format('the text "24:00"'),
    ),
    "a clock as a number": ("[rider]", "[plan]\nstart = 930\n[rider]", 5, CLOCK.format("930")),
    "a clock with a date": (
        "[rider]",
        "[plan]\nstart = 2020-01-01T09:30:00\n[rider]",
        5,
        CLOCK.format("the date or time 2020-01-01 09:30:00"),
    ),
    "yaw table: lengths": (
        "0.235",
        "{ yaw_deg = [0, 5], m2 = [0.2] }",
        11,
        "rider.positions[0].cda_m2: 2 angles in yaw_deg and 1 values in m2; "
        "expected as many of one as of the other, at least one.",
    ),
    "yaw table: empty": (
        "0.235",
        "{ yaw_deg = [], m2 = [] }",
        11,
        "rider.positions[0].cda_m2: 0 angles in yaw_deg and 0 values in m2; "
        "expected as many of one as of the other, at least one.",
    ),
    "yaw table: unsorted": (
        "0.235",
        "{ yaw_deg = [0, 5, 3], m2 = [0.2, 0.2, 0.2] }",
        11,
        "rider.positions[0].cda_m2.yaw_deg[2]: 3° after 5°; expected angles that rise.",
    ),
    "yaw table: beyond 90°": (
        "0.235",
        "{ yaw_deg = [0, 100], m2 = [0.2, 0.2] }",
        11,
        "rider.positions[0].cda_m2.yaw_deg[1]: 100 is out of range; "
        "expected a number from 0 to 90.",
    ),
    "yaw table: not finite": (
        "0.235",
        "{ yaw_deg = [0, 5], m2 = [0.2, nan] }",
        11,
        "rider.positions[0].cda_m2.m2[1]: nan (not a finite number); "
        "expected a number from 0.05 to 1.5.",
    ),
    "yaw table: a column too few": (
        "0.235",
        "{ yaw_deg = [0] }",
        11,
        f"rider.positions[0].cda_m2.m2: missing; {CDA}.",
    ),
    "yaw table: unknown column": (
        "0.235",
        "{ yaw_deg = [0], cda_m2 = [0.2] }",
        11,
        f"rider.positions[0].cda_m2.cda_m2: unknown key; {CDA}. Did you mean m2?",
    ),
}

KEYS = {
    "unknown key": (
        "mass_kg = 72",
        "mas_kg = 72",
        5,
        "rider.mas_kg: unknown key. Did you mean mass_kg?",
    ),
    "a key of another table": (
        "crr =",
        "critical_power_w = 300\ncrr =",
        15,
        "bike.critical_power_w: unknown key. Did you mean rider.critical_power_w?",
    ),
    "unknown table": ("[air]", "[airs]", 17, "airs: unknown table. Did you mean air?"),
    "unknown key outside tables": (
        "[course]",
        "lap = 1\n[course]",
        1,
        "lap: unknown key. Did you mean course.laps?",
    ),
    "an unknown key with a terminal's escape": (
        "mass_kg = 72",
        '"\\u001b[31mmass" = 72',
        5,
        'rider."\\x1b[31mmass": unknown key. Did you mean mass_kg?',
    ),
    "unknown key of a list entry": (
        "cda_m2",
        "cda",
        11,
        "rider.positions[0].cda: unknown key. Did you mean cda_m2?",
    ),
    "missing key": (
        "mass_kg = 72.0\n",
        "",
        4,
        MASS.format("missing") + " Add mass_kg = … under [rider].",
    ),
    "missing pressure": (
        "pressure_hpa = 1016.0\n",
        "",
        17,
        "air.pressure_hpa: missing; expected a number from 870 to 1090. "
        "Add pressure_hpa = … under [air].",
    ),
    "missing wind direction": (
        "wind_from_deg = 240.0\n",
        "",
        17,
        "air.wind_from_deg: missing; expected a number from 0 to 360. "
        "Add wind_from_deg = … under [air].",
    ),
    "missing position": (
        '[[rider.positions]]\nname = "aero bars"\ncda_m2 = 0.235\n',
        "",
        4,
        f"rider.positions[0].cda_m2: missing; {CDA}. Add cda_m2 = … under [[rider.positions]].",
    ),
    "missing course": (
        '[course]\nfile = "course.gpx"\n',
        "",
        None,
        "course.file: missing; expected a path in quotes. Add file = … under [course].",
    ),
    "a table that is text": (
        '[course]\nfile = "course.gpx"',
        'course = "course.gpx"',
        1,
        'course: the text "course.gpx"; expected a table [course].',
    ),
    "a list that is a table": (
        "[[rider.positions]]",
        "[rider.positions]",
        9,
        "rider.positions: a table; expected tables, each under [[rider.positions]].",
    ),
    "a list of numbers for tables": (
        "[rider]",
        "slow_points = [1]\n[rider]",
        4,
        "course.slow_points[0]: 1; expected tables, each under [[course.slow_points]].",
    ),
    "no such course": (
        "course.gpx",
        "curse.gpx",
        2,
        "course.file: no such file: {folder}/curse.gpx; expected a GPX or CSV course file.",
    ),
    "no such rider's file": (
        "[rider]",
        '[rider]\nfile = "anna.toml"',
        5,
        "rider.file: no such file: {folder}/anna.toml; "
        "expected a file with the keys of [rider] (TOML).",
    ),
    "a slow point off the road": (
        "[rider]",
        "[[course.slow_points]]\nat_km = 99\nspeed_kmh = 10\n[rider]",
        5,
        "course.slow_points[0].at_km: 99; expected a place on the road, 0 to 2.98 km.",
    ),
    "a stretch that ends before it starts": (
        "[rider]",
        "[[course.stretches]]\nfrom_km = 2\nto_km = 1\n[rider]",
        6,
        "course.stretches[0].to_km: 1 after from_km 2; expected more than 2.",
    ),
}

TOGETHER = {
    "station pressure without its height": (
        "pressure_hpa = 1016.0",
        "station_pressure_hpa = 1000",
        17,
        "air.station_height_m: missing; expected the station's height in metres.",
    ),
    "a station's height alone": (
        "pressure_hpa = 1016.0",
        "pressure_hpa = 1016.0\nstation_height_m = 3",
        20,
        "air.station_height_m: given without station_pressure_hpa; expected both or neither.",
    ),
    "both kinds of pressure": (
        "pressure_hpa = 1016.0",
        "pressure_hpa = 1016.0\nstation_pressure_hpa = 1000\nstation_height_m = 3",
        20,
        "air.station_pressure_hpa: given beside pressure_hpa; expected one of the two. "
        "Keep the one at mean sea level, or the station's with its height.",
    ),
    "bearings in words and numbers": (
        "crr =",
        'bearing_drag = "packed"\nbearing_n = 0.1\nbearing_n_per_m_s = 0.01\ncrr =',
        15,
        "bike.bearing_drag: given beside bearing_n and bearing_n_per_m_s; "
        "expected either the words or the two numbers.",
    ),
    "half of the bearings": (
        "crr =",
        "bearing_n = 0.1\ncrr =",
        13,
        "bike.bearing_n_per_m_s: missing; expected a number, since bearing_n is given.",
    ),
    "three parameters, two given": (
        "w_prime_kj",
        'fit_form = "three-parameter"\nw_prime_kj',
        4,
        "rider.peak_power_w: missing; expected the third parameter of the fit.",
    ),
    "a peak below critical power": (
        "w_prime_kj",
        "peak_power_w = 300\nw_prime_kj",
        7,
        "rider.peak_power_w: 300; expected more than critical_power_w 304.",
    ),
    "an unknown tested position": (
        "w_prime_kj",
        'tested_position = "hoods"\nw_prime_kj',
        7,
        'rider.tested_position: no position is called "hoods"; expected one of "aero bars".',
    ),
    "a share in the tested position": (
        "cda_m2",
        "power_share = 0.9\ncda_m2",
        11,
        "rider.positions[0].power_share: 0.9 in the position that critical power was tested in; "
        "expected 1. Name the other position in rider.tested_position, or leave power_share out.",
    ),
    "a floor above the cap": (
        "[bike]",
        "[plan]\nmin_power_w = 300\nmax_power_w = 250\n[bike]",
        14,
        "plan.min_power_w: 300 is above max_power_w 250; expected at most 250.",
    ),
    "hours without a start": (
        "[bike]",
        HOURS + "[bike]",
        None,
        'plan.start: missing; expected a clock such as "09:30", since air.hours depends on it.',
    ),
    "hours out of order": (
        "[bike]",
        HOURS.replace("10:00", "08:00") + "[bike]",
        16,
        "air.hours[1].at: 08:00 after 09:00; expected hours in the order of the clock.",
    ),
}

NOT_BUILT = {
    "a stated risk": (
        "[bike]",
        "[plan]\nrisk_pct = 10\n[bike]",
        14,
        "plan.risk_pct: planning to a stated risk of running out of W′ is not built. "
        "Leave it out for now.",
    ),
    "imperial units": (
        "[bike]",
        '[plan]\nunits = "imperial"\n[bike]',
        14,
        "plan.units: printing in miles and feet is not built. Leave it out for now.",
    ),
}

OPTIONS = {
    "changes nothing": (
        OPTION,
        23,
        "options[0]: changes nothing; expected a key of the race, such as bike.crr.",
    ),
    "no name": (
        "[[options]]\nbike.crr = 0.003\n",
        23,
        "options[0].name: missing; expected text in quotes.",
    ),
    "a name twice": (
        OPTION + "bike.crr = 0.003\n" + OPTION + "bike.crr = 0.0031\n",
        27,
        'options[1].name: "x" a second time; expected a name of its own.',
    ),
    "one table": (
        '[options]\nname = "x"\n',
        23,
        "options: a table; expected tables, each under [[options]], at most 500.",
    ),
    "an unknown key": (
        OPTION + "bike.crrr = 0.003\n",
        25,
        "options[0].bike.crrr: unknown key. Did you mean crr?",
    ),
    "an unknown entry": (
        OPTION + "rider.positions.hoods.cda_m2 = 0.3\n",
        25,
        'options[0].rider.positions.hoods.cda_m2: no entry is called "hoods"; '
        'expected one of "aero bars".',
    ),
    "out of range": (
        OPTION + 'bike.crr = "-300 %"\n',
        25,
        "options[0].bike.crr: -0.008 is out of range; expected a number from 0.0005 to 0.03.",
    ),
    "a change without a sign": (
        OPTION + 'bike.crr = "3 %"\n',
        25,
        'options[0].bike.crr: the text "3 %"; expected a number from 0.0005 to 0.03, '
        'or a change such as "-0.004" or "-3 %".',
    ),
    "not finite": (
        OPTION + "bike.crr = nan\n",
        25,
        "options[0].bike.crr: nan (not a finite number); expected a number from 0.0005 to 0.03.",
    ),
    "a table that cannot be": (
        OPTION + "bike.cda_by_yaw = { yaw_deg = [0, 5], delta_m2 = [-0.001] }\n",
        25,
        "options[0].bike.cda_by_yaw: 2 angles in yaw_deg and 1 values in delta_m2; "
        "expected as many of one as of the other, at least one.",
    ),
    "what is not built": (
        OPTION + "plan.risk_pct = 5\n",
        25,
        "options[0].plan.risk_pct: planning to a stated risk of running out of W′ is not built. "
        "Leave it out for now.",
    ),
}

REPLACED = VALUES | KEYS | TOGETHER | NOT_BUILT
UNCERTAIN = '[uncertainty]\ncda_pct = "2"\n'


def refused(file: Path, kind: type[PacingError], line: int | None, message: str) -> None:
    with pytest.raises(kind) as found:
        load_race(file)
    place = str(file) if line is None else f"{file}, line {line}"
    assert str(found.value) == f"{place}: {message.replace('{folder}', str(file.parent))}"


@pytest.mark.parametrize("case", REPLACED)
def test_a_key_that_cannot_be_used_is_named(write_race: Write, small_race: str, case: str) -> None:
    old, new, line, message = REPLACED[case]
    assert old in small_race
    refused(write_race(small_race.replace(old, new, 1)), UnusableInputError, line, message)
    assert UnusableInputError.exit_status == 2


@pytest.mark.parametrize("case", OPTIONS)
def test_an_option_that_cannot_be_is_named(write_race: Write, small_race: str, case: str) -> None:
    text, line, message = OPTIONS[case]
    refused(write_race(small_race + text), UnusableInputError, line, message)


def test_a_reserve_above_w_prime_cannot_be_ridden(write_race: Write, small_race: str) -> None:
    refused(
        write_race(small_race + "[plan]\nreserve_kj = 19\n"),
        CannotBeRiddenError,
        24,
        "plan.reserve_kj: 19 kJ cannot be kept: W′ is 18 kJ from the start; expected at most 18.",
    )
    assert CannotBeRiddenError.exit_status == 1


def test_a_wrong_key_of_another_file_is_told_with_that_file(
    write_race: Write, small_race: str
) -> None:
    bike = small_race[small_race.index("[bike]") : small_race.index("[air]")]
    other = write_race("mass_kg = 8.6\ncrr = 4\n", "bike.toml")
    with pytest.raises(UnusableInputError) as found:
        load_race(write_race(small_race.replace(bike, '[bike]\nfile = "bike.toml"\n')))
    assert str(found.value) == (
        f"{other}, line 2: bike.crr: 4 is out of range; expected a number from 0.0005 to 0.03."
    )


def test_a_file_cannot_name_another(write_race: Write, small_race: str) -> None:
    other = write_race('mass_kg = 8.6\nfile = "b.toml"\n', "bike.toml")
    with pytest.raises(UnusableInputError) as found:
        load_race(write_race(small_race.replace("[bike]\n", '[bike]\nfile = "bike.toml"\n')))
    assert str(found.value) == (
        f"{other}, line 2: file: a file named by a file; expected the keys themselves."
    )


def test_a_wrong_value_on_the_command_line_is_told_as_such(write_race: Write) -> None:
    with pytest.raises(UnusableInputError) as found:
        load_race(write_race(), cues=0)
    assert str(found.value) == ("--cues: 0 is out of range; expected a whole number from 1 to 200.")
    with pytest.raises(UnusableInputError) as found:
        load_race(write_race(), start="half ten")
    assert str(found.value) == ('--start: the text "half ten"; expected a clock such as "09:30".')


def test_two_positions_of_one_name_are_refused(
    write_race: Write, small_race: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(checking, "NOT_YET", ())
    text = small_race + '[[rider.positions]]\nname = "aero bars"\ncda_m2 = 0.3\n'
    refused(
        write_race(text),
        UnusableInputError,
        24,
        'rider.positions[1].name: "aero bars" a second time; '
        "expected a name of its own for every position.",
    )


def test_an_uncertainty_that_cannot_be_is_named(write_race: Write, small_race: str) -> None:
    refused(
        write_race(small_race + UNCERTAIN),
        UnusableInputError,
        24,
        'uncertainty.cda_pct: the text "2"; expected a number from 0 to 30. '
        "Write the number without quotes.",
    )
