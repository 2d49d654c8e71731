"""What one more watt in one cell is worth: the Lagrangian's slope along the course."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.motion.slopes import CellEndSlopes, cell_end_slopes, time_adjoint
from pacing.plan.balance import Prices, prices
from pacing.plan.problem import Ride, ride
from pacing.plan.solve import CROSSING_W, HELD_W, Solution

Array = NDArray[np.float64]


class Marginal(NamedTuple):
    """Slopes of the Lagrangian in the power of each cell by itself (N,), s/W.

    ``up`` holds for more power and ``down`` for less; they differ at critical power. Summed over
    a piece they vanish at an optimum inside its bounds; within the piece they say where more
    and where less would pay if it could be cut there. ``bend`` is the quasi-steady curvature.
    """

    up: Array
    down: Array
    bend: Array

    def change_s(self, cells: slice, step_w: float) -> float:
        """Lagrangian's change when the power over ``cells`` is changed by ``step_w``."""
        slope = self.up if step_w > 0.0 else self.down
        return float(step_w * slope[cells].sum() + 0.5 * step_w**2 * self.bend[cells].sum())


def marginal(solution: Solution) -> Marginal:
    """Slopes at a solution, on both sides of critical power for the pieces held there."""
    ridden = solution.ride
    at_critical = ridden.problem.at_critical_w[ridden.starts]
    held = np.abs(ridden.power_w - at_critical) < HELD_W
    up = down = reduced_slope(ridden, solution.multipliers_s_per_j)
    if np.any(held):
        guess = ridden.motion.speed_m_s
        below = np.where(held, at_critical - CROSSING_W, ridden.power_w)
        above = np.where(held, at_critical + CROSSING_W, ridden.power_w)
        up, down = (
            reduced_slope(
                ride(ridden.problem, ridden.starts, power, guess_m_s=guess),
                solution.multipliers_s_per_j,
            )
            for power in (above, below)
        )
    return Marginal(up, down, curvature(ridden))


class Priced(NamedTuple):
    """The Lagrangian's multipliers of motion (N,), and what power and time cost in each cell."""

    adjoint: Array
    price: Prices
    ends: CellEndSlopes


def priced(ridden: Ride, multipliers_s_per_j: Array) -> Priced:
    """Time less priced W′, followed back through the motion by one adjoint solve."""
    problem, motion = ridden.problem, ridden.motion
    price = prices(
        problem.law,
        motion,
        runs=ridden.runs,
        pieces=ridden.starts.size,
        power_share=problem.power_share,
        w_prime_j=problem.w_prime_j,
        multipliers=multipliers_s_per_j,
        at_lowest=problem.reserve_everywhere,
        start_j=problem.w_start_j,
    )
    ends = cell_end_slopes(problem.road, motion, ridden.target_w)
    weight = 1.0 - price.per_s
    per_energy = weight * ends.time_to - price.per_w * ends.power_to
    per_energy[:-1] += (weight * ends.time_from - price.per_w * ends.power_from)[1:]
    return Priced(time_adjoint(ends, ridden.cell_slopes, per_energy=per_energy), price, ends)


def reduced_slope(ridden: Ride, multipliers_s_per_j: Array) -> Array:
    """Slope of time less priced W′ in the power of each cell by itself (N,), s/W."""
    adjoint, price, ends = priced(ridden, multipliers_s_per_j)
    return -price.per_w * ends.power_target + adjoint * ridden.cell_slopes.power


def curvature(ridden: Ride) -> Array:
    """Second slope of the Lagrangian in each cell's power (N,), quasi-steady, s/W²."""
    power = np.maximum(ridden.target_w, 0.5 * float(np.mean(ridden.target_w)))
    return ridden.motion.time_s / (3.0 * power**2)
