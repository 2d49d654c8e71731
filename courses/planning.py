"""What a route planner makes of a road: heights read off a grid of the land about it.

The land lies above the road's tunnels and below its bridges, and a grid knows only the land.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from recording import Recording, wandering
from roads import Array, Road
from scipy.spatial import cKDTree

METRES_A_DEGREE = 111200.0


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
    north = (road.lat_deg - road.lat_deg.mean()) * METRES_A_DEGREE
    east = (road.lon_deg - road.lon_deg.mean()) * METRES_A_DEGREE * np.cos(np.radians(road.lat_deg))
    line = np.column_stack([east, north])
    height = road.height_m + (tunnels_and_gorges_m(road, rng) if artefacts else 0.0)
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


def tunnels_and_gorges_m(road: Road, rng: np.random.Generator) -> Array:
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


def plan(
    road: Road,
    rng: np.random.Generator,
    *,
    cell_m: float = 30.0,
    error_m: float = 2.0,
    artefacts: bool = True,
) -> Recording:
    """A planned route: no times, points some 30 m apart, a line a few metres off the road."""
    terrain = _terrain(road, rng, artefacts)
    at = np.cumsum(rng.uniform(12, 45, int(road.length_m / 20)))
    at = np.concatenate([[0.0], at[at < road.length_m - 5], [road.length_m]])
    ends = (len(terrain.place_m) - len(road.distance_m)) // 2
    line = terrain.place_m[ends : len(terrain.place_m) - ends]
    aside = wandering(rng, len(at), 4.0, 4.0)
    place = np.column_stack([np.interp(at, road.distance_m, line[:, i]) for i in (0, 1)])
    height = _read_grid(terrain, place + aside[:, None], cell_m, error_m, rng)
    lat = np.interp(at, road.distance_m, road.lat_deg)
    east = aside / (METRES_A_DEGREE * np.cos(np.radians(lat)))
    return Recording(
        name=road.name,
        lat_deg=lat + aside / METRES_A_DEGREE,
        lon_deg=np.interp(at, road.distance_m, road.lon_deg) + east,
        elevation_m=height,
        time_s=None,
        true_distance_m=at,
    )
