"""A nonlinear programme gathered piece by piece with CasADi and handed to IPOPT with MUMPS."""

from __future__ import annotations

import time
from dataclasses import dataclass

import casadi as ca
import numpy as np

SECONDS = 100.0  # unit of the objective


@dataclass(frozen=True)
class Found:
    x: ca.DM
    iterations: int
    seconds: float
    cpu_s: float
    status: str


class Program:
    """Unknowns with bounds and start, constraints with bounds: gathered, then handed over."""

    def __init__(self) -> None:
        self.prices: list[ca.SX] = []
        self.x: list[ca.SX] = []
        self.bounds: list[tuple[np.ndarray, np.ndarray, np.ndarray]] = []
        self.g: list[ca.SX] = []
        self.g_bounds: list[tuple[np.ndarray, np.ndarray]] = []

    def unknown(self, low: np.ndarray, high: np.ndarray, start: np.ndarray) -> ca.SX:
        symbol = ca.SX.sym(f"x{len(self.x)}", low.size)
        self.x.append(symbol)
        self.bounds.append((low, high, start))
        return symbol

    def hold(self, expression: ca.SX, low: np.ndarray, high: np.ndarray) -> None:
        self.g.append(expression)
        self.g_bounds.append((low, high))

    def evaluator(self, wanted: list[ca.SX]) -> ca.Function:
        return ca.Function("pick", [ca.vertcat(*self.x)], wanted)

    def solve(self, objective: ca.SX, *, tolerance: float, verbose: bool) -> Found:
        options = {
            "print_time": False,
            "ipopt": {
                "print_level": 5 if verbose else 0,
                "sb": "yes",
                "linear_solver": "mumps",
                "tol": tolerance,
                "max_iter": 1000,
                # the two-pool law has a long flat tail: stop when nothing moves any more
                "acceptable_tol": 1e-4,
                "acceptable_constr_viol_tol": 1e-4,
                "acceptable_obj_change_tol": 2e-7,
                "acceptable_iter": 6,
                "nlp_scaling_method": "none",
                "mu_strategy": "adaptive",
            },
        }
        cost = (objective + sum(self.prices)) / SECONDS
        problem = {"x": ca.vertcat(*self.x), "f": cost, "g": ca.vertcat(*self.g)}
        solver = ca.nlpsol("peer", "ipopt", problem, options)
        low, high, start = (np.concatenate(side) for side in zip(*self.bounds, strict=True))
        g_low, g_high = (np.concatenate(side) for side in zip(*self.g_bounds, strict=True))
        began, cpu_began = time.perf_counter(), time.process_time()
        found = solver(x0=start, lbx=low, ubx=high, lbg=g_low, ubg=g_high)
        seconds, cpu_s = time.perf_counter() - began, time.process_time() - cpu_began
        stats = solver.stats()
        status, iterations = str(stats["return_status"]), int(stats["iter_count"])
        return Found(found["x"], iterations, seconds, cpu_s, status)
