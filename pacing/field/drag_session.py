"""Rides as one row of steps, with everything an energy balance needs of each."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.field.recording_check import Ride
from pacing.race import Race

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
Index = NDArray[np.intp]


@dataclass(frozen=True)
class Session:
    """The steps (S,) of one or more rides in a row, each from one sample to the next.

    ``dt_s``, ``way_m``, ``rise_m`` (NaN without heights), ``east_m`` and ``north_m`` moved;
    ``speed_m_s`` at mid-step and ``half_square`` the gain of v²/2 [m²/s²]; ``work_j`` at the
    wheel as the meter showed it; ``half_density_kg_m3``; ``sine`` and ``cosine`` of the heading;
    ``wind_turn_m_s`` (2, S) by how much the forecast wind at the rider, from east and north, is
    other than in the middle of the ride; ``wind_share`` of the wind that reaches the rider and
    ``crr_factor`` of the road's surface, 1 where nothing is known; ``ride`` index; ``group`` the
    index of the position ridden in, −1 where none asked for; ``usable`` where all that is needed
    was measured. ``from_s`` and ``from_m`` are where in the ride a step begins. ``rides`` and
    ``first`` (R,) are the rides and their first steps.
    """

    rides: tuple[Ride, ...]
    first: Index
    dt_s: Array
    way_m: Array
    rise_m: Array
    east_m: Array
    north_m: Array
    speed_m_s: Array
    half_square: Array
    power_w: Array
    work_j: Array
    half_density_kg_m3: Array
    sine: Array
    cosine: Array
    wind_turn_m_s: Array
    wind_share: Array
    crr_factor: Array
    ride: Index
    group: Index
    usable: Flags
    from_s: Array
    from_m: Array

    @property
    def headed(self) -> bool:
        """Whether every ride has headings, so that wind is a vector rather than a number."""
        return all(ride.placed for ride in self.rides)

    @property
    def has_heights(self) -> bool:
        """Whether every ride has heights."""
        return all(ride.has_heights for ride in self.rides)


def session_of(
    rides: Sequence[Ride],
    race: Race,
    groups: Sequence[Index],
    heights: Sequence[Array],
    *,
    begins_s: float = 0.0,
) -> Session:
    """Join rides; ``groups`` and ``heights`` hold for each ride one value a sample (n,).

    ``heights`` [m] may be the recorded ones or others for the same places, NaN where unknown.
    ``begins_s`` is the time of the recordings at which the race file's start was.
    """
    parts = [
        _steps(ride, race, group, height, begins_s)
        for ride, group, height in zip(rides, groups, heights, strict=True)
    ]
    counts = [part["dt_s"].size for part in parts]
    joined = {name: np.concatenate([part[name] for part in parts], axis=-1) for name in parts[0]}
    return Session(
        rides=tuple(rides),
        first=np.concatenate([[0], np.cumsum(counts)[:-1]]).astype(np.intp),
        ride=np.repeat(np.arange(len(parts)), counts),
        **joined,
    )


def _steps(
    ride: Ride, race: Race, group: Index, height: Array, begins_s: float
) -> dict[str, NDArray[np.generic]]:
    dt = np.diff(ride.time_s)
    speed = ride.speed_m_s
    middle = 0.5 * (speed[1:] + speed[:-1])
    power = 0.5 * (ride.power_w[1:] + ride.power_w[:-1]) * race.rider.power_meter_factor
    heading = np.radians(ride.heading_deg) if ride.placed else np.zeros(speed.size)
    # Through the middle of both ends' directions, so that 359° and 1° do not average to 180°.
    sine, cosine = (0.5 * (f(heading[1:]) + f(heading[:-1])) for f in (np.sin, np.cos))
    length = np.maximum(np.hypot(sine, cosine), 1e-9)
    level = float(np.nanmean(height)) if np.isfinite(height).any() else _race_height_m(race)
    at_height = np.nan_to_num(0.5 * (height[1:] + height[:-1]), nan=level)
    clock = race.plan.start_clock_s + ride.time_s[:-1] - begins_s
    density = np.broadcast_to(race.day.density_kg_m3(at_height, clock), dt.shape)
    same = group[1:] == group[:-1]
    usable = ride.whole & same & (group[1:] >= 0)
    if ride.has_heights:
        usable &= np.isfinite(np.diff(height))
    return {
        "dt_s": dt,
        "way_m": np.nan_to_num(middle * dt),
        "rise_m": np.diff(height),
        "east_m": np.nan_to_num(np.diff(ride.east_m)),
        "north_m": np.nan_to_num(np.diff(ride.north_m)),
        "speed_m_s": np.nan_to_num(middle),
        "half_square": np.nan_to_num(0.5 * (speed[1:] ** 2 - speed[:-1] ** 2)),
        "power_w": np.nan_to_num(power),
        "work_j": np.nan_to_num(race.bike.efficiency * power * dt),
        "half_density_kg_m3": 0.5 * density,
        "sine": np.nan_to_num(sine / length),
        "cosine": np.nan_to_num(cosine / length),
        "wind_turn_m_s": _turning_wind(race, clock, middle_clock_s(ride, race, begins_s)),
        "wind_share": np.ones_like(dt),
        "crr_factor": np.ones_like(dt),
        "group": np.where(same, group[1:], -1),
        "usable": usable,
        "from_s": ride.time_s[:-1],
        "from_m": ride.travelled_m[:-1],
    }


def _race_height_m(race: Race) -> float:
    return float(np.mean(race.course.elevation_m))


def middle_clock_s(ride: Ride, race: Race, begins_s: float = 0.0) -> float:
    """Clock of the day in the middle of a ride, the race file's start being at ``begins_s`` [s]."""
    return race.plan.start_clock_s - begins_s + 0.5 * float(ride.time_s[-1])


def _turning_wind(race: Race, clock: Array, middle_s: float) -> Array:
    """How the forecast changes over the ride, where the race file gives it by the hour."""
    if len(race.day.weathers) == 1:
        return np.zeros((2, clock.size))
    sides = [race.day.wind_at_rider(way, 1.0, clock).along_m_s for way in (90.0, 0.0)]
    middle = [float(race.day.wind_at_rider(way, 1.0, middle_s).along_m_s) for way in (90.0, 0.0)]
    return np.asarray(np.stack(sides) - np.array(middle)[:, None])
