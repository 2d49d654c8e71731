"""Cues begin where a rider sees or reads something, and say what."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from pacing.course.course import Bend, Landmark, SlowPoint
from pacing.plan.places import places_of, readable_nodes, words_at

HILL = np.concatenate([np.full(100, 0.05), np.full(120, -0.04), np.full(80, 0.02)])


def names(course: Any) -> list[tuple[int, str]]:
    return [(round(place.at_m), place.name) for place in places_of(course)]


def test_crests_and_bottoms_are_where_the_road_turns(make_race: Callable[..., Any]) -> None:
    assert names(make_race(HILL).course) == [(1000, "crest"), (2200, "bottom")]


def test_ripples_that_nobody_notices_are_no_places(make_race: Callable[..., Any]) -> None:
    at = 10.0 * np.arange(300)
    # 2 m up and down
    ripples = 0.0125 * np.sin(2.0 * np.pi * at / 500.0)
    assert names(make_race(ripples).course) == []


def test_landmarks_slow_points_and_bends_are_places_in_order(
    make_race: Callable[..., Any],
) -> None:
    course = make_race(
        HILL,
        slow_points=(SlowPoint(1_500.0, 4.0, note="dead turn"), SlowPoint(2_800.0, 5.0)),
        bends=(
            Bend(500.0, 40.0, 30.0, 90.0, 0.9),
            Bend(700.0, 40.0, 300.0, 30.0, 0.9),
            Bend(1_800.0, 30.0, 10.0, -150.0, 0.9),
        ),
        landmarks=(Landmark(420.0, "church"),),
    ).course
    assert names(course) == [
        (420, "church"),
        (500, "bend"),
        (1000, "crest"),
        (1500, "dead turn"),
        (1800, "sharp bend"),
        (2200, "bottom"),
        (2800, "slow point"),
    ]


def test_the_words_are_those_of_the_nearest_place_in_sight(
    make_race: Callable[..., Any],
) -> None:
    course = make_race(HILL).course
    places = places_of(course)
    assert words_at(course, places, 1_060.0, within_m=80.0) == "crest"
    assert words_at(course, places, 1_300.0, within_m=80.0) == ""


def test_readable_are_every_hundred_metres_and_every_place_but_not_the_ends(
    make_race: Callable[..., Any],
) -> None:
    course = make_race(HILL, landmarks=(Landmark(1_234.0, "mill"),)).course
    nodes = readable_nodes(course, places_of(course))
    assert set(range(10, 300, 10)) <= set(nodes.tolist())
    assert 123 in nodes
    assert nodes.min() > 0
    assert nodes.max() < 300
    assert np.all(np.diff(nodes) > 0)


def test_cues_of_a_plan_begin_at_readable_places(plan: Any) -> None:
    course = plan.race.course
    readable = course.distance_m[readable_nodes(course, places_of(course))]
    begins = plan.cues["from_m"].to_numpy()[1:]
    near = np.array([np.min(np.abs(readable - at)) for at in begins])
    # a boundary with no readable place in reach stays where it is best
    assert np.sum(near > 1e-6) <= max(2, 0.3 * begins.size)


def test_the_first_cue_is_at_the_start_and_its_clock_zero(plan: Any) -> None:
    first = plan.cues.iloc[0]
    assert (first["landmark"], first["clock"]) == ("start", "0:00:00")
    assert first["w_balance_kj"] == pytest.approx(plan.race.rider.w_prime_j / 1000.0)


def test_clock_and_w_left_of_each_cue_are_those_of_the_trace(plan: Any) -> None:
    elapsed = np.concatenate([[0.0], np.cumsum(plan.trace["time_s"])])
    left = np.concatenate([[plan.inputs["model"]["w_prime_j"]], plan.trace["w_balance_to_j"]])
    node = np.searchsorted(plan.trace["from_m"], plan.cues["from_m"] - 1e-6)
    assert plan.cues["w_balance_kj"].to_numpy() == pytest.approx(left[node] / 1000.0)
    for clock, seconds in zip(plan.cues["clock"], elapsed[node], strict=True):
        hours, minutes, rest = (int(part) for part in clock.split(":"))
        assert 3600 * hours + 60 * minutes + rest == pytest.approx(seconds, abs=0.51)
