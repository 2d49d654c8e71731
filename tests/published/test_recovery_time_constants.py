"""Time constants of W′ recovery as published, read at second hand; ± 0.1 s.

Skiba et al. 2012 and 2015, Bartram et al. 2018, Weigend et al. 2022 (refit of Caen et al. 2019).
"""

from __future__ import annotations

import pytest

from pacing.rider.budget import recovery_law
from pacing.rider.time_constants import BARTRAM_2018, SKIBA_2012, WEIGEND_2022, skiba_2015

W_PRIME_J = 21_100.0
PRINTED_S = {
    221.0: {"skiba-2012": 375.9, "skiba-2015": 95.5, "bartram-2018": 55.8, "weigend-2022": 243.9},
    146.0: {"skiba-2012": 442.8, "skiba-2015": 144.5, "bartram-2018": 74.2, "weigend-2022": 289.2},
    68.0: {"skiba-2012": 592.6, "skiba-2015": 310.3, "bartram-2018": 125.5, "weigend-2022": 394.4},
}
LAWS = {
    "skiba-2012": SKIBA_2012,
    "skiba-2015": skiba_2015(W_PRIME_J),
    "bartram-2018": BARTRAM_2018,
    "weigend-2022": WEIGEND_2022,
}


@pytest.mark.parametrize("deficit_w", PRINTED_S)
@pytest.mark.parametrize("name", LAWS)
def test_the_time_constant_is_the_printed_one(name: str, deficit_w: float) -> None:
    assert LAWS[name].tau_s(deficit_w) == pytest.approx(PRINTED_S[deficit_w][name], abs=0.1)


@pytest.mark.parametrize("deficit_w", PRINTED_S)
@pytest.mark.parametrize("name", LAWS)
def test_without_the_cap_a_law_pays_back_1_minus_1_over_e_in_its_time_constant(
    name: str, deficit_w: float
) -> None:
    left = recovery_law(name).advance(
        (0.0,), -deficit_w, PRINTED_S[deficit_w][name], w_prime_j=W_PRIME_J, capped=False
    )
    assert left[0] / W_PRIME_J == pytest.approx(0.63212, abs=1e-3)


@pytest.mark.parametrize("name", LAWS)
def test_the_slope_of_the_time_constant_is_exact(name: str) -> None:
    step = 1e-4
    difference = (LAWS[name].tau_s(90.0 + step) - LAWS[name].tau_s(90.0 - step)) / (2 * step)
    assert LAWS[name].slope_s_per_w(90.0) == pytest.approx(difference, rel=1e-7)
