"""Every recovery law: what it must never do, and its exact derivatives on every branch."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pacing.errors import UnusableInputError
from pacing.rider.budget import DEFAULT_LAW, RECOVERY_LAWS, recovery_law
from pacing.rider.recovery import RecoveryLaw

W_PRIME_J = 19_000.0
EVERY_LAW = pytest.mark.parametrize("name", RECOVERY_LAWS)
SCHEDULES = st.lists(
    st.tuples(st.floats(-300.0, 400.0), st.floats(0.0, 900.0)), min_size=1, max_size=12
)


def _pools(law: RecoveryLaw, shares: tuple[float, float]) -> tuple[float, ...]:
    full = law.full(W_PRIME_J)
    return tuple(pool * share for pool, share in zip(full, shares, strict=False))


@EVERY_LAW
@given(schedule=SCHEDULES, start=st.tuples(st.floats(0.0, 1.0), st.floats(0.0, 1.0)))
@settings(max_examples=80, deadline=None)
def test_no_schedule_averages_more_than_critical_power_and_w_prime_spent_over_time(
    name: str, schedule: list[tuple[float, float]], start: tuple[float, float]
) -> None:
    # mean P ≤ CP + (W′ start − W′ end)/T, whatever the schedule: else W′ would make energy.
    law = recovery_law(name)
    pools = _pools(law, start)
    spent_j, before_j = 0.0, sum(pools)
    for excess_w, duration_s in schedule:
        pools = law.advance(pools, excess_w, duration_s, w_prime_j=W_PRIME_J)
        spent_j += excess_w * duration_s
    assert spent_j <= before_j - sum(pools) + 1e-6


@EVERY_LAW
@given(
    start=st.tuples(st.floats(-0.5, 1.0), st.floats(-0.5, 1.0)),
    excess_w=st.floats(0.0, 500.0),
    duration_s=st.floats(0.0, 900.0),
)
@settings(max_examples=60, deadline=None)
def test_spending_is_exact_even_below_empty(
    name: str, start: tuple[float, float], excess_w: float, duration_s: float
) -> None:
    law = recovery_law(name)
    pools = _pools(law, start)
    after = law.advance(pools, excess_w, duration_s, w_prime_j=W_PRIME_J)
    assert sum(pools) - sum(after) == pytest.approx(excess_w * duration_s, abs=1e-7)


@EVERY_LAW
@pytest.mark.parametrize("capped", [True, False])
@given(
    start=st.tuples(st.floats(-0.5, 1.0), st.floats(-0.5, 1.0)),
    excess_w=st.floats(-400.0, -1e-6),
    durations=st.tuples(st.floats(0.0, 900.0), st.floats(0.0, 900.0)),
)
@settings(max_examples=60, deadline=None)
def test_recovery_never_falls_never_overfills_and_can_be_ridden_in_two_parts(
    name: str,
    capped: bool,
    start: tuple[float, float],
    excess_w: float,
    durations: tuple[float, float],
) -> None:
    law = recovery_law(name)
    pools = _pools(law, start)
    kind = {"w_prime_j": W_PRIME_J, "capped": capped}
    first = law.advance(pools, excess_w, durations[0], **kind)
    second = law.advance(first, excess_w, durations[1], **kind)
    at_once = law.advance(pools, excess_w, sum(durations), **kind)
    full = law.full(W_PRIME_J)
    for stages in zip(pools, first, second, full, strict=True):
        assert all(a <= b + 1e-7 for a, b in pairwise(stages))
    assert second == pytest.approx(at_once, abs=1e-6)


@EVERY_LAW
def test_more_power_never_leaves_more_w_prime(name: str) -> None:
    law = recovery_law(name)
    for shares in ((1.0, 1.0), (0.2, 0.6), (0.9, 0.05), (-0.1, -0.1)):
        left = [
            sum(law.advance(_pools(law, shares), excess, 120.0, w_prime_j=W_PRIME_J))
            for excess in np.linspace(-250.0, 250.0, 401).tolist()
        ]
        assert all(a >= b - 1e-9 for a, b in pairwise(left))


@EVERY_LAW
def test_at_exactly_critical_power_nothing_changes(name: str) -> None:
    law = recovery_law(name)
    pools = _pools(law, (0.3, 0.7))
    assert law.advance(pools, 0.0, 600.0, w_prime_j=W_PRIME_J) == pytest.approx(pools, rel=1e-14)


# The grid walks through every branch: spending with both pools filled, one empty, both empty
# and down through zero; recovery slowed throughout, for a part, and not at all.
STARTS = [(1.0, 1.0), (0.4, 0.7), (0.02, 0.9), (0.9, 0.01), (-0.1, 0.5), (0.3, -0.2), (-0.2, -0.1)]
RUNS = [(80.0, 30.0), (350.0, 60.0), (-6.0, 45.0), (-40.0, 200.0), (-150.0, 20.0), (-250.0, 900.0)]


@EVERY_LAW
@pytest.mark.parametrize("capped", [True, False])
@pytest.mark.parametrize("start", STARTS)
@pytest.mark.parametrize("run", RUNS)
def test_derivatives_agree_with_central_differences(
    name: str, capped: bool, start: tuple[float, float], run: tuple[float, float]
) -> None:
    law = recovery_law(name)
    pools, (excess_w, duration_s) = _pools(law, start), run
    kind = {"w_prime_j": W_PRIME_J, "capped": capped}

    def after(old: list[float], excess: float, duration: float) -> np.ndarray:
        return np.array(law.advance(tuple(old), excess, duration, **kind))

    got = law.advance_and_slopes(pools, excess_w, duration_s, **kind)
    assert got.pools == pytest.approx(tuple(after(list(pools), excess_w, duration_s)), rel=1e-12)
    full = law.full(W_PRIME_J)
    for j, filled in enumerate(pools):
        up, down = list(pools), list(pools)
        up[j], down[j] = filled + 1e-2, filled - 1e-2
        if filled == full[j]:  # only downwards from a full pool, to second order
            down[j] = filled - 2e-2
            up[j] = filled
            middle = list(pools)
            middle[j] = filled - 1e-2
            slope = (
                3.0 * after(up, excess_w, duration_s)
                - 4.0 * after(middle, excess_w, duration_s)
                + after(down, excess_w, duration_s)
            ) / 2e-2
        else:
            slope = (after(up, excess_w, duration_s) - after(down, excess_w, duration_s)) / 2e-2
        assert [row[j] for row in got.d_pools] == pytest.approx(slope, abs=2e-6)
    step = 1e-4
    by_excess = after(list(pools), excess_w + step, duration_s)
    by_excess = (by_excess - after(list(pools), excess_w - step, duration_s)) / (2 * step)
    assert got.d_excess == pytest.approx(by_excess, abs=2e-6 * duration_s)
    by_time = after(list(pools), excess_w, duration_s + step)
    by_time = (by_time - after(list(pools), excess_w, duration_s - step)) / (2 * step)
    assert got.d_duration == pytest.approx(by_time, abs=2e-6 * abs(excess_w))


@EVERY_LAW
@pytest.mark.parametrize("capped", [True, False])
def test_many_riders_at_once_get_what_each_would_get_alone(name: str, capped: bool) -> None:
    law = recovery_law(name)
    draws = np.random.default_rng(7)
    n = 400
    w_prime = draws.uniform(12_000.0, 26_000.0, n)
    full = np.array([law.full(w) for w in w_prime]).T
    pools = full * draws.uniform(-0.2, 1.0, full.shape)
    excess, duration = draws.uniform(-260.0, 260.0, n), draws.uniform(0.0, 700.0, n)
    excess[:5] = 0.0
    together = law.advance_many(pools, excess, duration, w_prime_j=w_prime, capped=capped)
    for i in range(n):
        alone = law.advance(
            tuple(pools[:, i].tolist()),
            float(excess[i]),
            float(duration[i]),
            w_prime_j=float(w_prime[i]),
            capped=capped,
        )
        assert together[:, i] == pytest.approx(alone, rel=1e-9, abs=1e-6)


def test_without_recovery_what_is_spent_stays_spent() -> None:
    law = recovery_law("none")
    assert law.advance((5_000.0,), -200.0, 3_600.0, w_prime_j=W_PRIME_J) == (5_000.0,)


def test_a_single_pool_recovers_at_the_deficit_and_then_exponentially() -> None:
    # closed form: debt falls at D until debt = D τ, then as e^(−t/τ)
    law, deficit = recovery_law("bartram-2018"), 50.0
    tau = 2287.2 * deficit**-0.688
    linear_s = (W_PRIME_J - deficit * tau) / deficit
    after = law.advance((0.0,), -deficit, linear_s + 2.0 * tau, w_prime_j=W_PRIME_J)
    assert W_PRIME_J - after[0] == pytest.approx(deficit * tau * math.exp(-2.0))


def test_spending_takes_from_each_pool_in_proportion() -> None:
    after = recovery_law("two-phase").advance((2_000.0, 6_000.0), 40.0, 100.0, w_prime_j=W_PRIME_J)
    assert after == pytest.approx((1_000.0, 3_000.0))


def test_a_short_effort_and_rest_near_critical_power_does_not_raise_it() -> None:
    # Uncapped, a two-phase law lets 40 s at CP + 60 W and 20 s at CP − 5 W go on for an hour.
    law = recovery_law("two-phase")

    def left_after_an_hour(*, capped: bool) -> float:
        pools = law.full(W_PRIME_J)
        for _ in range(60):
            pools = law.advance(pools, 60.0, 40.0, w_prime_j=W_PRIME_J, capped=capped)
            pools = law.advance(pools, -5.0, 20.0, w_prime_j=W_PRIME_J, capped=capped)
        return sum(pools)

    assert left_after_an_hour(capped=False) > 0.0
    assert left_after_an_hour(capped=True) < -50_000.0


def test_the_default_law_has_two_pools_and_says_its_constants() -> None:
    law = recovery_law(DEFAULT_LAW)
    assert law.name == "two-phase"
    assert sum(law.pool_shares) == pytest.approx(1.0)
    assert len(law.pool_shares) == 2
    assert {"quick_share", "quick_tau_s"} <= set(law.constants)


def test_an_unknown_law_is_refused_with_the_list_of_laws() -> None:
    with pytest.raises(UnusableInputError, match="'fast' is no recovery law; expected none or"):
        recovery_law("fast")
