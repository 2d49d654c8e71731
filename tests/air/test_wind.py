"""Wind at the rider: height, surroundings, along and across."""

from __future__ import annotations

import pytest

from pacing.air.wind import (
    ROUGHNESS_M,
    SURROUNDINGS,
    log_law_factor,
    rider_height_factor,
    wind_components_m_s,
)


@pytest.mark.parametrize("surroundings", SURROUNDINGS)
def test_each_factor_is_the_log_law_by_way_of_60_m_to_two_decimals(surroundings: str) -> None:
    # Source: Wieringa 1992 for the roughness lengths; the two steps worked out independently:
    # ln(60/0.03)/ln(10/0.03) = 1.3085 up, ln(1.2/z)/ln(60/z) down.
    factor = log_law_factor(ROUGHNESS_M[surroundings])
    assert SURROUNDINGS[surroundings] == pytest.approx(factor, abs=0.0051)


def test_wind_given_at_two_metres_or_less_is_the_riders_own() -> None:
    assert rider_height_factor("town or forest", wind_height_m=2.0) == 1.0
    assert rider_height_factor("open field", wind_height_m=1.2) == 1.0


def test_wind_given_higher_up_is_brought_down_to_ten_metres_first() -> None:
    at_10 = rider_height_factor("farmland", wind_height_m=10.0)
    at_80 = rider_height_factor("farmland", wind_height_m=80.0)
    assert at_10 == 0.51
    # ln(10/0.03)/ln(80/0.03) = 5.8091/7.8886
    assert at_80 == pytest.approx(0.51 * 5.8091 / 7.8886, rel=1e-4)


def test_unknown_surroundings_are_a_key_error() -> None:
    with pytest.raises(KeyError):
        rider_height_factor("lawn", wind_height_m=1.0)


@pytest.mark.parametrize(
    ("heading_deg", "along", "across"),
    [(0.0, 0.0, 3.0), (90.0, 3.0, 0.0), (180.0, 0.0, -3.0), (270.0, -3.0, 0.0)],
)
def test_an_east_wind_is_met_head_on_going_east_and_from_the_right_going_north(
    heading_deg: float, along: float, across: float
) -> None:
    wind = wind_components_m_s(east_m_s=3.0, north_m_s=0.0, heading_deg=heading_deg)
    assert wind.along_m_s == pytest.approx(along, abs=1e-12)
    assert wind.across_m_s == pytest.approx(across, abs=1e-12)
