"""Critical power from efforts: exact without noise, honest with it."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import f as fisher

from pacing.errors import UnusableInputError
from pacing.field import fit_power
from pacing.rider.power_time import three_parameter_power_w, two_parameter_power_w

TWO = {"critical_power_w": 281.0, "w_prime_j": 19_400.0}
THREE = {**TWO, "peak_power_w": 910.0}
SET = np.array([180.0, 420.0, 720.0, 1200.0])
WIDE = np.array([10.0, 30.0, 60.0, 150.0, 300.0, 480.0, 720.0, 1200.0])


def test_noise_free_efforts_give_their_own_numbers_back_in_every_form() -> None:
    fit = fit_power(SET, two_parameter_power_w(SET, **TWO))
    assert fit.form == "two-parameter"
    for form in fit.forms:
        assert form.parameters == pytest.approx(tuple(TWO.values()), rel=1e-6)
    assert fit.warnings == ()


def test_noise_free_efforts_with_a_sprint_give_the_three_parameters_back() -> None:
    fit = fit_power(WIDE, three_parameter_power_w(WIDE, **THREE))
    assert fit.form == "three-parameter"
    assert fit.chosen.parameters == pytest.approx(tuple(THREE.values()), rel=1e-6)
    assert fit.power_at_w(WIDE) == pytest.approx(three_parameter_power_w(WIDE, **THREE))


@pytest.mark.parametrize(
    ("durations", "draws"), [(SET, 500), (SET[:3], 500), (WIDE, 300)], ids=["4", "3", "8, peak"]
)
def test_the_stated_intervals_hold_the_truth_as_often_as_they_say(
    durations: np.ndarray, draws: int
) -> None:
    # 95 % intervals and joint region under 2 % of noise in power: 92 to 98 of 100 must hold it
    noise = np.random.default_rng(20_260)
    wide = durations is WIDE
    truth = np.array(list((THREE if wide else TWO).values()))
    clean = (
        three_parameter_power_w(durations, **THREE)
        if wide
        else two_parameter_power_w(durations, **TWO)
    )
    held, together = np.zeros(truth.size), 0
    for _ in range(draws):
        power = clean * (1.0 + 0.02 * noise.standard_normal(durations.size))
        fit = fit_power(durations, power, form="three-parameter" if wide else "two-parameter")
        intervals = np.array(fit.intervals())
        held += (intervals[:, 0] <= truth) & (truth <= intervals[:, 1])
        off = truth[:2] - [fit.critical_power_w, fit.w_prime_j]
        limit = 2.0 * fisher.ppf(0.95, 2, fit.chosen.degrees_of_freedom)
        together += off @ np.linalg.solve(fit.covariance, off) <= limit
    assert np.all((held / draws >= 0.92) & (held / draws <= 0.98))
    assert 0.92 <= together / draws <= 0.98


def test_the_joint_region_is_the_ellipse_of_the_covariance() -> None:
    fit = fit_power(SET, two_parameter_power_w(SET, **TWO) * [1.01, 0.99, 1.0, 1.005])
    edge = fit.joint_region() - [fit.critical_power_w, fit.w_prime_j]
    distance = np.einsum("ij,jk,ik->i", edge, np.linalg.inv(fit.covariance), edge)
    assert distance == pytest.approx(2.0 * fisher.ppf(0.95, 2, 2), rel=1e-6)


def test_the_band_is_widest_where_no_effort_was() -> None:
    fit = fit_power(SET, two_parameter_power_w(SET, **TWO) * [1.01, 0.99, 1.0, 1.005])
    near, between, far = fit.half_band_w([60.0, 500.0, 5_000.0])
    assert between < far
    assert between < near


def test_three_parameters_band_agrees_with_a_change_of_each_parameter() -> None:
    power = three_parameter_power_w(WIDE, **THREE) * (1.0 + 0.01 * np.sin(WIDE))
    fit = fit_power(WIDE, power)
    slopes = []
    for name, value in zip(THREE, fit.chosen.parameters, strict=True):
        at = dict(zip(THREE, fit.chosen.parameters, strict=True))
        up, down = {**at, name: value * (1 + 1e-6)}, {**at, name: value * (1 - 1e-6)}
        rise = three_parameter_power_w(90.0, **up) - three_parameter_power_w(90.0, **down)
        slopes.append(rise / (2e-6 * value))
    variance = np.array(slopes) @ fit.chosen.covariance @ np.array(slopes)
    # Student's t at 97.5 % with five degrees of freedom: 2.5706 (any table)
    assert fit.half_band_w(90.0)[0] == pytest.approx(2.5706 * np.sqrt(variance), rel=1e-4)


def test_an_effort_off_the_curve_is_flagged_and_no_other() -> None:
    power = two_parameter_power_w(SET, **TWO)
    power[2] *= 0.9
    fit = fit_power(SET, power)
    assert [effort.flagged for effort in fit.efforts] == ["", "", "off the curve", ""]
    assert any("lies off the curve of the others" in said for said in fit.warnings)


def test_a_sprint_on_the_three_parameter_curve_is_not_off_it() -> None:
    power = three_parameter_power_w(WIDE, **THREE)
    power[5] *= 0.92
    fit = fit_power(WIDE, power)
    assert [i for i, effort in enumerate(fit.efforts) if effort.flagged] == [5]


def test_beside_three_parameters_the_others_are_fitted_to_efforts_of_two_minutes_and_more() -> None:
    fit = fit_power(WIDE, three_parameter_power_w(WIDE, **THREE))
    alone = fit_power(WIDE[3:], three_parameter_power_w(WIDE[3:], **THREE), form="two-parameter")
    assert fit.forms[0].parameters == pytest.approx(alone.chosen.parameters)


def test_efforts_outside_two_to_thirty_minutes_are_left_out_and_said() -> None:
    durations = np.array([60.0, 180.0, 720.0, 3_600.0])
    power = two_parameter_power_w(durations, **TWO) * [0.8, 1.0, 1.0, 0.95]
    fit = fit_power(durations, power, form="two-parameter")
    assert fit.critical_power_w == pytest.approx(281.0)
    assert [effort.used for effort in fit.efforts] == [False, True, True, False]
    assert fit.efforts[0].flagged == "left out: under 2 minutes"
    assert fit.efforts[3].flagged == "left out: over 30 minutes"


@pytest.mark.parametrize(
    ("durations", "powers", "said"),
    [
        ([600.0, 900.0, 1100.0], [310.0, 302.0, 299.0], "only 1.8 times the shortest"),
        ([60.0, 240.0, 900.0][:2], [500.0, 350.0], "too short for the two-parameter form"),
        ([180.0, 2_400.0], [390.0, 290.0], "more than 30 minutes"),
        ([180.0, 600.0, 1_200.0], [380.0, 300.0, 305.0], "A longer effort has more power"),
        ([180.0, 600.0, 1_200.0], [700.0, 320.0, 290.0], "outside 5 to 40 kJ"),
        ([180.0, 600.0, 1_200.0], [330.0, 340.0, 290.0], "only known to ±"),
    ],
)
def test_a_physiologist_would_warn(durations: list[float], powers: list[float], said: str) -> None:
    warnings = fit_power(durations, powers).warnings
    assert any(said in warning for warning in warnings), warnings


def test_critical_power_above_the_longest_effort_is_warned_of() -> None:
    fit = fit_power([180.0, 900.0, 1_000.0, 1_200.0], [330.0, 310.0, 309.0, 290.0])
    assert any(
        "comes out at 297 W, above the longest effort's 290 W" in said for said in fit.warnings
    )


@pytest.mark.parametrize(
    ("durations", "powers", "message"),
    [
        ([180.0], [380.0], "1 effort of one duration"),
        ([180.0, 180.0], [380.0, 381.0], "2 efforts of one duration"),
        ([180.0, 720.0], [380.0], "2 durations and 1 powers"),
        ([3.0, 720.0], [380.0, 300.0], "duration_s: 3 s; expected 5 to 21600 s"),
        ([180.0, 720.0], [380.0, float("nan")], "power_w: nan W"),
        ([180.0, 720.0], [300.0, 380.0], "W′ of -19.2 kJ"),
        ([60.0, 62.0], [900.0, 100.0], "critical power of -23900 W"),
    ],
)
def test_efforts_that_give_no_curve_are_refused(
    durations: list[float], powers: list[float], message: str
) -> None:
    with pytest.raises(UnusableInputError, match=message):
        fit_power(durations, powers)


def test_an_unknown_form_is_refused() -> None:
    with pytest.raises(UnusableInputError, match="a form 'linear'; expected two-parameter or"):
        fit_power(SET, two_parameter_power_w(SET, **TWO), form="linear")
