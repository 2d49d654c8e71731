"""Logarithmic wind profile over the Davenport roughness classes (Wieringa 1992)."""

from __future__ import annotations

import pytest

from pacing.air.wind import ROUGHNESS_M, log_wind_ratio


@pytest.mark.parametrize(
    ("roughness_m", "printed"),
    [(0.0002, 0.787), (0.005, 0.697), (0.01, 0.667), (0.03, 0.604), (0.05, 0.565)],
)
def test_wind_at_one_metre_over_wind_at_ten(roughness_m: float, printed: float) -> None:
    ratio = log_wind_ratio(1.0, from_height_m=10.0, roughness_m=roughness_m)
    assert ratio == pytest.approx(printed, abs=0.5e-3)


def test_roughness_of_a_tenth_of_a_metre_halves_the_wind_exactly() -> None:
    assert log_wind_ratio(1.0, from_height_m=10.0, roughness_m=0.1) == pytest.approx(0.5, rel=1e-14)


def test_roughness_lengths_are_those_of_the_classes() -> None:
    # sea 0.0002, smooth 0.005, open 0.03, roughly open 0.10, rough 0.25, very rough 0.5
    assert tuple(ROUGHNESS_M.values()) == (0.0002, 0.005, 0.03, 0.10, 0.25, 0.5)
