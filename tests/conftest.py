"""Fixtures that any test may use."""

from __future__ import annotations

import math
import os
from collections.abc import Callable
from pathlib import Path

import pytest


def _recorded_folder() -> Path:
    named = os.environ.get("PACING_RECORDED")
    if named:
        return Path(named)
    return Path(__file__).resolve().parents[2] / "shared" / "recorded"


def _part(name: str) -> Path:
    folder = _recorded_folder() / name
    if not folder.is_dir():
        pytest.skip(
            "no recorded files: name their folder in the environment variable PACING_RECORDED"
        )
    return folder


@pytest.fixture(scope="session")
def recorded_courses() -> Path:
    """The folder of recorded course files, or a skip that says how to name it."""
    return _part("courses")


@pytest.fixture(scope="session")
def recorded_rides() -> Path:
    """The folder of recorded rides, or a skip that says how to name it."""
    return _part("rides")


SMALL_RACE = """\
[course]
file = "course.gpx"

[rider]
mass_kg = 72.0
critical_power_w = 304.0
w_prime_kj = 18.0

[[rider.positions]]
name = "aero bars"
cda_m2 = 0.235

[bike]
mass_kg = 8.6
crr = 0.0040

[air]
temperature_c = 18.0
pressure_hpa = 1016.0
wind_speed_m_s = 3.0
wind_from_deg = 240.0
surroundings = "farmland"
"""


@pytest.fixture
def small_race() -> str:
    """The text of a race file with the required keys and nothing that gives a caution."""
    return SMALL_RACE


@pytest.fixture
def write_race(tmp_path: Path) -> Callable[..., Path]:
    """Writes a race file (text or bytes) beside a course of 3 km, and tells where."""
    points = (
        (46.4 + 0.00018 * i, -31.7 + 0.0001 * math.sin(i / 9.0), 60.0 + 8.0 * math.sin(i / 40.0))
        for i in range(150)
    )
    track = "".join(
        f'<trkpt lat="{lat:.7f}" lon="{lon:.7f}"><ele>{ele:.2f}</ele></trkpt>'
        for lat, lon, ele in points
    )
    gpx = (
        '<gpx version="1.1" creator="a test" xmlns="http://www.topografix.com/GPX/1/1">'
        f"<trk><name>Fieldway</name><trkseg>{track}</trkseg></trk></gpx>"
    )
    (tmp_path / "course.gpx").write_text(gpx, encoding="utf-8")

    def write(text: str | bytes = SMALL_RACE, name: str = "race.toml") -> Path:
        file = tmp_path / name
        file.write_bytes(text.encode() if isinstance(text, str) else text)
        return file

    return write
