"""Rides made from a plan: ridden again by the simulator with something changed, and recorded."""

from __future__ import annotations

from dataclasses import replace
from types import SimpleNamespace
from typing import Any

import numpy as np
import pandas as pd

from pacing.field.debrief_parts import planned_part
from pacing.motion import simulate_motion


def ridden(
    plan: Any, *, watts: tuple[int, float] | None = None, cda: float = 1.0, every_s: float = 1.0
) -> pd.DataFrame:
    """The plan's ride with ``watts`` more in one cue and another drag area, second by second.

    Within a cell speed rises evenly in time; positions lie on the course exactly.
    """
    course, trace = plan.race.course, plan.trace
    cells = slice(0, course.gradient.size)
    road = planned_part(plan, SimpleNamespace(cells=cells)).road
    road = replace(road, drag_areas=tuple(area.scaled(cda) for area in road.drag_areas))
    target = trace["target_w"].to_numpy(dtype=float).copy()
    if watts is not None:
        cue = plan.cues.iloc[watts[0]]
        here = (trace["from_m"] >= cue["from_m"] - 1e-6) & (trace["to_m"] <= cue["to_m"] + 1e-6)
        target[here.to_numpy()] += watts[1]
    motion = simulate_motion(road, target, start_speed_m_s=float(trace["speed_from_m_s"].iloc[0]))
    clock = motion.elapsed_s
    time = np.append(np.arange(0.0, clock[-1], every_s), clock[-1])
    cell = np.clip(np.searchsorted(clock, time, side="right") - 1, 0, motion.time_s.size - 1)
    since = time - clock[cell]
    speed = motion.speed_m_s[cell]
    gain = np.diff(motion.speed_m_s)[cell] / motion.time_s[cell]
    at = course.distance_m[cell] + speed * since + 0.5 * gain * since**2
    return pd.DataFrame(
        {
            "time_s": time,
            "lat_deg": np.interp(at, course.distance_m, course.lat_deg),
            "lon_deg": np.interp(at, course.distance_m, course.lon_deg),
            "elevation_m": np.interp(at, course.distance_m, course.elevation_m),
            "speed_m_s": speed + gain * since,
            "power_w": motion.power_w[cell],
        }
    )


def with_stop(ride: pd.DataFrame, at_s: float, lasting_s: float) -> pd.DataFrame:
    """The same ride with the recorder paused for a while where the rider stood."""
    late = ride["time_s"] >= at_s
    stopped = ride.copy()
    stopped.loc[late, "time_s"] += lasting_s
    return stopped


def with_way_there(ride: pd.DataFrame, seconds: int = 120) -> pd.DataFrame:
    """The same ride after a roll to the line from 600 m off, and a minute's wait there."""
    lead = np.linspace(0.006, 0.0, seconds)
    wait = np.zeros(60)
    speed = np.append(np.full(seconds, 5.0), wait)
    before = pd.DataFrame(
        {
            "time_s": np.arange(float(seconds + wait.size)),
            "lat_deg": ride["lat_deg"].iloc[0] + np.append(lead, wait),
            "lon_deg": ride["lon_deg"].iloc[0],
            "elevation_m": ride["elevation_m"].iloc[0],
            "speed_m_s": speed,
            "power_w": np.where(speed > 0, 90.0, 0.0),
        }
    )
    after = ride.copy()
    after["time_s"] += float(seconds + wait.size)
    return pd.concat([before, after], ignore_index=True)
