"""Forecast wind brought to the rider's height, and split along and across the road."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Floats = float | Array

RIDER_HEIGHT_M = 1.2
FORECAST_HEIGHT_M = 10.0
BLENDING_HEIGHT_M = 60.0
OPEN_ROUGHNESS_M = 0.03
LOW_HEIGHT_M = 2.0
"""Wind measured at this height or below is used as it is."""

ROUGHNESS_M: dict[str, float] = {
    "open water": 0.0002,
    "mown or paved": 0.005,
    "open field": 0.03,
    "farmland": 0.10,
    "suburb": 0.25,
    "town or forest": 0.5,
}
"""Roughness length by surroundings, after the Davenport classes (Source: wieringa-1992)."""

SURROUNDINGS: dict[str, float] = {
    "open water": 0.90,
    "mown or paved": 0.76,
    "open field": 0.63,
    "farmland": 0.51,
    "suburb": 0.37,
    "town or forest": 0.24,
}
"""Wind at the rider over forecast wind at 10 m: `log_law_factor` of the roughness, rounded.

Beyond farmland the rider is among the obstacles and the factor is a convention, not physics.
"""


class Wind(NamedTuple):
    """Wind at the rider in m/s: head wind positive; across positive from the rider's right."""

    along_m_s: Array
    across_m_s: Array


def log_wind_ratio(height_m: Floats, *, from_height_m: Floats, roughness_m: Floats) -> Array:
    """Wind at ``height_m`` over wind at ``from_height_m`` above ground of one roughness.

    Source: wieringa-1992 (logarithmic wind profile).
    """
    roughness = np.asarray(roughness_m, dtype=float)
    return np.asarray(np.log(height_m / roughness) / np.log(from_height_m / roughness))


def log_law_factor(roughness_m: float, *, height_m: float = RIDER_HEIGHT_M) -> float:
    """Wind at ``height_m`` among ground of ``roughness_m`` over forecast wind.

    A forecast is for 10 m over open ground: up from there to where the ground no longer
    matters, 60 m, then down over the ground at hand.

    Source: wieringa-1992.
    """
    up = log_wind_ratio(
        BLENDING_HEIGHT_M, from_height_m=FORECAST_HEIGHT_M, roughness_m=OPEN_ROUGHNESS_M
    )
    down = log_wind_ratio(height_m, from_height_m=BLENDING_HEIGHT_M, roughness_m=roughness_m)
    return float(up * down)


def rider_height_factor(surroundings: str, *, wind_height_m: float = FORECAST_HEIGHT_M) -> float:
    """Wind at the rider over wind as forecast at ``wind_height_m``.

    A height of 2 m or less is taken to be the rider's own: factor 1. Otherwise the wind is
    brought to 10 m over open ground, then by ``surroundings`` (`SURROUNDINGS`; ``KeyError``
    for any other) to the rider.
    """
    factor = SURROUNDINGS[surroundings]
    if wind_height_m <= LOW_HEIGHT_M:
        return 1.0
    to_10_m = math.log(FORECAST_HEIGHT_M / OPEN_ROUGHNESS_M) / math.log(
        wind_height_m / OPEN_ROUGHNESS_M
    )
    return to_10_m * factor


def wind_components_m_s(*, east_m_s: Floats, north_m_s: Floats, heading_deg: Floats) -> Wind:
    """Wind along and across a road of ``heading_deg`` (0 north, 90 east).

    ``east_m_s`` and ``north_m_s`` point to where the wind comes *from*.

    Source: martin-1998 (Vtan, Vnor).
    """
    heading = np.radians(np.asarray(heading_deg, dtype=float))
    sine, cosine = np.sin(heading), np.cos(heading)
    east, north = np.asarray(east_m_s), np.asarray(north_m_s)
    return Wind(np.asarray(north * cosine + east * sine), np.asarray(east * cosine - north * sine))
