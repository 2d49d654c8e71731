"""Numbers and sentences as a person reads them."""

from __future__ import annotations

import pandas as pd
import pytest

from pacing.report import words


@pytest.mark.parametrize(
    ("value", "digits", "signed", "text"),
    [
        (3.14159, 1, False, "3.1"),
        (-3.14159, 1, False, "−3.1"),
        (3.0, 1, True, "+3.0"),
        (-0.04, 1, True, "0.0"),
        (0.0, 0, True, "0"),
        (float("nan"), 1, False, "–"),
        (float("inf"), 1, False, "–"),
        (None, 1, False, "–"),
    ],
)
def test_numbers_have_a_true_minus_sign_and_no_negative_zero(value, digits, signed, text):
    assert words.number(value, digits, signed=signed) == text


def test_clocks_are_hours_minutes_seconds_also_beyond_an_hour():
    assert words.clock(59.6) == "0:01:00"
    assert words.clock(3599.6) == "1:00:00"
    assert words.clock(36_061) == "10:01:01"


def test_the_clock_of_the_day_shows_seconds_only_where_there_are_any_and_passes_midnight():
    assert words.day_clock(34_200) == "09:30"
    assert words.day_clock(34_230) == "09:30:30"
    assert words.day_clock(86_400 + 60) == "00:01"


def test_differences_of_time_are_read_in_the_unit_that_suits_them():
    assert words.span(16.26) == "16.3 s"
    assert words.span(-3.0) == "−3.0 s"
    assert words.span(172.4) == "2 min 52 s"
    assert words.span(3700.0) == "1:01:40"


def test_the_mile_and_mph_are_those_of_1959():
    # International yard and pound agreement of 1959: the mile is 1609.344 m exactly.
    assert words.distance(16_093.44, words.IMPERIAL) == "10.0"
    assert words.speed(44.704, words.IMPERIAL, 0) == "100"


def cue(**columns: object) -> pd.Series:
    given = {"from_km": 12.5, "landmark": None, "words": "", "gradient_pct": 0.0}
    return pd.Series({**given, **columns})


@pytest.mark.parametrize(
    ("columns", "seen", "beside"),
    [
        ({"landmark": "church", "words": "crest"}, "church", "church"),
        ({"words": "crest"}, "over the top", "over the top"),
        ({"landmark": "dead turn"}, "dead turn", "dead turn"),
        ({"landmark": float("nan")}, "km 12.5", ""),
        ({"gradient_pct": 4.26}, "km 12.5", "climb 4 %"),
        ({"gradient_pct": -2.0}, "km 12.5", "descent 2 %"),
        ({"gradient_pct": 0.9}, "km 12.5", ""),
        ({"words": "crest", "held_m_s": 20.0}, "over the top", "over the top, at most 72 km/h"),
        ({"held_m_s": float("nan")}, "km 12.5", ""),
    ],
)
def test_a_cue_is_told_by_what_stands_there_else_by_the_kilometre_or_the_road(
    columns, seen, beside
):
    assert words.seen(cue(**columns)) == seen
    assert words.seen_beside(cue(**columns)) == beside


def test_places_are_printed_as_precisely_as_they_were_planned_and_no_more():
    assert words.cue_digits(pd.DataFrame({"from_km": [0.0, 1.8, 11.3]})) == 1
    assert words.cue_digits(pd.DataFrame({"from_km": [0.0, 1.8, 6.94]})) == 2


def test_the_cautions_name_speeds_law_health_and_error():
    said = " ".join(words.CAUTIONS)
    for matter in ("not safe speeds", "traffic law", "event's rules", "medical clearance", "error"):
        assert matter in said
