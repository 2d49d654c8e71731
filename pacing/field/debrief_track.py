"""Following a line on the ground, sample by sample, never losing which pass of it one is on."""

from __future__ import annotations

from bisect import bisect_right
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

REACH_M, REACH_SHARE, MOST_REACH_M = 30.0, 0.15, 1500.0
"""How far from where the wheel says it must be the place on the line is looked for."""
LOST_M, LOST_S = 4000.0, 3600.0
DISTANCE_WEIGHT = 0.15


@dataclass(frozen=True)
class Line:
    """Course nodes (N+1,) and samples of a ride (n,) on one plane [m].

    ``distance_m`` (N+1,) along the course, ``heading_deg`` (N,) of its cells.
    """

    distance_m: Array
    east_m: Array
    north_m: Array
    heading_deg: Array
    ride_east_m: Array
    ride_north_m: Array


def follow(
    line: Line, travelled_m: Array, time_s: Array, first: int, at_m: float, *, near_m: float
) -> tuple[Array, float]:
    """Place along the course (n,) [m] from sample ``first`` at ``at_m`` on, and how far off.

    ``travelled_m`` and ``time_s`` (n,) are the ride's way and clock. NaN where the rider was
    further than ``near_m`` from the line; ends at its end or where the line was lost.
    """
    last_cell = line.distance_m.size - 2
    along = np.full(travelled_m.size, np.nan)
    east, north = line.east_m.tolist(), line.north_m.tolist()
    nodes = line.distance_m.tolist()
    way, clock = travelled_m.tolist(), time_s.tolist()
    xs, ys = line.ride_east_m.tolist(), line.ride_north_m.tolist()
    place, place_way, place_s = at_m, way[first], clock[first]
    offs: list[float] = []
    end = nodes[-1]
    for sample in range(first, len(way)):
        x, y = xs[sample], ys[sample]
        if x != x:
            continue
        moved = way[sample] - place_way
        if moved > LOST_M or clock[sample] - place_s > LOST_S:
            break
        expected = place + moved
        reach = min(REACH_M + REACH_SHARE * moved, MOST_REACH_M)
        low = max(bisect_right(nodes, max(expected - reach, place - REACH_M)) - 1, 0)
        high = min(bisect_right(nodes, expected + reach) - 1, last_cell)
        best, found, off = float("inf"), place, float("inf")
        for k in range(low, high + 1):
            ax, ay = east[k], north[k]
            dx, dy = east[k + 1] - ax, north[k + 1] - ay
            square = dx * dx + dy * dy
            share = ((x - ax) * dx + (y - ay) * dy) / square if square > 1e-9 else 0.0
            share = min(max(share, 0.0), 1.0)
            ox, oy = ax + share * dx - x, ay + share * dy - y
            here = nodes[k] + share * (nodes[k + 1] - nodes[k])
            apart = DISTANCE_WEIGHT * (here - expected)
            cost = ox * ox + oy * oy + apart * apart
            if cost < best:
                best, found, off = cost, here, (ox * ox + oy * oy) ** 0.5
        if off > near_m:
            continue
        along[sample] = found
        place, place_way, place_s = found, way[sample], clock[sample]
        offs.append(off)
        if found >= end - 0.5:
            break
    return along, float(np.median(offs)) if offs else float("inf")
