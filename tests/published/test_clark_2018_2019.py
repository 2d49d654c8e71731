"""After 2 h of heavy riding: Clark et al. 2018 (MSSE 50:1658), 2019 (AJP Regul 317:R59)."""

from __future__ import annotations

import pytest

from pacing.rider.power_time import declined_critical_power_w, durability_factors
from pacing.rider.rider import LONG_DECLINE_SHARE

MEASURED = [((306.0, 282.0), (18.3, 14.7)), ((287.0, 256.0), (18.7, 15.3))]


@pytest.mark.parametrize(("critical_power_w", "w_prime_kj"), MEASURED)
def test_durability_after_two_hours_just_below_critical_power_is_near_each_study(
    critical_power_w: tuple[float, float], w_prime_kj: tuple[float, float]
) -> None:
    fresh_w = critical_power_w[0]
    left = durability_factors(fresh_w * 7_200.0, critical_power_w=fresh_w)
    assert 0.89 <= left.critical_power <= 0.925
    assert left.critical_power == pytest.approx(critical_power_w[1] / fresh_w, abs=0.02)
    assert left.w_prime == pytest.approx(w_prime_kj[1] / w_prime_kj[0], abs=0.02)


def test_the_default_decline_at_two_hours_lies_between_the_two_studies() -> None:
    planned = declined_critical_power_w(
        7_200.0, critical_power_w=1.0, long_decline_w=LONG_DECLINE_SHARE
    )
    low, high = sorted(after / fresh for (fresh, after), _ in MEASURED)
    assert low <= planned <= high
