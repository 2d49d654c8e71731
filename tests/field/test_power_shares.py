"""Power shares of positions from efforts in more than one."""

from __future__ import annotations

import numpy as np
import pytest

from pacing.errors import UnusableInputError
from pacing.field import fit_power
from pacing.rider.power_time import two_parameter_power_w

TWO = {"critical_power_w": 281.0, "w_prime_j": 19_400.0}
DURATIONS = np.array([180.0, 420.0, 720.0, 1200.0, 300.0, 900.0])
POSITIONS = ("low", "low", "low", "low", "upright", "upright")
SHARE = np.array([1.0, 1.0, 1.0, 1.0, 1.04, 1.04])


def test_noise_free_efforts_give_the_share_back() -> None:
    fit = fit_power(DURATIONS, SHARE * two_parameter_power_w(DURATIONS, **TWO), positions=POSITIONS)
    low, upright = fit.shares
    assert (low.position, low.power_share, low.efforts) == ("low", 1.0, 4)
    assert (upright.position, upright.efforts) == ("upright", 2)
    assert upright.power_share == pytest.approx(1.04, rel=1e-6)
    assert fit.critical_power_w == pytest.approx(281.0, rel=1e-6)
    assert all(abs(effort.residual_w) < 1e-4 for effort in fit.efforts)


def test_the_error_of_a_share_and_of_critical_power_is_as_large_as_the_scatter_of_fits() -> None:
    noise = np.random.default_rng(5)
    clean = SHARE * two_parameter_power_w(DURATIONS, **TWO)
    found, claimed = [], []
    for _ in range(250):
        power = clean * (1.0 + 0.02 * noise.standard_normal(clean.size))
        fit = fit_power(DURATIONS, power, positions=POSITIONS)
        found.append((fit.shares[1].power_share, fit.critical_power_w))
        claimed.append((fit.shares[1].se ** 2, fit.critical_power_se_w**2))
    ratio = np.sqrt(np.mean(claimed, axis=0)) / np.std(found, axis=0)
    assert ratio == pytest.approx([1.0, 1.0], abs=0.15)


def test_as_many_numbers_as_efforts_leave_no_error() -> None:
    fit = fit_power([180.0, 720.0, 720.0], [387.0, 309.0, 320.0], positions=["low", "low", "high"])
    assert fit.shares[1].power_share == pytest.approx(320.0 / 309.0)
    assert fit.shares[1].se is None
    assert fit.critical_power_se_w is None


def test_too_few_efforts_for_the_positions_are_refused() -> None:
    with pytest.raises(UnusableInputError, match="2 efforts in 2 positions"):
        fit_power([180.0, 720.0], [387.0, 309.0], positions=["low", "high"])


def test_one_position_has_no_shares() -> None:
    assert fit_power([180.0, 720.0], [387.0, 309.0], positions=["low", "low"]).shares == ()
