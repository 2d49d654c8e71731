"""The optimum against the same problem in CasADi, solved by IPOPT (tests/reference).

Source: an independent formulation; the physics is Martin et al. 1998 in distance, W′ by
Skiba et al. 2015 (and by the default law), from the numbers that a plan exports.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from plans import Made, made
from races import INVENTED, RECORDED, Case

pytest.importorskip("casadi", reason="CasADi is not installed: pip install '.[reference]'")
import exported
import ipopt_peer

SAME_PCT = 0.05
MOST_GAIN_PCT = 4.0  # published gains on real courses: Wolf 2016, Bach 2025; more is a bug

QUICK = tuple(c for c in INVENTED if c.name in {"flat out and back with a turn", "hill climb"})
LONG = tuple(c for c in INVENTED if c not in QUICK)


def _over_pct(time_s: float, other_s: float) -> float:
    return 100.0 * (time_s / other_s - 1.0)


def _best(road: exported.Exported, starts: np.ndarray | None) -> ipopt_peer.PeerSolution:
    """The better of two starts: the problem is not convex for the peer either."""
    guesses = (None, 0.85 * float(np.min(road.critical_power_w)))
    found = [ipopt_peer.solve(road, starts=starts, constant_w=watts) for watts in guesses]
    good = [f for f in found if f.status in ("Solve_Succeeded", "Solved_To_Acceptable_Level")]
    assert good, [f.status for f in found]
    return min(good, key=lambda f: f.time_s)


def _same_at_equal_pieces(one: Made) -> None:
    peer = _best(one.road, one.starts)
    over = _over_pct(one.unrounded_s, peer.time_s)
    print(f"  pieces {one.unrounded_s:.3f} s, IPOPT {peer.time_s:.3f} s, {over:+.4f} %")
    assert abs(over) < SAME_PCT


def _free(one: Made, name: str) -> None:
    """Report the gap to power free in every cell, and hold it within reason."""
    peer = _best(one.free_road, None)
    gap = _over_pct(one.unrounded_s, peer.time_s)
    printed = _over_pct(one.plan.time_s, peer.time_s)
    constant = _over_pct(one.plan.constant["time_s"], peer.time_s)
    ours = one.plan.solver["free_time_s"]
    said = "" if ours is None else f", our own free optimum {_over_pct(ours, peer.time_s):+.4f} %"
    print(
        f"  {name}: over IPOPT's free optimum of {peer.time_s:.2f} s ({peer.solve_s:.2f} s, "
        f"{peer.iterations} iterations): pieces {gap:+.3f} %, as printed {printed:+.3f} %, "
        f"constant power {constant:+.3f} %{said}"
    )
    assert -0.02 < gap <= printed + 0.02
    gain = _over_pct(one.plan.constant["time_s"], one.plan.time_s)
    assert 0.0 < gain < MOST_GAIN_PCT


@pytest.mark.parametrize("case", QUICK, ids=lambda c: c.name)
def test_the_optimum_at_equal_pieces_is_ipopt_s(case: Case) -> None:
    _same_at_equal_pieces(made(case))


@pytest.mark.slow
@pytest.mark.parametrize("case", LONG, ids=lambda c: c.name)
def test_the_optimum_at_equal_pieces_is_ipopt_s_on_long_and_winding_courses(case: Case) -> None:
    _same_at_equal_pieces(made(case))


@pytest.mark.slow
@pytest.mark.parametrize("case", RECORDED, ids=lambda c: c.name)
def test_the_optimum_at_equal_pieces_is_ipopt_s_on_recorded_courses(
    case: Case, recorded_courses: Path
) -> None:
    _same_at_equal_pieces(made(case, recorded=recorded_courses))


@pytest.mark.slow
@pytest.mark.parametrize("law", ["none", "two-phase"])
@pytest.mark.parametrize("case", QUICK, ids=lambda c: c.name)
def test_the_optimum_at_equal_pieces_is_ipopt_s_under_other_recovery_laws(
    case: Case, law: str
) -> None:
    _same_at_equal_pieces(made(case, law=law))


@pytest.mark.parametrize("case", QUICK, ids=lambda c: c.name)
def test_the_gap_to_power_free_in_every_cell_is_small_and_not_negative(case: Case) -> None:
    _free(made(case), case.name)


@pytest.mark.slow
@pytest.mark.parametrize("case", LONG, ids=lambda c: c.name)
def test_the_gap_to_free_power_is_small_on_long_and_winding_courses(case: Case) -> None:
    _free(made(case), case.name)


@pytest.mark.slow
@pytest.mark.parametrize("case", RECORDED, ids=lambda c: c.name)
def test_the_gap_to_free_power_is_small_on_recorded_courses(
    case: Case, recorded_courses: Path
) -> None:
    _free(made(case, recorded=recorded_courses), case.name)


def test_the_peer_itself_gives_the_same_time_from_any_start() -> None:
    road = exported.invented_road(800, law="skiba-2015")
    times = [ipopt_peer.solve(road, constant_w=watts).time_s for watts in (200.0, 280.0, 330.0)]
    assert max(times) - min(times) < 1e-4 * times[0]
