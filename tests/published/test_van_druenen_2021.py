"""Steep and slow: van Druenen & Blocken 2021, Sports Eng 24:10, table 1.

Inputs are the source's, the parts were computed from them with Martin's equations.
"""

from __future__ import annotations

import pytest

from pacing.bike import DragArea
from pacing.bike.resistance import RoadPower, road_power_w


def _power(speed_m_s: float, cda_m2: float) -> RoadPower:
    return road_power_w(
        speed_m_s,
        mass_kg=72.0,
        gradient=0.075,
        density_kg_m3=1.225,
        drag_area=DragArea((0.0,), (cda_m2,)),
        crr=0.0032,
        wheel_rotation_m2=0.0044,
        bearing_n=0.091,
        bearing_n_per_m_s=0.0087,
        efficiency=0.98,
        gravity_m_s2=9.81,
    )


def test_the_power_of_a_steep_slow_climb_part_by_part() -> None:
    power = _power(6.0, 0.473)
    parts = (power.air_w, power.rolling_w, power.bearings_w, power.gravity_w, power.total_w)
    assert parts == pytest.approx((63.16, 13.52, 0.86, 316.95, 402.55), abs=0.005)


def test_a_smaller_drag_area_saves_over_7_percent_at_6_metres_a_second() -> None:
    saved = 1.0 - _power(6.0, 0.261).total_w / _power(6.0, 0.473).total_w
    assert 100.0 * saved == pytest.approx(7.11, abs=0.005)  # printed "over 7 %"


def test_it_can_exceed_16_percent_at_8_metres_a_second() -> None:
    whole = _power(8.0, 0.473).total_w
    assert whole == pytest.approx(603.7, abs=0.05)
    saved = 1.0 - _power(8.0, 0.164).total_w / whole
    assert 100.0 * saved == pytest.approx(16.38, abs=0.005)  # printed "can exceed 16 %"
