"""Fixtures that any test may use."""

from __future__ import annotations

import math
import os
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

for _name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(_name, "1")  # as the command does, before numpy is imported


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


@pytest.fixture(scope="session")
def make_road() -> Callable[..., Any]:
    """Makes a `Road` of plain numbers; ``gradient`` (N,) or one number with ``cells``."""
    import numpy as np

    from pacing.bike import DragArea
    from pacing.motion import Road

    def road(gradient: Any = 0.0, *, cells: int = 100, cell_m: Any = 10.0, **changes: Any) -> Road:
        gradient = np.asarray(gradient, dtype=float)
        count = gradient.size if gradient.ndim else cells
        given: dict[str, Any] = {
            "mass_kg": 82.0,
            "crr": 0.004,
            "density_kg_m3": 1.2,
            "drag_area": DragArea((0.0,), (0.235,)),
            "wind_along_m_s": 0.0,
            "wind_across_m_s": 0.0,
            "bearing_n": 0.091,
            "bearing_n_per_m_s": 0.0087,
            "efficiency": 0.976,
            "effective_mass_kg": 83.25,
            "traction_n": np.inf,
            "spin_out_m_s": np.inf,
            "limit_m_s": np.inf,
            "gravity_m_s2": 9.80665,
        } | changes
        weight_n = given["mass_kg"] * given["gravity_m_s2"]
        steady = weight_n * (gradient + given["crr"]) / np.sqrt(1.0 + gradient**2)

        def spread(value: Any, size: int = count) -> Any:
            return np.broadcast_to(np.asarray(value, dtype=float), (size,)).copy()

        return Road(
            cell_m=spread(cell_m),
            steady_n=spread(steady + given["bearing_n"]),
            half_density_kg_m3=spread(0.5 * given["density_kg_m3"]),
            wind_along_m_s=spread(given["wind_along_m_s"]),
            wind_across_m_s=spread(given["wind_across_m_s"]),
            position=np.zeros(count, dtype=np.intp),
            drag_areas=(given["drag_area"],),
            bearing_n_per_m_s=given["bearing_n_per_m_s"],
            efficiency=given["efficiency"],
            effective_mass_kg=given["effective_mass_kg"],
            traction_n=given["traction_n"],
            spin_out_m_s=given["spin_out_m_s"],
            limit_m_s=spread(given["limit_m_s"], count + 1),
        )

    return road


@pytest.fixture(scope="session")
def make_problem() -> Callable[..., Any]:
    """Makes a `Problem` on a `Road`: 300 W, 18 kJ, 2 kJ kept back; ``law`` by name or itself."""
    import numpy as np

    from pacing.plan.problem import Problem
    from pacing.rider.budget import recovery_law

    def problem(road: Any, **changes: Any) -> Problem:
        given: dict[str, Any] = {
            "law": "two-phase",
            "start_speed_m_s": 0.0,
            "critical_power_w": 300.0,
            "power_share": 1.0,
            "w_prime_j": 18_000.0,
            "reserve_j": 2_000.0,
            "min_power_w": 0.0,
            "max_power_w": 420.0,
            "first_30_s_max_w": 400.0,
        } | changes
        if isinstance(given["law"], str):
            given["law"] = recovery_law(given["law"])
        for name in ("critical_power_w", "power_share"):
            given[name] = np.broadcast_to(np.asarray(given[name], float), road.cell_m.shape).copy()
        return Problem(road=road, **given)

    return problem


@pytest.fixture(scope="session")
def make_race() -> Callable[..., Any]:
    """Makes a `Race` on an invented course; keys of the race file as ``section__key``."""
    import numpy as np

    from pacing.course.course import Course, CourseReport
    from pacing.race.build import build
    from pacing.race.origin import Origins

    def race(gradient: Any, heading_deg: Any = 0.0, *, cell_m: float = 10.0, **keys: Any) -> Any:
        gradient = np.atleast_1d(np.asarray(gradient, dtype=float))
        count = gradient.size
        heading = np.broadcast_to(np.asarray(heading_deg, dtype=float), (count,)).copy()
        run = cell_m / np.sqrt(1.0 + gradient**2)
        north, east = run * np.cos(np.radians(heading)), run * np.sin(np.radians(heading))
        table: dict[str, Any] = {
            "course": {"file": "invented.gpx"},
            "rider": {
                "mass_kg": 72.0,
                "critical_power_w": 300.0,
                "w_prime_kj": 18.0,
                "positions": [{"name": "aero bars", "cda_m2": 0.235}],
            },
            "bike": {"mass_kg": 8.5, "crr": 0.004},
            "air": {
                "temperature_c": 18.0,
                "pressure_hpa": 1013.0,
                "wind_speed_m_s": 0.0,
                "wind_from_deg": 0.0,
            },
            "plan": {},
        }
        beside = {
            name: keys.pop(name)
            for name in ("slow_points", "bends", "landmarks", "crr_factor", "wind_share")
            if name in keys
        }
        for name, value in keys.items():
            section, key = name.split("__")
            table[section][key] = value
        course = Course(
            name="Invented",
            distance_m=cell_m * np.arange(count + 1),
            lat_deg=46.0 + np.concatenate([[0.0], np.cumsum(north)]) / 111_200.0,
            lon_deg=-31.0 + np.concatenate([[0.0], np.cumsum(east)]) / 77_300.0,
            elevation_m=50.0 + np.concatenate([[0.0], np.cumsum(run * gradient)]),
            gradient=gradient,
            heading_deg=heading,
            crr_factor=np.broadcast_to(beside.get("crr_factor", 1.0), (count,)).astype(float),
            wind_share=np.broadcast_to(beside.get("wind_share", 1.0), (count,)).astype(float),
            lap_length_m=cell_m * count,
            laps=1,
            slow_points=tuple(beside.get("slow_points", ())),
            bends=tuple(beside.get("bends", ())),
            landmarks=tuple(beside.get("landmarks", ())),
            report=CourseReport(cell_m * count, 0.0, 0.0, "recorded", 0.0, 0.0),
        )
        return build(table, Origins(), file=Path("invented.toml"), course=course)

    return race


@pytest.fixture(scope="session")
def mean_power_law() -> Any:
    """A law that pays back every watt below critical power: what is left tells mean power."""
    from pacing.rider.recovery import Advance, RecoveryLaw

    class Ledger(RecoveryLaw):
        name = "ledger"
        pool_shares = (1.0,)

        def advance(self, pools: Any, excess_w: Any, duration_s: Any, **_: Any) -> Any:
            return (pools[0] - excess_w * duration_s,)

        def advance_and_slopes(self, pools: Any, excess_w: Any, duration_s: Any, **_: Any) -> Any:
            after = self.advance(pools, excess_w, duration_s)
            return Advance(after, ((1.0,),), (-duration_s,), (-excess_w,))

        def advance_many(self, pools: Any, excess_w: Any, duration_s: Any, **_: Any) -> Any:
            return pools - excess_w * duration_s

    return Ledger()
