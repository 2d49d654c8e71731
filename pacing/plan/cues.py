"""From optimal pieces to cues: boundaries moved to where a rider can see or read them."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.plan.problem import Cuts
from pacing.plan.refine import curvature
from pacing.plan.solve import Solution

Array = NDArray[np.float64]

REACH_M = 160.0
"""How far a boundary may be moved to a readable place."""


def placed(solution: Solution, slope: Array, readable: Cuts, *, shortest_s: float) -> Cuts:
    """Move every boundary to the readable node where, to second order, it costs least.

    ``slope`` is the reduced slope per cell at the solution. Boundaries that find no readable
    node within `REACH_M`, or would make a cue too short, stay.
    """
    ridden = solution.ride
    bend = curvature(ridden)
    node_m = np.concatenate([[0.0], np.cumsum(ridden.problem.road.cell_m)])
    elapsed = ridden.motion.elapsed_s
    starts = ridden.starts.copy()
    for k in range(1, starts.size):
        here = int(starts[k])
        after = elapsed[starts[k + 1]] if k + 1 < starts.size else elapsed[-1]
        near = readable[np.abs(node_m[readable] - node_m[here]) <= REACH_M]
        near = near[
            (elapsed[near] - elapsed[starts[k - 1]] >= shortest_s)
            & (after - elapsed[near] >= shortest_s)
        ]
        if near.size == 0:
            continue
        step = float(ridden.power_w[k - 1] - ridden.power_w[k])
        costs = [_cost_of_move(slope, bend, here, int(node), step) for node in near]
        starts[k] = near[int(np.argmin(costs))]
    return starts


def _cost_of_move(slope: Array, bend: Array, here: int, there: int, step_w: float) -> float:
    """Lagrangian's change when the boundary goes from ``here`` to ``there``."""
    a, b = min(here, there), max(here, there)
    change = step_w if there > here else -step_w
    return float(change * slope[a:b].sum() + 0.5 * change**2 * bend[a:b].sum())
