"""Write every invented course: ``python courses/make.py``. Places and names are made up.

The truth behind each file is ``true_road(name)``; the same seeds always give the same files.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np

HERE = Path(__file__).resolve().parent
sys.path.insert(0, str(HERE))

from planning import plan  # noqa: E402
from recording import Recording, record, write_gpx  # noqa: E402
from roads import (  # noqa: E402
    Array,
    Road,
    heights_from_sections,
    line_through,
    on_earth,
    out_and_back,
    random_sections,
)

STARTER = HERE.parent / "pacing" / "race" / "starter"

EFFORTS = """duration_s,power_w,position
180,404,aero bars
420,348,aero bars
720,330,aero bars
1200,319,aero bars
"""


def _rng(name: str, part: int) -> np.random.Generator:
    return np.random.default_rng([part, *name.encode()])


def _ring(rng: np.random.Generator, count: int, around_m: float, rough: float) -> Array:
    """Vertices of a rough closed ring (count, 2) of given length around."""
    angle = 2 * np.pi * (np.arange(count) + rng.uniform(-0.3, 0.3, count)) / count
    radius = 1 + rough * rng.normal(0.0, 1.0, count) + 0.25 * np.cos(2 * angle + 1.0)
    ring = np.column_stack([1.5 * radius * np.cos(angle), radius * np.sin(angle)])
    around = np.hypot(*np.diff(np.vstack([ring, ring[:1]]), axis=0).T).sum()
    return np.asarray(ring * around_m / around)


def _path(rng: np.random.Generator, leg_m: Array, turn_deg: Array) -> Array:
    """Vertices (K + 1, 2) of legs of given length, each turned from the one before."""
    heading = np.cumsum(np.radians(turn_deg)) + rng.uniform(0, 2 * np.pi)
    legs = leg_m[:, None] * np.column_stack([np.cos(heading), np.sin(heading)])
    return np.vstack([[0.0, 0.0], np.cumsum(legs, axis=0)])


def oldermere_flat() -> Road:
    """A flat out-and-back of 16 km with a dead turn round a cone."""
    rng = _rng("oldermere", 0)
    legs = rng.uniform(350, 1100, 11)
    legs *= 8065 / legs.sum()
    vertices = _path(rng, legs, rng.normal(0, 25, 11))
    line, radius = line_through(vertices, rng.uniform(80, 400, len(vertices)))
    line, radius = out_and_back(line, radius, lane_m=8.0)
    lat, lon, distance = on_earth(line, 47.2, -32.4)
    one_way = np.minimum(distance, distance[-1] - distance)
    sections = random_sections(rng, 8000, spread_pct=0.5, steepest_pct=1.2)
    there = np.linspace(0.0, one_way.max(), 8001)
    height = np.interp(
        one_way, there, heights_from_sections(there, sections, start_m=14.0, undulation=(rng, 0.15))
    )
    return Road("Oldermere Flat", distance, lat, lon, height, radius)


def brackenholt_round() -> Road:
    """A rolling loop of 40 km."""
    rng = _rng("brackenholt", 0)
    vertices = _ring(rng, 84, 41500, rough=0.045)
    line, radius = line_through(
        vertices, np.exp(rng.uniform(np.log(22), np.log(260), len(vertices))), closed=True
    )
    lat, lon, distance = on_earth(line, 45.6, -30.8)
    sections = random_sections(rng, 40000, spread_pct=3.0, steepest_pct=8.5)
    height = heights_from_sections(
        distance, sections, start_m=182.0, undulation=(rng, 0.35), net_m=0.0
    )
    return Road("Brackenholt Round", distance, lat, lon, height, radius, closed=True)


def scarnhead_climb() -> Road:
    """A hill climb of 9 km at 7 % with hairpins and ramps of 12 %."""
    rng = _rng("scarnhead", 0)
    turns = [0, 40, -30, 25, 150, -160, 155, -150, 30, -60, 45, 140, -155, 150, -35, 50, -25, 30]
    legs = np.array(
        [700, 450, 520, 600, 420, 380, 430, 450, 500, 380, 520, 480, 400, 420, 560, 600]
    )
    legs = np.append(legs, [640, 560])
    vertices = _path(rng, 1.06 * legs, np.array(turns, dtype=float))
    radii = np.where(np.abs([0, *turns[1:], 0]) > 100, 13.0, 60.0)
    line, radius = line_through(vertices, radii, ramp_m=12.0)
    lat, lon, distance = on_earth(line, 44.1, -29.5)
    sections = [(600, 3.0), (500, 6.5), (700, 8.0), (160, 12.0), (640, 7.0), (500, 9.0)]
    sections += [(300, 2.0), (900, 8.0), (180, 11.5), (700, 7.5), (400, 4.5), (250, -1.5)]
    sections += [(800, 8.5), (120, 12.5), (900, 7.5), (650, 9.5), (500, 6.0), (200, 10.5)]
    height = heights_from_sections(
        distance, sections, start_m=412.0, undulation=(rng, 0.4), curve_m=60.0
    )
    return Road("Scarnhead Climb", distance, lat, lon, height, radius)


def quillport_lap() -> Road:
    """A city lap of 4 km with tight corners and a short ramp, ridden several times."""
    rng = _rng("quillport", 0)
    east = [0, 620, 640, 420, 430, 700, 690, 260, 240, 60, 80, -240, -220, -420, -330]
    north = [0, 20, 260, 300, 520, 560, 820, 860, 640, 660, 900, 880, 560, 420, 60]
    vertices = np.column_stack([east, north]).astype(float)
    radii = rng.uniform(8, 22, len(vertices))
    line, radius = line_through(vertices, radii, closed=True, ramp_m=8.0)
    lat, lon, distance = on_earth(line, 48.9, -33.1)
    sections = [(700, 0.3), (350, 2.5), (180, 7.5), (300, 0.0), (500, -1.2), (350, -3.5)]
    sections += [(600, 0.5), (400, -1.0), (300, 1.5), (420, -0.8)]
    height = heights_from_sections(
        distance, sections, start_m=23.0, undulation=(rng, 0.2), curve_m=50.0, net_m=0.0
    )
    return Road("Quillport Lap", distance, lat, lon, height, radius, closed=True)


def dunsorrel_gorge() -> Road:
    """A mountain valley of 26 km, planned and not ridden: its heights know no tunnel or bridge."""
    rng = _rng("dunsorrel", 0)
    legs = rng.uniform(250, 750, 52)
    vertices = _path(rng, legs, np.diff(rng.normal(0, 38, 53)))
    line, radius = line_through(vertices, np.exp(rng.uniform(3.2, 5.0, len(vertices))))
    lat, lon, distance = on_earth(line, 43.4, -28.7)
    sections = random_sections(
        rng, 26000, spread_pct=3.0, steepest_pct=9.0, lengths_m=(250.0, 1200.0)
    )
    height = heights_from_sections(
        distance, sections, start_m=530.0, net_m=190.0, undulation=(rng, 0.3)
    )
    return Road("Dunsorrel Gorge", distance, lat, lon, height, radius)


def pennick_vale() -> Road:
    """The starter's course: 12 km out over a low hill and back by another road."""
    rng = _rng("pennick", 0)
    vertices = _ring(rng, 26, 12200, rough=0.05)
    line, radius = line_through(vertices, rng.uniform(30, 200, len(vertices)), closed=True)
    lat, lon, distance = on_earth(line, 46.4, -31.7)
    sections = [(1800, 0.3), (900, 3.0), (500, 5.5), (700, 2.0), (900, -2.5), (600, -4.5)]
    sections += [(1500, 0.0), (800, 1.8), (700, -1.5), (2600, -0.4), (1000, 0.3)]
    height = heights_from_sections(
        distance, sections, start_m=96.0, undulation=(rng, 0.25), net_m=0.0
    )
    return Road("Pennick Vale", distance, lat, lon, height, radius, closed=True)


