"""Where the road may be taken how fast: what lowers the limit, and where braking begins."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from pacing.course.course import Bend, SlowPoint
from pacing.motion.limits import (
    bend_speed_m_s,
    braking_m_s2,
    node_limits_m_s,
    pitch_over_g,
    speed_limits_m_s,
    with_braking,
)

LIMITS = arrays(float, 30, elements=st.floats(1.0, 30.0))
CELLS = arrays(float, 29, elements=st.floats(0.5, 50.0))
BRAKING = arrays(float, 29, elements=st.floats(0.2, 5.0))


@given(limit=LIMITS, cell=CELLS, braking=BRAKING)
@settings(max_examples=60, deadline=None)
def test_the_envelope_is_what_stepping_back_node_by_node_gives(
    limit: Any, cell: Any, braking: Any
) -> None:
    # v² = v_next² + 2 a h, common practice (uniform deceleration)
    expected = limit.copy()
    for node in range(28, -1, -1):
        reach = np.sqrt(expected[node + 1] ** 2 + 2.0 * braking[node] * cell[node])
        expected[node] = min(limit[node], reach)
    found = with_braking(limit, cell_m=cell, braking_m_s2=braking)
    assert found == pytest.approx(expected, rel=1e-9)


def test_without_anything_slow_the_limit_is_free_or_the_riders_own(
    make_race: Callable[..., Any],
) -> None:
    course = make_race(np.zeros(50)).course
    limit = speed_limits_m_s(course, max_speed_m_s=20.0, dry=True)
    assert limit == pytest.approx(np.full(51, 20.0), rel=1e-12)


@pytest.mark.parametrize(("dry", "kmh"), [(True, 70.0), (False, 65.0)])
def test_unless_told_otherwise_70_km_h_are_planned_dry_and_65_wet(
    make_race: Callable[..., Any], dry: bool, kmh: float
) -> None:
    course = make_race(np.zeros(10)).course
    limit = speed_limits_m_s(course, max_speed_m_s=None, dry=dry)
    assert 3.6 * limit == pytest.approx(np.full(11, kmh))


def test_a_slow_point_holds_over_its_length_and_at_one_node_at_least(
    make_race: Callable[..., Any],
) -> None:
    points = (SlowPoint(200.0, 5.0, 40.0), SlowPoint(404.0, 4.0, 1.0))
    course = make_race(np.zeros(60), slow_points=points).course
    limit = node_limits_m_s(course, max_speed_m_s=20.0, dry=True)
    assert np.flatnonzero(limit == 5.0).tolist() == [18, 19, 20, 21, 22]
    assert np.flatnonzero(limit == 4.0).tolist() == [40]
    assert np.all(limit[limit > 5.0] == 20.0)


def test_a_bend_is_limited_by_its_radius_and_less_so_when_dry(
    make_race: Callable[..., Any],
) -> None:
    bend = Bend(at_m=300.0, length_m=40.0, radius_m=25.0, turn_deg=90.0, confidence=0.9)
    course = make_race(np.zeros(60), bends=(bend,)).course
    dry = node_limits_m_s(course, max_speed_m_s=20.0, dry=True)
    wet = node_limits_m_s(course, max_speed_m_s=20.0, dry=False)
    assert dry[30] == pytest.approx(float(bend_speed_m_s(25.0, lateral_g=0.3)))
    assert wet[30] == pytest.approx(float(bend_speed_m_s(25.0, lateral_g=0.2)))
    assert np.sum(dry < 20.0) == np.sum(wet < 20.0) == 5


def test_a_bend_of_unknown_radius_limits_nothing(make_race: Callable[..., Any]) -> None:
    bend = Bend(at_m=300.0, length_m=40.0, radius_m=None, turn_deg=120.0, confidence=0.1)
    course = make_race(np.zeros(60), bends=(bend,)).course
    limit = speed_limits_m_s(course, max_speed_m_s=20.0, dry=True)
    assert limit == pytest.approx(np.full(61, 20.0), rel=1e-12)


def test_the_slowest_of_several_reasons_holds(make_race: Callable[..., Any]) -> None:
    bend = Bend(at_m=300.0, length_m=60.0, radius_m=30.0, turn_deg=90.0, confidence=0.9)
    course = make_race(
        np.zeros(60), bends=(bend,), slow_points=(SlowPoint(300.0, 3.0, 10.0),)
    ).course
    limit = node_limits_m_s(course, max_speed_m_s=20.0, dry=True)
    assert limit[30] == 3.0
    assert limit[28] == pytest.approx(float(bend_speed_m_s(30.0, lateral_g=0.3)))


def test_braking_begins_earlier_on_a_descent(make_race: Callable[..., Any]) -> None:
    points = (SlowPoint(900.0, 4.0, 10.0),)

    def speed_50_m_before(gradient: float) -> float:
        course = make_race(np.full(100, gradient), slow_points=points).course
        return float(speed_limits_m_s(course, max_speed_m_s=18.0, dry=True)[85])

    assert speed_50_m_before(-0.10) < speed_50_m_before(-0.05) < speed_50_m_before(0.0) < 18.0
    assert speed_50_m_before(0.05) == pytest.approx(speed_50_m_before(0.0))


def test_deceleration_falls_in_proportion_to_the_pitch_over_limit() -> None:
    gradient = np.array([0.0, -0.04, -0.08, -0.16])
    planned = braking_m_s2(gradient, dry=True)
    expected = planned[0] * pitch_over_g(gradient) / pitch_over_g(0.0)
    assert planned == pytest.approx(expected, rel=1e-12)
