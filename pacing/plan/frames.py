"""The plan's tables: trace, pieces, cues and splits as DataFrames, and the numbers behind them."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd

from pacing.plan.places import Place, words_at
from pacing.plan.position_road import asked_in_pieces
from pacing.plan.problem import Ride
from pacing.race import Race
from pacing.units import GRAVITY_M_S2, KMH_PER_M_S, clock_text

WITHIN_M = 80.0


def trace_frame(race: Race, ridden: Ride) -> pd.DataFrame:
    """One row a grid cell: what the road asked, what the rider did, W′ left."""
    course, road, motion = race.course, ridden.problem.road, ridden.motion
    speed = motion.speed_m_s
    names = np.array([position.name for position in race.rider.positions], dtype=object)
    return pd.DataFrame(
        {
            "from_m": course.distance_m[:-1],
            "to_m": course.distance_m[1:],
            "lat_deg": course.lat_deg[:-1],
            "lon_deg": course.lon_deg[:-1],
            "elevation_m": course.elevation_m[:-1],
            "gradient": course.gradient,
            "heading_deg": course.heading_deg,
            "air_density_kg_m3": 2.0 * road.half_density_kg_m3,
            "wind_along_m_s": road.wind_along_m_s,
            "wind_across_m_s": road.wind_across_m_s,
            "crr": race.bike.crr * course.crr_factor,
            "position": names[road.position],
            "power_share": ridden.problem.power_share,
            "critical_power_w": ridden.problem.critical_power_w,
            "efficiency": np.full(course.gradient.size, road.efficiency),
            "cda_m2": road.drag_area_m2(0.5 * (speed[1:] + speed[:-1])),
            "speed_limit_from_m_s": road.limit_m_s[:-1],
            "speed_limit_to_m_s": road.limit_m_s[1:],
            "target_w": ridden.target_w,
            "power_w": motion.power_w,
            "braking_n": motion.braking_n,
            "speed_from_m_s": speed[:-1],
            "speed_to_m_s": speed[1:],
            "time_s": motion.time_s,
            "w_balance_to_j": ridden.balance_j[1:],
        }
    )


def piece_frame(ridden: Ride) -> pd.DataFrame:
    """One row a piece as solved: unrounded true power."""
    edges, elapsed = _edges(ridden)
    node_m = np.concatenate([[0.0], np.cumsum(ridden.problem.road.cell_m)])
    return pd.DataFrame(
        {
            "from_m": node_m[edges[:-1]],
            "to_m": node_m[edges[1:]],
            "power_w": ridden.power_w,
            "time_s": np.diff(elapsed[edges]),
            "w_balance_to_j": ridden.balance_j[edges[1:]],
        }
    )


def cue_frame(race: Race, ridden: Ride, places: tuple[Place, ...]) -> pd.DataFrame:
    """One row a cue: what is printed. Powers as the rider's meter shows them."""
    course = race.course
    edges, elapsed = _edges(ridden)
    from_m, to_m = course.distance_m[edges[:-1]], course.distance_m[edges[1:]]
    time = np.diff(elapsed[edges])
    rise = np.diff(course.elevation_m[edges])
    words = [words_at(course, places, at, within_m=WITHIN_M) for at in from_m]
    words[0] = "start"
    asked = asked_in_pieces(ridden.problem, ridden.starts)
    names = [race.rider.positions[i].name for i in asked]
    shown = ridden.power_w / race.rider.power_meter_factor
    return pd.DataFrame(
        {
            "from_km": from_m / 1000.0,
            "to_km": to_m / 1000.0,
            "landmark": words,
            "position": names,
            "power_w": np.round(shown, 6),
            "speed_kmh": (to_m - from_m) / time * KMH_PER_M_S,
            "clock": [clock_text(t) for t in elapsed[edges[:-1]]],
            "w_balance_kj": ridden.balance_j[edges[:-1]] / 1000.0,
            "from_m": from_m,
            "to_m": to_m,
            "time_s": time,
            "words": words,
            "gradient_pct": 100.0 * rise / np.maximum(to_m - from_m, 1.0),
        }
    )


def split_frame(race: Race, ridden: Ride) -> pd.DataFrame:
    """One row a whole kilometre, and the finish."""
    node_m, elapsed = race.course.distance_m, ridden.motion.elapsed_s
    marks = np.arange(1000.0, race.course.length_m - 1.0, 1000.0)
    marks = np.append(marks, race.course.length_m)
    return pd.DataFrame(
        {
            "at_km": marks / 1000.0,
            "elapsed_s": np.interp(marks, node_m, elapsed),
            "w_balance_kj": np.interp(marks, node_m, ridden.balance_j) / 1000.0,
        }
    )


def model_inputs(race: Race, ridden: Ride) -> dict[str, Any]:
    """The scalars that make the trace reproducible."""
    problem, road = ridden.problem, ridden.problem.road
    return {
        "gravity_m_s2": GRAVITY_M_S2,
        "mass_kg": race.mass_kg,
        "effective_mass_kg": road.effective_mass_kg,
        "drivetrain_efficiency": road.efficiency,
        "bearing_n": race.bike.bearing_n,
        "bearing_n_per_m_s": race.bike.bearing_n_per_m_s,
        "start_speed_m_s": float(ridden.motion.speed_m_s[0]),
        "critical_power_w": float(problem.critical_power_w[0]),
        "w_prime_j": problem.w_prime_j,
        "reserve_j": problem.reserve_j,
        "min_power_w": problem.min_power_w,
        "max_power_w": problem.max_power_w,
        "first_30_s_max_w": problem.first_30_s_max_w,
        "peak_power_w": problem.peak_power_w,
        "traction_n": road.traction_n,
        "spin_out_m_s": None if np.isinf(road.spin_out_m_s) else road.spin_out_m_s,
        "recovery_law": {
            "name": problem.law.name,
            "pool_shares": list(problem.law.pool_shares),
            **problem.law.constants,
        },
    }


def _edges(ridden: Ride) -> tuple[Any, Any]:
    edges = np.append(ridden.starts, ridden.problem.cells)
    return edges, ridden.motion.elapsed_s
