"""Critical power from two efforts: Simpson & Kordi 2017, IJSPP 12:825 (group means)."""

from __future__ import annotations

import pytest

from pacing.field import fit_power

# (180 s, 387 W) and (720 s, 309 W) give CP 283.0 W and W′ 18,720 J, computed by hand:
# (309·720 − 387·180)/540 and (387 − 283)·180
CRITICAL_W, W_PRIME_J = 283.0, 18_720.0


@pytest.mark.parametrize("number", [0, 1, 2])
def test_every_two_parameter_form_gives_the_published_pair(number: int) -> None:
    form = fit_power([180.0, 720.0], [387.0, 309.0]).forms[number]
    assert form.critical_power_w == pytest.approx(CRITICAL_W, abs=1.0)
    assert form.w_prime_j == pytest.approx(W_PRIME_J, abs=100.0)
    assert (form.critical_power_w, form.w_prime_j) == pytest.approx(
        (CRITICAL_W, W_PRIME_J), rel=1e-9
    )


def test_two_efforts_have_no_error_and_a_warning_says_so() -> None:
    fit = fit_power([180.0, 720.0], [387.0, 309.0])
    assert fit.critical_power_se_w is None
    assert fit.w_prime_se_j is None
    assert any("Fewer than three efforts" in said for said in fit.warnings)


def test_tests_all_under_ten_minutes_are_warned_of() -> None:
    # Mattioni Maturana et al. 2018: they overestimate critical power
    short = fit_power([120.0, 240.0, 420.0], [420.0, 350.0, 320.0])
    assert any("shorter than 10 minutes" in said for said in short.warnings)
    long = fit_power([180.0, 420.0, 900.0], [387.0, 328.0, 304.0])
    assert not any("shorter than 10 minutes" in said for said in long.warnings)
