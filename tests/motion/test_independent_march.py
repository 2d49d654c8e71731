"""Printed plans ridden again, cell by cell, by another integrator (tests/reference/march.py).

Source: an independent march in fine Runge-Kutta steps of energy over distance (Martin et al. 1998),
and of W′ in time by the published rates.
"""

from __future__ import annotations

import march
import numpy as np
import pytest
from plans import made
from races import INVENTED, Case

QUICK = tuple(c for c in INVENTED if c.name in {"flat out and back with a turn", "hill climb"})
LONG = tuple(c for c in INVENTED if c not in QUICK)
LAWS = ("none", "skiba-2012", "skiba-2015", "bartram-2018", "weigend-2022", "two-phase")

# The trapezoid over the first 10 m of a standing start gives away 0.15 to 0.3 s.
START_S, REST_SHARE = 0.3, 1e-4


def _same_finish(case: Case) -> None:
    one = made(case)
    ridden = march.march(one.road, one.column("target_w"))
    print(
        f"  {case.name}: printed plan {one.plan.time_s:.3f} s, marched {ridden.time_s:.3f} s; "
        f"W′ at the finish {one.column('w_balance_to_j')[-1]:.0f} and {ridden.w_left_j[-1]:.0f} J"
    )
    assert abs(ridden.time_s - one.plan.time_s) < START_S + REST_SHARE * one.plan.time_s
    beyond = one.column("from_m") > 300.0
    off = np.abs(ridden.speed_m_s[1:] - one.column("speed_to_m_s"))[beyond]
    assert np.max(off) < 0.05
    # powers are the same; W′ differs by the start's 0.2 s and by cells that meet a limit
    assert abs(ridden.w_left_j[-1] - one.column("w_balance_to_j")[-1]) < 200.0
    assert np.min(ridden.w_left_j) > one.road.reserve_j - 100.0


@pytest.mark.parametrize("case", QUICK, ids=lambda c: c.name)
def test_an_independent_march_of_the_printed_power_gives_the_same_finish_time(case: Case) -> None:
    _same_finish(case)


@pytest.mark.slow
@pytest.mark.parametrize("case", LONG, ids=lambda c: c.name)
def test_an_independent_march_gives_the_same_finish_time_on_long_and_winding_courses(
    case: Case,
) -> None:
    _same_finish(case)


def _w_left_is_the_same(case: Case, law: str) -> None:
    one = made(case, law=law)
    left = march.w_left_j(one.road, one.column("power_w"), one.column("time_s"), step_s=0.1)
    off = np.max(np.abs(left[1:] - one.column("w_balance_to_j")))
    print(f"  {law}: W′ from the trace's power and times, integrated anew: within {off:.3f} J")
    assert off < 5.0


@pytest.mark.parametrize("law", ["skiba-2015", "two-phase"])
def test_w_left_along_the_trace_follows_from_its_power_and_times(law: str) -> None:
    _w_left_is_the_same(QUICK[0], law)


@pytest.mark.slow
@pytest.mark.parametrize("law", LAWS)
def test_w_left_along_the_trace_follows_under_every_law(law: str) -> None:
    _w_left_is_the_same(QUICK[1], law)


def test_the_trace_obeys_the_equation_of_motion_in_every_cell() -> None:
    one = made(QUICK[1])
    road, v = one.road, np.append(one.column("speed_from_m_s")[:1], one.column("speed_to_m_s"))
    time = 2.0 * road.cell_m / (v[:-1] + v[1:])
    gain = 0.5 * road.effective_mass_kg * (v[1:] ** 2 - v[:-1] ** 2)
    resist = 0.5 * road.cell_m * (road.resistance_n(v[:-1]) + road.resistance_n(v[1:]))
    drive = road.efficiency * one.column("power_w") * time
    missing = (drive - resist - road.cell_m * one.column("braking_n") - gain) / road.cell_m
    assert np.max(np.abs(missing)) < 0.01
    assert np.max(np.abs(time - one.column("time_s"))) < 1e-9
    assert np.all(v <= road.limit_m_s + 1e-6)
