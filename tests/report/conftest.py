"""Plans made up for the report's tests: invented roads, a crude rider, the columns of a real plan.

The numbers only have to look like a ride; nothing here checks the physics.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import numpy as np
import pandas as pd
import pytest

from pacing.course.course import Course, CourseReport, SlowPoint

LONG_NAMES = (
    "second left after the old creamery with the crooked chimney",
    "Llanbrythonfechanwernddu chapel",
    "Überländstraßenbrückenköpfchen",
    "level crossing, then the long false flat past the gravel works",
)
WORDS = ("over the top", "after the turn", "foot of the climb", "", "dead turn", "")


@dataclass(frozen=True)
class MadePlan:
    """The attributes of a plan, and nothing else."""

    race: Any
    time_s: float
    cues: pd.DataFrame
    pieces: pd.DataFrame
    trace: pd.DataFrame
    splits: pd.DataFrame
    solver: dict[str, Any]
    sensitivities: dict[str, Any] | None
    constant: dict[str, Any] | None
    cautions: tuple[str, ...]
    inputs: dict[str, Any]
    positions: dict[str, Any] | None = None

    def to_json_dict(self) -> dict[str, Any]:
        """As a real plan gives itself, NaN and numpy numbers included."""
        tables = {name: getattr(self, name).to_dict("records") for name in ("cues", "splits")}
        return {"schema": "plan/1", "time_s": self.time_s, "solver": self.solver, **tables}


def _line(shape: str, node_m: np.ndarray, length_m: float) -> tuple[np.ndarray, np.ndarray]:
    """East and north (m) of an invented road; each shape is about ``length_m`` long."""
    turn = node_m / length_m
    if shape == "out and back":
        out = np.minimum(node_m, length_m - node_m)
        return out * 0.94, 0.34 * out + 260 * np.sin(out / 1400)
    if shape == "climb":
        angle = 0.5 + 0.9 * np.sin(node_m / 620) + 0.5 * np.sin(node_m / 171)
    elif shape == "laps":
        angle = 2 * np.pi * 5 * turn + 0.9 * np.sin(2 * np.pi * 15 * turn)
    else:
        angle = 2 * np.pi * turn + 0.7 * np.sin(6 * np.pi * turn) + 0.4 * np.sin(node_m / 900)
    step = np.diff(node_m, prepend=0.0)
    return np.cumsum(step * np.sin(angle)), np.cumsum(step * np.cos(angle))


def _height(shape: str, node_m: np.ndarray, length_m: float) -> np.ndarray:
    if shape == "climb":
        return 310 + 0.062 * node_m + 22 * np.sin(node_m / 700)
    if shape == "laps":
        return 40 + 9 * np.sin(2 * np.pi * 5 * node_m / length_m)
    if shape == "out and back":
        out = np.minimum(node_m, length_m - node_m)
        return 22 + 0.0015 * out + 6 * np.sin(out / 800)
    wave = np.sin(2 * np.pi * 3 * node_m / length_m)
    return 120 + 65 * wave + 18 * np.sin(2 * np.pi * node_m / 3100)


def _course(shape: str, name: str, length_m: float) -> Course:
    cells = round(length_m / 10)
    node_m = np.linspace(0.0, length_m, cells + 1)
    east, north = _line(shape, node_m, length_m)
    height = _height(shape, node_m, length_m)
    lat = 57.3 + north / 111_300
    lon = 14.2 + east / (111_300 * np.cos(np.radians(57.3)))
    slow = {
        "out and back": (SlowPoint(length_m / 2, 15 / 3.6, note="dead turn"),),
        "laps": tuple(
            SlowPoint((lap + 0.4) * length_m / 5, 22 / 3.6, note="hairpin") for lap in range(5)
        ),
    }.get(shape, (SlowPoint(0.31 * length_m, 25 / 3.6, note="roundabout at the dairy"),))
    laps = 5 if shape == "laps" else 1
    return Course(
        name=name,
        distance_m=node_m,
        lat_deg=lat,
        lon_deg=lon,
        elevation_m=height,
        gradient=np.diff(height) / np.diff(node_m),
        heading_deg=np.degrees(np.arctan2(np.diff(east), np.diff(north))) % 360,
        crr_factor=np.ones(cells),
        wind_share=np.ones(cells),
        lap_length_m=length_m / laps,
        laps=laps,
        slow_points=slow,
        bends=(),
        landmarks=(),
        report=CourseReport(length_m, 600.0, 420.0, "recorded", 1.0, 0.3),
    )


def _limits(course: Course) -> np.ndarray:
    """Highest speed (m/s) at each node: slow points with a braking run before them."""
    limit = np.full(course.distance_m.size, np.inf)
    for slow in course.slow_points:
        after = course.distance_m - slow.at_m
        inside = (after >= 0) & (after <= slow.length_m)
        limit[inside] = np.minimum(limit[inside], slow.speed_m_s)
        before = after < 0
        envelope = np.sqrt(slow.speed_m_s**2 - 2 * 2.4 * np.minimum(after, 0))
        limit[before] = np.minimum(limit[before], envelope[before])
    return np.where(limit > 22, np.inf, limit)


def _speed(power_w: np.ndarray, course: Course, wind_m_s: np.ndarray) -> np.ndarray:
    """Node speeds (m/s): quasi-steady, then lagged over some 120 m, from a standing start."""
    steady = np.full(power_w.size, 9.0)
    for _ in range(40):
        along = np.maximum(steady + wind_m_s, 1.0)
        force = 0.14 * along**2 + 83 * 9.81 * (0.0045 + course.gradient)
        slope = 0.28 * along * steady + np.maximum(force, -120)
        steady = np.clip(steady - 0.5 * (force * steady - power_w) / (abs(slope) + 20), 2, 20)
    energy = np.zeros(power_w.size + 1)
    for cell, wanted in enumerate(steady):
        energy[cell + 1] = energy[cell] + (wanted**2 - energy[cell]) * 10 / 130
    return np.minimum(np.sqrt(energy), _limits(course))


def _targets(course: Course, cues: int, cp_w: float, rng: np.random.Generator) -> np.ndarray:
    """Cue boundaries (node indices), uneven but none shorter than a few hundred metres."""
    cells = course.gradient.size
    weight = 1 + rng.gamma(1.5, 0.5, cues)
    cut = np.round(np.cumsum(weight / weight.sum()) * cells).astype(int)
    return np.concatenate([[0], cut[:-1], [cells]])


def build_plan(
    *,
    shape: str = "rolling",
    name: str = "Lindmoor loop",
    length_m: float = 40_000.0,
    cues: int = 16,
    cp_w: float = 300.0,
    long_names: bool = False,
    positions: int = 1,
    wind: tuple[float, float] = (1.6, 240.0),
    constant: bool = True,
    cautions: tuple[str, ...] = (),
    units: str = "metric",
) -> MadePlan:
    """A made-up plan: ``wind`` is (m/s at the rider, from degrees)."""
    rng = np.random.default_rng(7)
    course = _course(shape, name, length_m)
    edge = _targets(course, cues, cp_w, rng)
    grade = np.array([course.gradient[a:b].mean() for a, b in pairwise(edge)])
    power = np.round(np.clip(cp_w * (1 + 4.5 * grade), 0.4 * cp_w, 1.35 * cp_w) / 5) * 5
    cell_cue = np.repeat(np.arange(cues), np.diff(edge))
    turn = np.radians(wind[1] - course.heading_deg)
    along, across = wind[0] * np.cos(turn), wind[0] * np.sin(turn)
    speed = _speed(power[cell_cue], course, along)
    limit = _limits(course)
    step = course.cell_length_m
    time = 2 * step / (speed[:-1] + speed[1:])
    held = (speed[1:] >= limit[1:] - 1e-9) & np.isfinite(limit[1:])
    ridden = np.where(held, 0.0, power[cell_cue])
    spent = (ridden - cp_w) * time
    balance = 19_000 - np.cumsum(np.where(spent > 0, spent, 0.4 * spent))
    # The crude rider is bent back to a plausible reserve, not simulated.
    low, high = balance.min(), max(balance.max(), 19_000.0)
    balance = 2_500 + (balance - low) * 16_500 / max(high - low, 1.0)
    where = np.array(["aero bars", "upright"])[
        (cell_cue % 4 == 2).astype(int) if positions > 1 else np.zeros(cell_cue.size, int)
    ]
    node = course.distance_m
    trace = pd.DataFrame(
        {
            "from_m": node[:-1],
            "to_m": node[1:],
            "lat_deg": course.lat_deg[:-1],
            "lon_deg": course.lon_deg[:-1],
            "elevation_m": course.elevation_m[:-1],
            "gradient": course.gradient,
            "heading_deg": course.heading_deg,
            "air_density_kg_m3": 1.21,
            "wind_along_m_s": along,
            "wind_across_m_s": across,
            "crr": 0.0042,
            "position": where,
            "power_share": 1.0,
            "critical_power_w": cp_w,
            "efficiency": 0.976,
            "cda_m2": 0.229,
            "speed_limit_from_m_s": limit[:-1],
            "speed_limit_to_m_s": limit[1:],
            "target_w": power[cell_cue],
            "power_w": ridden,
            "braking_n": np.where(held, 160.0, 0.0),
            "speed_from_m_s": speed[:-1],
            "speed_to_m_s": speed[1:],
            "time_s": time,
            "w_balance_to_j": balance,
        }
    )
    node_time = np.concatenate([[0.0], np.cumsum(time)])
    node_w = np.concatenate([[19_000.0], balance])
    rows = []
    for cue in range(cues):
        a, b = edge[cue], edge[cue + 1]
        took = node_time[b] - node_time[a]
        landmark = LONG_NAMES[cue % len(LONG_NAMES)] if long_names else None
        rows.append(
            {
                "from_km": node[a] / 1000,
                "to_km": node[b] / 1000,
                "landmark": landmark,
                "position": where[a],
                "power_w": int(power[cue]),
                "speed_kmh": (node[b] - node[a]) / took * 3.6,
                "clock": _clock(node_time[a]),
                "w_balance_kj": node_w[a] / 1000,
                "from_m": node[a],
                "to_m": node[b],
                "time_s": took,
                "words": "start" if cue == 0 else WORDS[cue % len(WORDS)],
                "gradient_pct": 100 * (course.elevation_m[b] - course.elevation_m[a])
                / (node[b] - node[a]),
            }
        )  # fmt: skip
    table = pd.DataFrame(rows)
    whole = np.arange(1, int(length_m // 1000) + 1) * 1000.0
    splits = pd.DataFrame(
        {
            "at_km": whole / 1000,
            "elapsed_s": np.interp(whole, node, node_time),
            "w_balance_kj": np.interp(whole, node, node_w) / 1000,
        }
    )
    total = float(node_time[-1])
    race = SimpleNamespace(
        course=course,
        rider=SimpleNamespace(
            w_prime_j=19_000.0,
            critical_power_w=cp_w + 8,
            power_meter_factor=1.0,
            positions=tuple(SimpleNamespace(name=n) for n in ("aero bars", "upright")[:positions]),
        ),
        plan=SimpleNamespace(start_clock_s=34_200.0, reserve_j=2_500.0, units=units),
        file=Path("lindmoor.toml"),
        options=(),
    )
    return MadePlan(
        race=race,
        time_s=total,
        cues=table,
        pieces=table[["from_km", "to_km", "position", "power_w"]],
        trace=trace,
        splits=splits,
        solver={
            "method": "SLSQP",
            "status": "solved",
            "iterations": 41,
            "seconds": 0.31,
            "kkt_residual": float("nan"),
            "gap_pct": np.float64(0.31),
        },
        sensitivities=None,
        constant={"time_s": total * 1.011, "power_w": 0.985 * cp_w} if constant else None,
        cautions=cautions,
        inputs={
            "course": {"file": "lindmoor.gpx"},
            "air": {"wind_speed_m_s": 3.1, "wind_from_deg": wind[1], "wind_height_m": 10.0},
            "model": {"critical_power_w": cp_w, "w_prime_j": 19_000.0, "reserve_j": 2_500.0},
        },
    )


def _clock(seconds: float) -> str:
    whole = round(seconds)
    return f"{whole // 3600}:{whole // 60 % 60:02d}:{whole % 60:02d}"


@pytest.fixture(scope="session")
def make_plan() -> Callable[..., MadePlan]:
    """Builds a made-up plan; see ``build_plan``."""
    return build_plan
