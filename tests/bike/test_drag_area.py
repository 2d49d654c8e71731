"""Drag area against yaw: conventions, shape of the curve, slopes."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pacing.bike import DragArea
from pacing.errors import UnusableInputError

TABLE = DragArea((0.0, 5.0, 10.0, 15.0), (0.250, 0.246, 0.238, 0.241))


def test_the_curve_passes_through_the_table() -> None:
    assert TABLE.m2_at(np.radians(TABLE.yaw_deg)) == pytest.approx(TABLE.m2, rel=1e-12)


def test_the_last_value_holds_beyond_the_table() -> None:
    assert TABLE.m2_at(np.radians([16.0, 45.0, 90.0])) == pytest.approx(0.241, rel=1e-12)


def test_the_first_value_holds_before_the_table() -> None:
    late = DragArea((5.0, 10.0), (0.25, 0.24))
    value, slope = late.m2_and_slope(np.radians([0.0, 2.0, 5.0]))
    assert value == pytest.approx(0.25)
    assert slope == pytest.approx(0.0, abs=1e-12)


def test_wind_from_behind_counts_as_its_mirror_image() -> None:
    yaw = np.radians([3.0, 8.0, 70.0])
    assert TABLE.m2_at(math.pi - yaw) == pytest.approx(TABLE.m2_at(yaw), rel=1e-12)
    assert TABLE.m2_at(-yaw) == pytest.approx(TABLE.m2_at(yaw), rel=1e-12)


@pytest.mark.parametrize("yaw_deg", [0.0, 15.0, 90.0])
def test_the_slope_is_zero_head_on_at_the_end_of_the_table_and_across(yaw_deg: float) -> None:
    assert TABLE.m2_and_slope(math.radians(yaw_deg)).slope == pytest.approx(0.0, abs=1e-12)


def test_slopes_in_yaw_agree_with_central_differences() -> None:
    yaw = np.radians(np.linspace(-179.0, 179.0, 359) + 0.13)
    step = 1e-6
    differences = (TABLE.m2_at(yaw + step) - TABLE.m2_at(yaw - step)) / (2 * step)
    assert TABLE.m2_and_slope(yaw).slope == pytest.approx(differences, abs=1e-8)


def test_slopes_agree_with_a_complex_step() -> None:
    sin2 = np.linspace(0.0, 0.1, 41) + 1e-4
    stepped = TABLE.m2_and_slope_in_sin2(sin2 + 1e-30j)
    slope = TABLE.m2_and_slope_in_sin2(sin2).slope
    assert slope == pytest.approx(stepped.m2.imag / 1e-30, rel=1e-12, abs=1e-15)


@given(st.lists(st.floats(0.15, 0.4), min_size=2, max_size=7))
@settings(max_examples=60, deadline=None)
def test_between_two_entries_the_curve_stays_between_them(values: list[float]) -> None:
    yaw_deg = np.linspace(0.0, 20.0, len(values))
    curve = DragArea(tuple(yaw_deg), tuple(values))
    for i in range(len(values) - 1):
        inside = curve.m2_at(np.radians(np.linspace(yaw_deg[i], yaw_deg[i + 1], 20)))
        low, high = sorted(values[i : i + 2])
        assert low - 1e-12 <= inside.min() <= inside.max() <= high + 1e-12


@pytest.mark.parametrize(("convention", "power"), [("road", 0), ("axial", 1), ("tunnel", -1)])
def test_conventions_differ_by_the_cosine_of_yaw(convention: str, power: int) -> None:
    # axial: force/(½ρ·along²) · along²/(flow·along); tunnel: along = flow cos yaw.
    yaw_deg, m2 = (0.0, 5.0, 10.0, 15.0), (0.25, 0.24, 0.235, 0.245)
    curve = DragArea.from_convention(yaw_deg, m2, convention)
    yaw = np.radians(yaw_deg)
    assert curve.m2_at(yaw) == pytest.approx(m2 * np.cos(yaw) ** power, rel=1e-9)


def test_a_single_axial_value_gives_the_force_of_its_own_definition() -> None:
    curve = DragArea.from_convention(0.0, 0.2565, "axial")
    yaw = np.radians(np.linspace(0.0, 29.0, 117))
    assert not curve.constant
    assert curve.m2_at(yaw) == pytest.approx(0.2565 * np.cos(yaw), rel=1e-6)


def test_a_single_road_value_is_constant() -> None:
    curve = DragArea.from_convention(0.0, 0.25)
    assert curve.constant
    assert DragArea((0.0, 10.0), (0.25, 0.25)).constant
    assert not TABLE.constant
    value, slope = curve.m2_and_slope(np.array([0.0, 1.0, 3.0]))
    assert np.all(value == 0.25)
    assert np.all(slope == 0.0)


def test_a_sum_of_two_curves_is_the_sum_at_every_yaw() -> None:
    change = DragArea((0.0, 7.0, 12.0, 20.0), (0.0, -0.002, -0.006, -0.004))
    yaw = np.radians(np.linspace(0.0, 180.0, 721))
    both = TABLE + change
    assert both.m2_at(yaw) == pytest.approx(TABLE.m2_at(yaw) + change.m2_at(yaw), rel=1e-12)
    assert (both + DragArea((0.0,), (0.01,))).m2_at(yaw) == pytest.approx(both.m2_at(yaw) + 0.01)
    assert (DragArea((0.0,), (0.01,)) + both).m2_at(yaw) == pytest.approx(both.m2_at(yaw) + 0.01)


def test_a_curve_can_be_shifted_and_scaled_whole() -> None:
    yaw = np.radians(np.linspace(0.0, 40.0, 81))
    assert TABLE.plus(-0.01).m2_at(yaw) == pytest.approx(TABLE.m2_at(yaw) - 0.01)
    assert TABLE.scaled(1.02).m2_at(yaw) == pytest.approx(1.02 * TABLE.m2_at(yaw))


@pytest.mark.parametrize(
    ("yaw_deg", "m2", "message"),
    [
        ((), (), "0 yaw angles"),
        ((0.0, 5.0), (0.25,), "2 yaw angles and 1 drag areas"),
        ((5.0, 0.0), (0.25, 0.24), "yaw angles 5, 0; expected rising within 0 to 90°"),
        ((-5.0, 0.0), (0.25, 0.24), "yaw angles -5, 0"),
        ((0.0, 95.0), (0.25, 0.24), "yaw angles 0, 95"),
        ((0.0, math.nan), (0.25, 0.24), "not finite"),
        ((0.0, 5.0), (0.25, math.inf), "not finite"),
    ],
)
def test_a_table_that_is_none_is_refused(
    yaw_deg: tuple[float, ...], m2: tuple[float, ...], message: str
) -> None:
    with pytest.raises(UnusableInputError, match=message):
        DragArea(yaw_deg, m2)


def test_an_unknown_convention_and_a_tunnel_table_across_the_wind_are_refused() -> None:
    with pytest.raises(UnusableInputError, match="'wind' is no drag-area convention"):
        DragArea.from_convention(0.0, 0.25, "wind")
    with pytest.raises(UnusableInputError, match="at most 80°"):
        DragArea.from_convention((0.0, 90.0), (0.25, 0.25), "tunnel")