ROADS: dict[str, Callable[[], Road]] = {
    "oldermere_flat": oldermere_flat,
    "brackenholt_round": brackenholt_round,
    "scarnhead_climb": scarnhead_climb,
    "quillport_lap": quillport_lap,
    "dunsorrel_gorge": dunsorrel_gorge,
    "pennick_vale": pennick_vale,
}

EVERY_S = {"scarnhead_climb": 2.0, "pennick_vale": 2.0}
PLANNED = ("dunsorrel_gorge",)


def true_road(name: str) -> Road:
    """The road behind ``<name>.gpx``: line, radii and heights without any noise."""
    return ROADS[name]()


def recorded(name: str) -> Recording:
    """The points of ``<name>.gpx``, with the distance along the true road of each."""
    road, rng = true_road(name), _rng(name, 1)
    if name in PLANNED:
        return plan(road, rng)
    return record(road, rng, every_s=EVERY_S.get(name, 1.0))


def files() -> dict[Path, Recording]:
    """Where each course is written; the starter's goes with the package."""
    return {
        (STARTER / "course.gpx" if name == "pennick_vale" else HERE / f"{name}.gpx"): recorded(name)
        for name in ROADS
    }


def main() -> None:
    """Write every course and the starter's sample efforts."""
    STARTER.mkdir(parents=True, exist_ok=True)
    for path, recording in files().items():
        write_gpx(recording, path)
        print(f"{path.relative_to(HERE.parent)}  {len(recording.lat_deg)} points")
    (STARTER / "efforts.csv").write_bytes(EFFORTS.encode())


if __name__ == "__main__":
    main()
