"""Forces along the road and their slopes."""

from __future__ import annotations

import numpy as np
import pytest

from pacing.bike import DragArea
from pacing.bike.resistance import (
    air_force_n,
    air_force_n_and_slope,
    bearing_force_n,
    gravity_force_n,
    road_power_w,
    rolling_force_n,
)

CONSTANT = DragArea((0.0,), (0.25,))
BY_YAW = DragArea((0.0, 5.0, 10.0, 15.0), (0.250, 0.246, 0.238, 0.241))
AXIAL = DragArea.from_convention(0.0, 0.25, "axial")
KINDS = pytest.mark.parametrize("drag_area", [CONSTANT, BY_YAW, AXIAL], ids=["one", "yaw", "axial"])


def _air(drag_area: DragArea, along_m_s: float = 2.0, across_m_s: float = -3.0) -> dict:
    return {
        "density_kg_m3": 1.2,
        "wind_along_m_s": along_m_s,
        "wind_across_m_s": across_m_s,
        "drag_area": drag_area,
    }


@KINDS
def test_the_force_is_that_of_its_definition_by_hypotenuse_and_arctangent(
    drag_area: DragArea,
) -> None:
    speed = np.linspace(0.0, 20.0, 81)
    along, across = speed + 2.0, 3.0
    flow, yaw = np.hypot(along, across), np.arctan2(across, along)
    expected = 0.5 * 1.2 * (drag_area.m2_at(yaw) + 0.004) * flow * along
    force = air_force_n(speed, **_air(drag_area), extra_m2=0.004)
    assert force == pytest.approx(expected, rel=1e-12)


@KINDS
@pytest.mark.parametrize("wind_m_s", [(2.0, 3.0), (-15.0, 1.0), (-6.0, 0.0), (0.0, 8.0)])
def test_slopes_agree_with_central_differences_for_every_wind(
    drag_area: DragArea, wind_m_s: tuple[float, float]
) -> None:
    speed, step = np.linspace(0.51, 22.13, 97), 1e-5
    air = _air(drag_area, *wind_m_s)
    differences = (air_force_n(speed + step, **air) - air_force_n(speed - step, **air)) / (2 * step)
    slope = air_force_n_and_slope(speed, **air).slope_n_per_m_s
    assert slope == pytest.approx(differences, abs=2e-7)


@KINDS
def test_slopes_agree_with_a_complex_step_to_rounding(drag_area: DragArea) -> None:
    speed = np.linspace(0.4, 22.0, 97)
    stepped = air_force_n(speed + 1e-30j, **_air(drag_area)).imag / 1e-30
    slope = air_force_n_and_slope(speed, **_air(drag_area)).slope_n_per_m_s
    assert slope == pytest.approx(stepped, rel=1e-12)


@KINDS
def test_no_flow_is_no_force_and_no_warning(drag_area: DragArea) -> None:
    force, slope = air_force_n_and_slope(np.array([5.0]), **_air(drag_area, -5.0, 0.0))
    assert force == 0.0
    assert slope == 0.0


def test_a_tail_wind_faster_than_the_rider_pushes_as_hard_as_a_head_wind_holds() -> None:
    push = air_force_n(4.0, **_air(BY_YAW, -10.0, 2.0))
    hold = air_force_n(4.0, **_air(BY_YAW, 2.0, 2.0))
    assert push == pytest.approx(-hold, rel=1e-12)


def test_the_side_of_the_cross_wind_makes_no_difference() -> None:
    right, left = (air_force_n(12.0, **_air(BY_YAW, 1.0, side * 4.0)) for side in (1.0, -1.0))
    assert right == left


def test_weight_splits_into_a_part_along_and_a_part_across_the_road() -> None:
    gradient = np.array([-0.2, 0.0, 0.05, 0.3])
    along = gravity_force_n(mass_kg=80.0, gradient=gradient)
    across = rolling_force_n(crr=1.0, mass_kg=80.0, gradient=gradient)
    assert np.hypot(along, across) == pytest.approx(80.0 * 9.80665)
    assert along / across == pytest.approx(gradient)


def test_bearing_drag_grows_with_speed() -> None:
    drag = bearing_force_n(np.array([0.0, 10.0]), bearing_n=0.091, bearing_n_per_m_s=0.0087)
    assert drag == pytest.approx([0.091, 0.178])


def test_parts_of_the_power_add_up_to_the_whole_at_the_crank() -> None:
    parts = road_power_w(
        11.0,
        mass_kg=82.0,
        gradient=0.01,
        density_kg_m3=1.19,
        drag_area=BY_YAW,
        crr=0.004,
        wind_along_m_s=1.0,
        wind_across_m_s=2.0,
        bearing_n=0.091,
        bearing_n_per_m_s=0.0087,
        efficiency=0.97,
        acceleration_m_s2=0.02,
        effective_mass_kg=83.0,
    )
    assert parts.total_w * 0.97 == pytest.approx(sum(parts[:-1]))
    assert parts.kinetic_w == pytest.approx(11.0 * 83.0 * 0.02)
