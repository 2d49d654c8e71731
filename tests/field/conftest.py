"""A race to fit rides with, and the folder of the simulated sessions."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

import pytest

import pacing

sys.path.insert(0, str(Path(__file__).resolve().parent))

CALM = """\
[course]
file = "course.csv"
[rider]
mass_kg = 72.0
critical_power_w = 280.0
w_prime_kj = 18.0
[[rider.positions]]
name = "drops"
cda_m2 = 0.30
[bike]
mass_kg = 9.0
crr = 0.0050
[air]
temperature_c = 18.0
pressure_hpa = 1016.0
wind_speed_m_s = 0.0
wind_from_deg = 0.0
wind_height_m = 1.5
"""


@pytest.fixture(scope="session")
def calm_race(tmp_path_factory: pytest.TempPathFactory) -> Any:
    """A race in still air as forecast, the wind's error being 1 m/s at the rider."""
    folder = tmp_path_factory.mktemp("race")
    rows = "\n".join(f"{46.4 + 0.0002 * i:.6f},-31.7,{60 + 0.001 * i:.2f}" for i in range(120))
    (folder / "course.csv").write_text(f"lat_deg,lon_deg,elevation_m\n{rows}\n", encoding="utf-8")
    (folder / "race.toml").write_text(CALM, encoding="utf-8")
    return pacing.load_race(folder / "race.toml")


HILLY = CALM.replace('file = "course.csv"', 'file = "hills.csv"').replace(
    "wind_speed_m_s = 0.0\nwind_from_deg = 0.0", "wind_speed_m_s = 2.0\nwind_from_deg = 250.0"
)


@pytest.fixture(scope="session")
def hilly_plan(tmp_path_factory: pytest.TempPathFactory) -> Any:
    """A plan for a winding course of 9 km over two hills."""
    import numpy as np

    folder = tmp_path_factory.mktemp("hilly")
    at = np.arange(0.0, 9001.0, 10.0)
    heading = np.radians(70.0 * np.sin(at / 700.0) + 40.0)
    east = np.concatenate([[0.0], np.cumsum(10.0 * np.sin(heading[:-1]))])
    north = np.concatenate([[0.0], np.cumsum(10.0 * np.cos(heading[:-1]))])
    height = 120.0 + 35.0 * np.sin(at / 1000.0) ** 2 + 8.0 * np.sin(at / 400.0)
    lat = 46.0 + north / 111_150.0
    lon = -31.0 + east / (111_320.0 * np.cos(np.radians(46.0)))
    rows = "\n".join(f"{a:.7f},{b:.7f},{h:.3f}" for a, b, h in zip(lat, lon, height, strict=True))
    (folder / "hills.csv").write_text(f"lat_deg,lon_deg,elevation_m\n{rows}\n", encoding="utf-8")
    (folder / "race.toml").write_text(HILLY, encoding="utf-8")
    return pacing.plan_race(pacing.load_race(folder / "race.toml"))
