"""The air of one day: weather as reported, by the hour where given, at any height and clock."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from pacing.air.density import (
    LAPSE_K_PER_M,
    lapsed_pressure_pa,
    lapsed_temperature_k,
    moist_air_density_kg_m3,
)
from pacing.air.wind import FORECAST_HEIGHT_M, Wind, rider_height_factor, wind_components_m_s
from pacing.errors import UnusableInputError

Array = NDArray[np.float64]
Floats = float | Array


@dataclass(frozen=True)
class Weather:
    """Weather at one time of day (``clock_s``, seconds of the day), as measured or forecast.

    ``pressure_pa`` is what a barometer at ``pressure_height_m`` would show; a pressure reduced
    to mean sea level has height 0. ``relative_humidity`` from 0 to 1. The wind blows *from*
    ``wind_from_deg`` at ``wind_height_m`` (2 m or less: at the rider as it is).
    """

    temperature_k: float
    pressure_pa: float
    wind_speed_m_s: float
    wind_from_deg: float
    relative_humidity: float = 0.6
    temperature_height_m: float = 0.0
    pressure_height_m: float = 0.0
    wind_height_m: float = FORECAST_HEIGHT_M
    surroundings: str = "farmland"
    clock_s: float = 0.0

    @property
    def sea_level_temperature_k(self) -> float:
        """Temperature of the same column at height 0."""
        return self.temperature_k + LAPSE_K_PER_M * self.temperature_height_m

    @property
    def sea_level_pressure_pa(self) -> float:
        """Pressure of the same column at height 0."""
        return float(
            lapsed_pressure_pa(
                0.0,
                pressure_pa=self.pressure_pa,
                at_height_m=self.pressure_height_m,
                temperature_k=self.temperature_k,
                temperature_at_height_m=self.temperature_height_m,
            )
        )

    @property
    def rider_wind_m_s(self) -> float:
        """Wind speed at the rider in the open."""
        return self.wind_speed_m_s * rider_height_factor(
            self.surroundings, wind_height_m=self.wind_height_m
        )


@dataclass(frozen=True)
class Day:
    """One weather, or several in order of their clocks.

    Between two clocks temperature, pressure, humidity and the wind's components are
    interpolated; before the first and after the last they are held. A clock after midnight
    goes on beyond 86,400 s. With one weather the clock is not looked at.
    """

    weathers: tuple[Weather, ...]

    def __post_init__(self) -> None:
        clocks = [weather.clock_s for weather in self.weathers]
        if not clocks:
            raise UnusableInputError("no weather", expected="at least one")
        if any(later <= clock for clock, later in pairwise(clocks)):
            raise UnusableInputError("hours out of order", expected="clocks that rise")

    def density_kg_m3(self, height_m: Floats, clock_s: Floats = 0.0) -> Array:
        """Density of the air at ``height_m`` and ``clock_s`` (one shape, or broadcast).

        Relative humidity is taken as the same at every height (common practice, no source).
        """
        temperature_k, pressure_pa, humidity = self._at(self._columns[:3], clock_s)
        return moist_air_density_kg_m3(
            temperature_k=lapsed_temperature_k(
                height_m, temperature_k=temperature_k, at_height_m=0.0
            ),
            pressure_pa=lapsed_pressure_pa(
                height_m,
                pressure_pa=pressure_pa,
                at_height_m=0.0,
                temperature_k=temperature_k,
                temperature_at_height_m=0.0,
            ),
            relative_humidity=humidity,
        )

    def wind_at_rider(
        self, heading_deg: Floats, wind_share: Floats = 1.0, clock_s: Floats = 0.0
    ) -> Wind:
        """Wind at the rider along (head wind positive) and across (from the right positive).

        ``heading_deg`` is the direction of travel, ``wind_share`` the share of the wind that
        reaches the rider; one shape, or broadcast.
        """
        east, north = self._at(self._columns[3:], clock_s)
        share = np.asarray(wind_share, dtype=float)
        return wind_components_m_s(
            east_m_s=east * share, north_m_s=north * share, heading_deg=heading_deg
        )

    @cached_property
    def _columns(self) -> Array:
        """Sea-level temperature and pressure, humidity, wind from east and north (5, hours)."""
        rows = []
        for weather in self.weathers:
            from_rad = math.radians(weather.wind_from_deg)
            rows.append(
                (
                    weather.sea_level_temperature_k,
                    weather.sea_level_pressure_pa,
                    weather.relative_humidity,
                    weather.rider_wind_m_s * math.sin(from_rad),
                    weather.rider_wind_m_s * math.cos(from_rad),
                )
            )
        return np.asarray(rows, dtype=float).T

    def _at(self, columns: Array, clock_s: Floats) -> list[Array]:
        if len(self.weathers) == 1:
            return [np.asarray(column[0]) for column in columns]
        clocks = [weather.clock_s for weather in self.weathers]
        return [np.asarray(np.interp(clock_s, clocks, column)) for column in columns]
