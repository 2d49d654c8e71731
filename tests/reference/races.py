"""Races that the peers are held against: invented riders on invented and recorded courses."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pacing

COURSES = Path(__file__).resolve().parents[2] / "courses"

TEXT = """\
[course]
file = "{file}"
{course}
[rider]
mass_kg = 72.0
critical_power_w = {cp}
w_prime_kj = {w_prime_kj}
recovery_law = "{law}"
[[rider.positions]]
name = "aero bars"
cda_m2 = 0.235
[bike]
mass_kg = 8.6
crr = 0.0040
[air]
temperature_c = 18.0
pressure_hpa = 1016.0
wind_speed_m_s = {wind}
wind_from_deg = 240.0
[plan]
max_power_w = 420.0
max_cues = {cues}
"""

TURN = """\
[[course.slow_points]]
at_km = {at_km}
speed_kmh = 15
note = "dead turn"
"""


@dataclass(frozen=True)
class Case:
    """One race of the comparisons: the course's file and what differs from the common rider."""

    name: str
    file: str
    course: str = ""
    cp: float = 305.0
    w_prime_kj: float = 19.0
    law: str = "skiba-2015"
    wind: float = 4.0
    cues: int = 24

    def race(self, folder: Path, *, recorded: Path | None = None, **changes: Any) -> pacing.Race:
        """The race, its file written into ``folder``."""
        return pacing.load_race(self.write(folder, recorded=recorded, **changes))

    def write(self, folder: Path, *, recorded: Path | None = None, **changes: Any) -> Path:
        """The race file, written into ``folder``."""
        values = {**vars(self), **changes}
        values["file"] = ((recorded or COURSES) / self.file).as_posix()
        where = folder / f"{self.name}.toml"
        where.write_text(TEXT.format(**values), encoding="utf-8")
        return where


INVENTED = (
    Case("flat out and back with a turn", "oldermere_flat.gpx", TURN.format(at_km=8.0)),
    Case("rolling loop", "brackenholt_round.gpx"),
    Case("hill climb", "scarnhead_climb.gpx", wind=2.0),
    Case("technical city lap", "quillport_lap.gpx", "laps = 3\n", wind=5.0),
)


def _part(from_km: float, to_km: float) -> str:
    return f"from_km = {from_km}\nto_km = {to_km}\n"


# of recorded courses no more than 40 km, flat to alpine
RECORDED = (
    Case("climb and ridge", "ridge_climb_48km_no_time.gpx", _part(0, 40)),
    Case("rail trail", "railtrail_out_back_28km.gpx"),
    Case("loop", "loop_11km_route_only.gpx"),
    Case("out and back", "out_back_13km_track_and_route.gpx"),
    Case("city", "city_12km_gpx10_duplicates.gpx"),
    Case("rolling stage", "rolling_170km.gpx", _part(60, 95)),
    Case("flat coast", "flat_coast_175km.gpx", _part(20, 60), wind=6.0),
    Case("alpine stage", "alpine_113km_tunnel_spikes.gpx", _part(20, 50), wind=2.0),
    Case("valley", "valley_167km_duplicates.gpx", _part(40, 70)),
    Case("southern coast", "southern_coast_98km_duplicates.gpx", _part(10, 40)),
)
