"""What a plan warns of: fast descents, values beyond a table, gains too good to be true."""

from __future__ import annotations

import numpy as np

from pacing.plan.position_prices import outside_s
from pacing.plan.problem import Ride
from pacing.race import Race
from pacing.units import KMH_PER_M_S

FAST_DESCENT_KMH = 55.0
BELIEVABLE_GAIN_PCT = 4.0
YAW_SHARE_PCT = 2.0
LET_PASS_S = 5.0
"""Seconds outside a position's bounds at the edges of cues that need no word."""


def plan_cautions(race: Race, ridden: Ride, constant: Ride) -> tuple[str, ...]:
    """The race's own cautions and those the ride gives rise to, in plain sentences."""
    found = list(race.cautions)
    found += _fast_descents(race, ridden)
    found += _yaw_beyond_tables(race, ridden)
    found += _outside_positions(ridden)
    if len(race.rider.positions) > 1:
        found.append(
            "The position of a cue is for an open road: keep the hands at the brakes wherever you "
            "may need them."
        )
    gain = 100.0 * (1.0 - ridden.motion.total_s / constant.motion.total_s)
    if gain > BELIEVABLE_GAIN_PCT:
        found.append(
            f"The plan gains {gain:.1f} % over a constant target, more than pacing has been seen "
            "to give on a real course: check the heights, the reserve and the limits."
        )
    return tuple(dict.fromkeys(found))


def _fast_descents(race: Race, ridden: Ride) -> list[str]:
    speed = KMH_PER_M_S * ridden.motion.speed_m_s
    fast = speed > FAST_DESCENT_KMH
    if not np.any(fast):
        return []
    km = race.course.distance_m / 1000.0
    worst = int(np.argmax(speed))
    return [
        f"The plan passes {FAST_DESCENT_KMH:.0f} km/h over {np.sum(np.diff(km)[fast[1:]]):.1f} km, "
        f"{speed[worst]:.0f} km/h at km {km[worst]:.1f}: a prediction, not a safe speed. Ride what "
        "you can see, and lower rider.max_speed_kmh to what you are willing to do."
    ]


def _yaw_beyond_tables(race: Race, ridden: Ride) -> list[str]:
    road, motion = ridden.problem.road, ridden.motion
    tabled = [area for area in road.drag_areas if len(area.yaw_deg) > 1]
    if not tabled:
        return []
    along = motion.speed_m_s[1:] + road.wind_along_m_s
    yaw = np.degrees(np.arctan2(np.abs(road.wind_across_m_s), along))
    last = min(float(area.yaw_deg[-1]) for area in tabled)
    share = 100.0 * float(np.sum(road.cell_m[yaw > last]) / np.sum(road.cell_m))
    if share <= YAW_SHARE_PCT:
        return []
    return [
        f"On {share:.0f} % of the way the wind comes from more than {last:.0f}°, the last yaw of "
        "the drag table; the last value is used there."
    ]


def _outside_positions(ridden: Ride) -> list[str]:
    if ridden.problem.sitting is None:
        return []
    seconds = outside_s(ridden)
    if seconds <= LET_PASS_S:
        return []
    return [
        f"For {seconds:.0f} s the plan asks for a position outside the speeds or the time given "
        "for it: no other choice was found. Check min_speed_kmh, max_speed_kmh and longest_s of "
        "rider.positions, or allow more cues."
    ]
