"""Aerobic power at altitude: Bassett et al. 1999, Med Sci Sports Exerc 31:1665.

Percent of sea level, x in km: acclimatised −1.12 x² − 1.90 x + 99.9 (second hand), not
acclimatised 0.178 x³ − 1.43 x² − 4.07 x + 100 (from memory).
"""

from __future__ import annotations

import pytest

from pacing.rider.power_time import altitude_factor


@pytest.mark.parametrize(
    ("height_m", "percent"),
    # worked out by hand: at 1 km 99.9 − 1.90 − 1.12, at 2 km 99.9 − 3.80 − 4.48
    [(1_000.0, 96.88), (2_000.0, 91.62), (2_240.0, 90.024)],
)
def test_an_acclimatised_rider(height_m: float, percent: float) -> None:
    # The polynomial gives 99.9 % at sea level; ours is 1 there.
    factor = altitude_factor(height_m, acclimatised=True)
    assert 99.9 * factor == pytest.approx(percent, abs=0.005)


@pytest.mark.parametrize(
    ("height_m", "percent"),
    # at 1 km 100 − 4.07 − 1.43 + 0.178, at 2 km 100 − 8.14 − 5.72 + 1.424
    [(1_000.0, 94.678), (2_000.0, 87.564)],
)
def test_a_rider_from_sea_level(height_m: float, percent: float) -> None:
    factor = altitude_factor(height_m, acclimatised=False)
    assert 100.0 * factor == pytest.approx(percent, abs=0.005)


@pytest.mark.parametrize("height_m", [500.0, 1_500.0, 3_000.0])
def test_acclimatisation_helps(height_m: float) -> None:
    used_to_it = altitude_factor(height_m, acclimatised=True)
    assert used_to_it > altitude_factor(height_m, acclimatised=False)
