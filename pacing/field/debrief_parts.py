"""The difference between ridden and planned taken apart, by riding the course step by step.

Each step changes one thing: from the plan to the ridden power, to the drag and wind of the day,
to where the rider slowed or dared more, to the stops. What each step is worth in each cell is
what it takes away or adds; whatever is left over is said to be unexplained. So the parts add up
to the whole, in every cell, by construction.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import uniform_filter1d

from pacing.field.debrief_ridden import Ridden
from pacing.motion import Motion, Road, road_for, simulate_motion
from pacing.plan import Plan
from pacing.race import Race

Array = NDArray[np.float64]
Index = NDArray[np.intp]
Flags = NDArray[np.bool_]

PARTS = ("power", "air_and_rolling", "limits_and_braking", "stops", "unexplained")
SLOWEST_M_S = 1.5
CLEARLY, FASTER_M_S = 0.02, 1.0
SMEARED_CELLS = 7


class Parts(NamedTuple):
    """Seconds by part in each ridden cell (5, M), in the order of `PARTS`.

    Positive: slower than planned. Their sum over parts is ridden less planned time.
    """

    seconds: Array

    def sums(self, cells: slice | NDArray[np.intp] | None = None) -> dict[str, float]:
        """Seconds by part over some of the cells, by default all."""
        chosen = self.seconds if cells is None else self.seconds[:, cells]
        return {name: float(row.sum()) for name, row in zip(PARTS, chosen, strict=True)}


@dataclass(frozen=True)
class Basis:
    """What the steps start from: the planned ride of the part of the course that was ridden.

    ``race`` and its ``road`` (M cells) as planned, ``position`` (N,) per cell of the course,
    ``time_s``, ``power_w`` (M,) and ``speed_m_s`` (M+1,) as planned.
    """

    race: Race
    road: Road
    position: Index
    clock_s: Array
    cells: slice
    time_s: Array
    power_w: Array
    speed_m_s: Array
    balance_j: Array


def planned_part(plan: Plan, ridden: Ridden) -> Basis:
    """The plan's own ride over the ridden cells, under the weather the plan reckoned with."""
    race, trace, cells = plan.race, plan.trace, ridden.cells
    names = [position.name for position in race.rider.positions]
    position = np.array([names.index(name) for name in trace["position"]], dtype=np.intp)
    time = trace["time_s"].to_numpy(dtype=float)
    clock = race.plan.start_clock_s + np.cumsum(time) - 0.5 * time
    whole = road_for(race, clock_s=clock, position=position)
    # Exactly the wind and the air of the plan, whatever its clock settled to.
    whole = replace(
        whole,
        wind_along_m_s=trace["wind_along_m_s"].to_numpy(dtype=float),
        wind_across_m_s=trace["wind_across_m_s"].to_numpy(dtype=float),
        half_density_kg_m3=0.5 * trace["air_density_kg_m3"].to_numpy(dtype=float),
    )
    speed = np.append(trace["speed_from_m_s"], trace["speed_to_m_s"].iloc[-1]).astype(float)
    balance = np.append(race.rider.w_prime_j, trace["w_balance_to_j"]).astype(float)
    nodes = slice(cells.start, cells.stop + 1)
    return Basis(
        race=race,
        road=part_of_road(whole, cells),
        position=position,
        clock_s=clock,
        cells=cells,
        time_s=time[cells],
        power_w=trace["power_w"].to_numpy(dtype=float)[cells],
        speed_m_s=speed[nodes],
        balance_j=balance[nodes],
    )


def part_of_road(road: Road, cells: slice) -> Road:
    """Only some cells of a road."""
    return replace(
        road,
        cell_m=road.cell_m[cells],
        steady_n=road.steady_n[cells],
        half_density_kg_m3=road.half_density_kg_m3[cells],
        wind_along_m_s=road.wind_along_m_s[cells],
        wind_across_m_s=road.wind_across_m_s[cells],
        position=road.position[cells],
        limit_m_s=road.limit_m_s[cells.start : cells.stop + 1],
    )


def taken_apart(basis: Basis, ridden: Ridden, learnt: Race, slowed: Flags) -> Parts:
    """Seconds by part in each ridden cell.

    ``learnt`` is the race with drag and wind as the ride shows them; ``slowed`` (M+1,) marks the
    nodes at which the rider braked, stood or rolled up to it.
    """
    start = float(basis.speed_m_s[0])
    power = fine_power_w(basis.power_w, ridden.power_w)
    with_power = ride_road(basis.road, power, start, basis.speed_m_s)
    road = road_for(learnt, clock_s=basis.clock_s, position=basis.position)
    road = part_of_road(road, basis.cells)
    if learnt is basis.race:
        road = basis.road
    with_drag = ride_road(road, power, start, with_power.speed_m_s)
    limits = ridden_limits(road.limit_m_s, ridden.speed_m_s, slowed)
    with_limits = ride_road(
        replace(road, limit_m_s=limits),
        power,
        float(ridden.speed_m_s[0]),
        with_drag.speed_m_s,
    )
    moving = ridden.time_s - ridden.stop_s
    seconds = np.stack(
        [
            with_power.time_s - basis.time_s,
            with_drag.time_s - with_power.time_s,
            with_limits.time_s - with_drag.time_s,
            ridden.stop_s,
            moving - with_limits.time_s,
        ]
    )
    return Parts(seconds)


def fine_power_w(planned_w: Array, ridden_w: Array) -> Array:
    """The ridden power (M,) as fine as the plan's: planned plus the smoothed difference.

    A recording gives power by the second, some 10 m, and smears it there; where a plan changes
    from full power to coasting within a cell that would look like a mistake of the rider.
    """
    off = uniform_filter1d(ridden_w - planned_w, min(SMEARED_CELLS, planned_w.size), mode="nearest")
    return np.maximum(planned_w + off, 0.0)


def ride_road(road: Road, power_w: Array, start_m_s: float, guess_m_s: Array) -> Motion:
    """Ride a road at ``power_w`` (M,) true power from ``start_m_s``; ``guess_m_s`` (M+1,)."""
    guess = np.minimum(np.maximum(guess_m_s, SLOWEST_M_S), np.maximum(road.limit_m_s, SLOWEST_M_S))
    return simulate_motion(road, power_w, start_speed_m_s=start_m_s, guess_m_s=guess)


def ridden_limits(limit_m_s: Array, speed_m_s: Array, slowed: Flags) -> Array:
    """Limits (M+1,) as the rider took them.

    Where they ``slowed``, what they rode if it is clearly below the planned limit; and everywhere
    what they rode if it is so far above it that a second between samples does not explain it.
    """
    ridden = np.maximum(speed_m_s, SLOWEST_M_S)
    lower = slowed & (ridden < (1.0 - CLEARLY) * limit_m_s)
    higher = ridden > (1.0 + CLEARLY) * limit_m_s + FASTER_M_S
    return np.where(lower | higher, ridden, limit_m_s)
