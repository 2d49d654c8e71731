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
