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
from scipy.spatial import cKDTree

COURSES = Path(__file__).resolve().parents[2] / "courses"
sys.path.insert(0, str(COURSES))

import make  # noqa: E402
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


def random_road(seed: int, length_m: float, spread_pct: float, steepest_pct: float) -> Road:
    """A wandering road of given country; the seed decides line and heights."""
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
    return Road(f"random {seed}", distance, lat, lon, height, radius)


@cache
def profile(name: str, seed: int) -> Road:
    """A road by name; the random ones change with the seed, the committed ones do not."""
    if name in make.ROADS:
        return make.true_road(name)
    length_m, spread_pct, steepest_pct = RANDOM[name]
    return random_road(seed, length_m, spread_pct, steepest_pct)


RANDOM = {
    "random plain": (30e3, 0.8, 2.5),
    "random hills": (40e3, 3.0, 9.0),
    "random alps": (35e3, 4.8, 11.0),
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
    share = 1 - np.exp(-1 / 3.0)
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


@dataclass(frozen=True)
class Terrain:
    """The land about a road: places (N, 2) along it, height there and slope across it (N,)."""

    place_m: Array
    ahead: Array
    height_m: Array
    across: Array

    def height_at(self, place_m: Array) -> Array:
        """Height of the land (K,) at places (K, 2), as of the nearest piece of the road."""
        _, nearest = cKDTree(self.place_m).query(place_m)
        off = place_m - self.place_m[nearest]
        ahead = self.ahead[nearest]
        aside = np.clip(ahead[:, 0] * off[:, 1] - ahead[:, 1] * off[:, 0], -60, 60)
        return np.asarray(self.height_m[nearest] + self.across[nearest] * aside)


def _terrain(road: Road, rng: np.random.Generator, artefacts: bool) -> Terrain:
    """The land goes on beyond both ends of the road as the road would."""
    north = (road.lat_deg - road.lat_deg.mean()) * 111200.0
    east = (road.lon_deg - road.lon_deg.mean()) * 111200.0 * np.cos(np.radians(road.lat_deg))
    line = np.column_stack([east, north])
    height = road.height_m + (_artefacts(road, rng) if artefacts else 0.0)
    beyond = np.arange(10.0, 250.0, 10.0)[:, None]
    first, last = (line[0] - line[5]), (line[-1] - line[-6])
    before = line[0] + beyond[::-1] * first / np.hypot(*first)
    after = line[-1] + beyond * last / np.hypot(*last)
    place = np.vstack([before, line, after])
    ahead = np.gradient(place, axis=0)
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(place, axis=0).T))])
    knots = np.arange(0.0, along[-1] + 300.0, 300.0)
    return Terrain(
        place_m=place,
        ahead=ahead / np.hypot(ahead[:, 0], ahead[:, 1])[:, None],
        height_m=np.concatenate(
            [
                height[0] - road.slope[0] * beyond[::-1, 0],
                height,
                height[-1] + road.slope[-1] * beyond[:, 0],
            ]
        ),
        across=np.interp(along, knots, rng.normal(0, 0.08, len(knots))),
    )


def _read_grid(
    terrain: Terrain, place_m: Array, cell_m: float, error_m: float, rng: np.random.Generator
) -> Array:
    """Heights (K,) between the nodes of a grid of terrain heights, each with its own error."""
    scaled = (place_m + rng.uniform(0, cell_m, 2)) / cell_m
    corner = np.floor(scaled).astype(int)
    sides = np.array([[0, 0], [0, 1], [1, 0], [1, 1]])
    nodes, index = np.unique(
        (corner[None] + sides[:, None]).reshape(-1, 2), axis=0, return_inverse=True
    )
    shift = place_m[0] - scaled[0] * cell_m
    value = terrain.height_at(nodes * cell_m + shift) + rng.normal(0, error_m, len(nodes))
    part = value[index.reshape(-1)].reshape(4, -1)
    right, up = (scaled - corner).T
    low = (1 - up) * part[0] + up * part[1]
    high = (1 - up) * part[2] + up * part[3]
    return np.asarray((1 - right) * low + right * high)


def _terrain_grid(cell_m: float, error_m: float, artefacts: bool) -> Callable[..., Spoiled]:
    """A planned route: no times, points some 30 m apart, a line a few metres off the road."""

    def spoil(road: Road, rng: np.random.Generator) -> Spoiled:
        terrain = _terrain(road, rng, artefacts)
        at = np.cumsum(rng.uniform(12, 45, int(road.length_m / 20)))
        at = np.concatenate([[0.0], at[at < road.length_m - 5], [road.length_m]])
        ends = len(terrain.place_m) - len(road.distance_m)
        line = terrain.place_m[ends // 2 : len(terrain.place_m) - ends // 2]
        aside = wandering(rng, len(at), 4.0, 4.0)
        place = np.column_stack([np.interp(at, road.distance_m, line[:, i]) for i in (0, 1)])
        height = _read_grid(terrain, place + aside[:, None], cell_m, error_m, rng)
        return Spoiled(at, np.round(height, 1), timed=False)

    return spoil


def _artefacts(road: Road, rng: np.random.Generator) -> Array:
    """Terrain above tunnels and below bridges, one of either about every 6 km.

    A road out and back passes each of them twice.
    """
    extra = np.zeros(len(road.distance_m))
    for middle in np.arange(rng.uniform(1200, 2500), road.length_m - 1000, 6000.0):
        middle += rng.uniform(-700, 700)
        if rng.random() < 0.5:
            length, height = rng.uniform(200, 700), rng.uniform(0.13, 0.3)
        else:
            length, height = rng.uniform(60, 250), -rng.uniform(0.12, 0.3)
        u = (road.distance_m - middle) / length
        shape = np.where(np.abs(u) < 0.5, np.cos(np.pi * u) ** 2, 0.0)
        extra += height * length * shape
    if np.hypot(*(road.lat_deg[[0, -1]] - road.lat_deg[0])) < 3e-4 and not road.closed:
        back = np.interp(road.length_m - road.distance_m, road.distance_m, extra)
        extra = np.where(np.abs(back) > np.abs(extra), back, extra)
    return extra


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
