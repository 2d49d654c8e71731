"""What a bicycle says of itself."""

from __future__ import annotations

import math

import numpy as np
import pytest

from pacing.bike import BEARINGS, Bike, DragArea


def test_a_hub_meter_sits_behind_the_losses_of_the_chain() -> None:
    assert Bike(mass_kg=8.0, crr=0.004).efficiency == 0.976
    assert Bike(mass_kg=8.0, crr=0.004, power_measured_at="pedal").efficiency == 0.976
    assert Bike(mass_kg=8.0, crr=0.004, power_measured_at="hub").efficiency == 1.0


def test_wheels_add_their_inertia_over_radius_squared_to_the_mass() -> None:
    # Martin 1998: I 0.14 kg m² at r 0.311 m adds 1.447 kg
    bike = Bike(mass_kg=8.0, crr=0.004, wheel_circumference_m=2 * math.pi * 0.311)
    assert bike.rotating_mass_kg == pytest.approx(1.447, abs=5e-4)


def test_spin_out_is_the_top_gear_at_the_highest_cadence() -> None:
    bike = Bike(mass_kg=8.0, crr=0.004, top_gear=4.91, wheel_circumference_m=2.1)
    assert bike.spin_out_m_s(120.0) == pytest.approx(4.91 * 2.0 * 2.1)
    assert Bike(mass_kg=8.0, crr=0.004).spin_out_m_s(120.0) == math.inf


def test_the_bicycle_changes_the_drag_area_of_a_position() -> None:
    position = DragArea((0.0,), (0.25,))
    plain = Bike(mass_kg=8.0, crr=0.004)
    assert plain.drag_area(position) == position
    change = DragArea((0.0, 10.0), (0.0, -0.005))
    deep = Bike(mass_kg=8.0, crr=0.004, cda_by_yaw=change, wheel_rotation_m2=0.0044)
    at = deep.drag_area(position).m2_at(np.radians([0.0, 10.0]))
    assert at == pytest.approx([0.2544, 0.2494])


def test_packed_bearings_drag_more_than_lightly_greased_ones() -> None:
    # common practice, no source
    assert all(a > b for a, b in zip(BEARINGS["packed"], BEARINGS["light grease"], strict=True))
