"""Bends and brakes: Wilson, Bicycling Science, by way of the published check values.

The printed figures were computed with g = 9.81 m/s²; ours is 9.80665, which makes 0.02 %.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from pacing.motion.limits import (
    BRAKING_G_DRY,
    BRAKING_G_WET,
    CENTRE_OF_MASS_RATIO,
    LATERAL_G_DRY,
    LATERAL_G_WET,
    bend_speed_m_s,
    braking_m_s2,
    pitch_over_g,
    with_braking,
)
from pacing.units import GRAVITY_M_S2

TO_PRINTED_G = math.sqrt(9.81 / GRAVITY_M_S2)


def test_a_bend_of_20_m_at_half_g_is_ridden_at_9_905_m_s() -> None:
    speed = float(bend_speed_m_s(20.0, lateral_g=0.5))
    assert speed * TO_PRINTED_G == pytest.approx(9.905, abs=0.0005)
    assert speed == pytest.approx(9.903, abs=0.0005)


def test_there_the_rider_leans_by_26_57_degrees() -> None:
    # tan(lean) = v²/(g r)
    speed = float(bend_speed_m_s(20.0, lateral_g=0.5))
    lean = math.degrees(math.atan(speed**2 / (GRAVITY_M_S2 * 20.0)))
    assert lean == pytest.approx(26.57, abs=0.005)


def test_on_the_level_the_rear_wheel_lifts_at_half_g() -> None:
    # quoted after Wilson: horizontal over vertical distance of the centre of mass, about 0.5
    assert CENTRE_OF_MASS_RATIO == 0.5
    assert float(pitch_over_g(0.0)) == pytest.approx(0.5)


def test_on_a_descent_of_8_percent_the_rear_wheel_lifts_at_0_419_g() -> None:
    assert float(pitch_over_g(-0.08)) == pytest.approx(0.419, abs=0.0005)
    # the same by the angle of descent, (d cos θ − h sin θ)/h with d/h = 0.5
    angle = math.atan(0.08)
    by_angle = 0.5 * math.cos(angle) - math.sin(angle)
    assert float(pitch_over_g(-0.08)) == pytest.approx(by_angle, rel=1e-12)


def test_from_15_m_s_to_rest_at_half_g_takes_22_9_m() -> None:
    cell_m = np.full(400, 0.1)
    limit = np.full(401, np.inf)
    limit[-1] = 0.0
    envelope = with_braking(limit, cell_m=cell_m, braking_m_s2=np.full(400, 0.5 * GRAVITY_M_S2))
    before_the_stop_m = 40.0 - np.arange(401) * 0.1
    from_15_m_s = float(np.interp(-15.0, -envelope, before_the_stop_m))
    assert from_15_m_s == pytest.approx(22.9, abs=0.05)


def test_planning_values_lie_well_inside_what_holds() -> None:
    # dry tyres slip near 45° of lean, 1 g; wet 0.3 to 0.5 g (the latter from memory)
    assert (LATERAL_G_DRY, LATERAL_G_WET) == (0.3, 0.2)
    assert (BRAKING_G_DRY, BRAKING_G_WET) == (0.25, 0.15)
    assert LATERAL_G_WET < 0.3 < 1.0
    assert BRAKING_G_DRY <= 0.5 * CENTRE_OF_MASS_RATIO


def test_planned_braking_stays_below_pitch_over_down_any_road_of_this_world() -> None:
    gradient = np.linspace(-0.30, 0.30, 61)
    for dry in (True, False):
        planned_g = braking_m_s2(gradient, dry=dry) / GRAVITY_M_S2
        assert np.all(planned_g <= 0.51 * pitch_over_g(gradient))
        assert np.all(np.diff(planned_g) >= 0.0)
