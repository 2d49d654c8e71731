"""How good the plan is, in figures: the free optimum, and what cutting, rounding, placing cost."""

from __future__ import annotations

from typing import Any

import pytest


def test_the_time_with_power_free_everywhere_is_no_slower_than_the_plan(plan: Any) -> None:
    """Whatever can be ridden in cues can be ridden with power free in every cell."""
    solver = plan.solver
    assert solver["free_time_s"] is not None
    # a local optimum, to the accuracy asked of it
    assert solver["free_time_s"] <= solver["unrounded_time_s"] * (1.0 + 2e-4)
    assert solver["gap_pct"] >= -0.02


def test_the_gap_is_that_of_the_printed_plan_and_its_parts_add_up(plan: Any) -> None:
    solver = plan.solver
    gap = 100.0 * (plan.time_s / solver["free_time_s"] - 1.0)
    assert solver["gap_pct"] == pytest.approx(gap, abs=1e-6)
    parts = solver["cutting_pct"] + solver["rounding_pct"] + solver["placing_pct"]
    assert parts == pytest.approx(solver["gap_pct"], abs=0.01)


def test_the_constant_target_is_slower_than_the_free_optimum(plan: Any) -> None:
    assert plan.solver["free_time_s"] < plan.constant["time_s"]


def test_what_the_solver_did_is_reported(plan: Any) -> None:
    solver = plan.solver
    assert solver["method"]
    assert solver["pieces"] == len(plan.pieces)
    assert solver["iterations"] > 0
    assert solver["evaluations"] > 0
    assert solver["seconds"] > 0.0
    assert solver["kkt_residual"] < 0.5
