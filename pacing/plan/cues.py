"""From optimal pieces to cues: boundaries moved to where a rider can see or read them."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.plan.marginal import Marginal
from pacing.plan.problem import Cuts
from pacing.plan.solve import Solution

Array = NDArray[np.float64]

REACH_M = 160.0
"""How far a boundary may be moved to a readable place."""


def placed(solution: Solution, value: Marginal, readable: Cuts, *, shortest_s: float) -> Cuts:
    """Move every boundary to the readable node where, to second order, it costs least.

    ``readable`` are the nodes at which a cue may begin. Boundaries that find none within
    `REACH_M`, or would make a cue too short, stay.
    """
    ridden = solution.ride
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
        costs = [
            value.change_s(slice(here, node), step)
            if node > here
            else value.change_s(slice(node, here), -step)
            for node in near.tolist()
        ]
        starts[k] = near[int(np.argmin(costs))]
    return starts
