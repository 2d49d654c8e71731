"""Known roads, and the ways their heights are spoiled between the road and the file.

Seeds below ``FIRST_TEST_SEED`` were used to choose constants of the smoother; tests and the truth
table use none of them.
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

COURSES = Path(__file__).resolve().parents[2] / "courses"
sys.path.insert(0, str(COURSES))

import make  # noqa: E402
from planning import plan  # noqa: E402
from recording import ridden_speed_m_s, wandering  # noqa: E402
from roads import (  # noqa: E402
    Road,
    heights_from_sections,
    line_through,
    on_earth,
    random_sections,
)

Array = NDArray[np.float64]

FIRST_TEST_SEED = 1000


@dataclass(frozen=True)
class Spoiled:
    """Points of a file: true horizontal distance and spoiled height (M,), with or without times."""

    distance_m: Array
    elevation_m: Array
    timed: bool


def random_road(
    seed: int, length_m: float, spread_pct: float, steepest_pct: float, pass_pct: float
) -> Road:
    """A wandering road of given country; the seed decides line and heights.

    ``pass_pct`` is the mean gradient of passes that it climbs and descends every 10 km.
    """
    rng = np.random.default_rng([77, seed])
    count = int(length_m / 450)
    heading = rng.normal(0.0, 0.6, count)
    legs = rng.uniform(250, 650, count)[:, None]
    vertices = np.cumsum(legs * np.column_stack([np.cos(heading), np.sin(heading)]), axis=0)
    line, radius = line_through(vertices, np.exp(rng.uniform(3.0, 5.3, count)))
    lat, lon, distance = on_earth(line, 43.0, -31.0)
    sections = random_sections(
        rng, length_m, spread_pct=spread_pct, steepest_pct=steepest_pct, lengths_m=(120.0, 900.0)
    )
    curve_m = float(rng.uniform(60, 120))
    height = heights_from_sections(
        distance, sections, start_m=300.0, curve_m=curve_m, undulation=(rng, 0.1 * spread_pct)
    )
    height = height + pass_pct / 100 * 5000 * (1 - np.cos(distance / 10000 * 2 * np.pi)) / np.pi
    return Road(f"random {seed}", distance, lat, lon, height, radius)


@cache
def profile(name: str, seed: int) -> Road:
    """A road by name; the random ones change with the seed, the committed ones do not."""
    if name in make.ROADS:
        return make.true_road(name)
    return random_road(seed, *RANDOM[name])


RANDOM = {
    "random plain": (30e3, 0.8, 2.5, 0.0),
    "random hills": (40e3, 3.0, 9.0, 0.0),
    "random alps": (35e3, 3.5, 7.5, 5.5),
}
PROFILES = ["oldermere_flat", "brackenholt_round", "scarnhead_climb", "quillport_lap", *RANDOM]


def _ridden(road: Road) -> tuple[Array, Array, Array]:
    """Seconds, true distance and true height of points recorded once a second."""
    speed = ridden_speed_m_s(road)
    clock = np.cumsum(
        np.concatenate([[0.0], np.diff(road.distance_m) * 2 / (speed[1:] + speed[:-1])])
    )
    time_s = np.arange(0.0, clock[-1], 1.0)
    at = np.interp(time_s, clock, road.distance_m)
    at[-1] = road.distance_m[-1]
    return time_s, at, np.interp(at, road.distance_m, road.height_m)


def _recorded(
    noise: Callable[[Array, Array, np.random.Generator], Array],
) -> Callable[..., Spoiled]:
    def spoil(road: Road, rng: np.random.Generator) -> Spoiled:
        time_s, at, height = _ridden(road)
        return Spoiled(at, np.round(noise(time_s, height, rng), 2), timed=True)

    return spoil


def _white(sd: float) -> Callable[..., Spoiled]:
    return _recorded(lambda time, height, rng: height + rng.normal(0, sd, len(height)))


def _drifting(time: Array, height: Array, rng: np.random.Generator) -> Array:
    weather = rng.normal(0.0, 2.0) * time / 3600
    return height + weather + wandering(rng, len(time), 1.2, 600.0) + rng.normal(0, 0.2, len(time))


def _lagging(time: Array, height: Array, rng: np.random.Generator) -> Array:
    share = 1 - np.exp(-1 / 2.5)
    held = np.empty(len(height))
    value = height[0]
    for i, new in enumerate(height):
        value += share * (new - value)
        held[i] = value
    return np.round(held + rng.normal(0, 0.15, len(time)), 1)


def _stepped(step_m: float, sd: float) -> Callable[..., Spoiled]:
    return _recorded(
        lambda time, height, rng: (
            step_m * np.round((height + rng.normal(0, sd, len(time))) / step_m)
        )
    )


def _terrain_grid(cell_m: float, error_m: float, artefacts: bool) -> Callable[..., Spoiled]:
    def spoil(road: Road, rng: np.random.Generator) -> Spoiled:
        route = plan(road, rng, cell_m=cell_m, error_m=error_m, artefacts=artefacts)
        return Spoiled(route.true_distance_m, np.round(route.elevation_m, 1), timed=False)

    return spoil


SOURCE_OF = {"w": "recorded", "d": "recorded", "l": "recorded", "1": "stepped"}


def true_source(kind: str) -> str:
    """The source of heights that a kind of noise stands for."""
    return "terrain grid" if "grid" in kind else SOURCE_OF[kind[0]]


KINDS: dict[str, Callable[[Road, np.random.Generator], Spoiled]] = {
    "white 0.5 m": _white(0.5),
    "white 1.5 m": _white(1.5),
    "drift": _recorded(_drifting),
    "lagging": _recorded(_lagging),
    "1 m steps": _stepped(1.0, 0.15),
    "10 m steps": _stepped(10.0, 0.0),
    "30 m grid": _terrain_grid(30.0, 2.0, artefacts=False),
    "30 m grid, tunnels": _terrain_grid(30.0, 2.0, artefacts=True),
    "90 m grid": _terrain_grid(90.0, 3.0, artefacts=False),
    "90 m grid, tunnels": _terrain_grid(90.0, 3.0, artefacts=True),
}


def spoiled(kind: str, name: str, seed: int) -> Spoiled:
    """Points of a road spoiled in one way; the same seed gives the same points."""
    rng = np.random.default_rng([seed, *kind.encode(), *name.encode()])
    return KINDS[kind](profile(name, seed), rng)


def grid_of(road: Road) -> Array:
    """The 10 m grid."""
    return np.linspace(0.0, road.length_m, round(road.length_m / 10) + 1)
