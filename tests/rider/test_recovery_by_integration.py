"""The closed forms of recovery against a general integrator of the same differential rule."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from pacing.rider.budget import RECOVERY_LAWS, recovery_law

W_PRIME_J = 19_000.0


def _time_constants_s(name: str, deficit_w: float) -> np.ndarray:
    """Written out anew from the published formulas (the default's from its printed constants)."""
    if name == "two-phase":
        constants = recovery_law(name).constants
        slow = constants["slow_tau_scale"] * deficit_w ** -constants["slow_tau_exponent"]
        return np.array([constants["quick_tau_s"], slow])
    single = {
        "skiba-2012": 546.0 * np.exp(-0.01 * deficit_w) + 316.0,
        "skiba-2015": W_PRIME_J / deficit_w,
        "bartram-2018": 2287.2 * deficit_w**-0.688,
        "weigend-2022": 2112.44 * deficit_w**-0.3892 - 14.506,
    }
    return np.array([single[name]])


@pytest.mark.parametrize("name", [name for name in RECOVERY_LAWS if name != "none"])
@pytest.mark.parametrize("deficit_w", [4.0, 60.0, 240.0])
@pytest.mark.parametrize("capped", [True, False])
@pytest.mark.parametrize("filled", [(0.0, 0.0), (0.6, 0.2), (-0.2, 0.3)])
def test_recovery_follows_debt_over_time_constant_slowed_to_the_deficit(
    name: str, deficit_w: float, capped: bool, filled: tuple[float, float]
) -> None:
    law = recovery_law(name)
    full = np.array(law.full(W_PRIME_J))
    start = full * filled[: full.size]
    tau = _time_constants_s(name, deficit_w)

    def rates(_: float, pools: np.ndarray) -> np.ndarray:
        free = (full - pools) / tau
        return free * min(1.0, deficit_w / free.sum()) if capped else free

    seconds = 400.0
    solved = solve_ivp(rates, (0.0, seconds), start, rtol=1e-10, atol=1e-7, max_step=5.0)
    ours = law.advance(
        tuple(start.tolist()), -deficit_w, seconds, w_prime_j=W_PRIME_J, capped=capped
    )
    assert ours == pytest.approx(solved.y[:, -1], abs=0.01)


def test_two_pools_are_spent_by_content() -> None:
    law = recovery_law("two-phase")
    start = (2_500.0, 8_000.0)

    def rates(_: float, pools: np.ndarray) -> np.ndarray:
        return -85.0 * pools / pools.sum()

    solved = solve_ivp(rates, (0.0, 100.0), start, rtol=1e-10, atol=1e-7)
    assert law.advance(start, 85.0, 100.0, w_prime_j=W_PRIME_J) == pytest.approx(
        solved.y[:, -1], abs=0.01
    )
