"""What each cell of the course asks of one bike and rider on one day: numbers only."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from pacing.bike.drag_area import DragArea
from pacing.bike.resistance import air_force_n, air_force_n_and_slope
from pacing.motion.limits import speed_limits_m_s
from pacing.units import GRAVITY_M_S2

if TYPE_CHECKING:
    from pacing.race import Race

Array = NDArray[np.float64]

TRACTION_SHARE = 0.25
"""Largest driving force at the wheel over the total weight; common practice, no source."""
WALKING_M_S = 1.6


@dataclass(frozen=True)
class Road:
    """The course as forces: N cells between N + 1 nodes.

    Per cell (N,): ``cell_m`` road length, ``steady_n`` gravity, rolling and constant bearing
    drag, ``half_density_kg_m3`` ½ρ, ``wind_along_m_s`` (head wind positive) and
    ``wind_across_m_s`` at the rider, ``position`` index into ``drag_areas``. At nodes (N+1,):
    ``limit_m_s``, braking envelope included. Rider power times ``efficiency`` drives the wheel,
    up to ``traction_n``; above ``spin_out_m_s`` nothing drives it.
    """

    cell_m: Array
    steady_n: Array
    half_density_kg_m3: Array
    wind_along_m_s: Array
    wind_across_m_s: Array
    position: NDArray[np.intp]
    drag_areas: tuple[DragArea, ...]
    bearing_n_per_m_s: float
    efficiency: float
    effective_mass_kg: float
    traction_n: float
    spin_out_m_s: float
    limit_m_s: Array

    @cached_property
    def _one_position(self) -> int | None:
        first = int(self.position[0])
        return first if bool(np.all(self.position == first)) else None

    def resistance_n_and_slope(self, speed_m_s: Array) -> tuple[Array, Array]:
        """Force against the motion in each cell at ``speed_m_s`` (N,), and its slope in speed."""
        force = self.steady_n + self.bearing_n_per_m_s * speed_m_s
        slope = np.full_like(speed_m_s, self.bearing_n_per_m_s)
        if self._one_position is not None:
            air, air_slope = air_force_n_and_slope(
                speed_m_s,
                density_kg_m3=2.0 * self.half_density_kg_m3,
                wind_along_m_s=self.wind_along_m_s,
                wind_across_m_s=self.wind_across_m_s,
                drag_area=self.drag_areas[self._one_position],
            )
            return force + air, slope + air_slope
        for index, drag_area in enumerate(self.drag_areas):
            here = self.position == index
            air, air_slope = air_force_n_and_slope(
                speed_m_s[here],
                density_kg_m3=2.0 * self.half_density_kg_m3[here],
                wind_along_m_s=self.wind_along_m_s[here],
                wind_across_m_s=self.wind_across_m_s[here],
                drag_area=drag_area,
            )
            force[here] += air
            slope[here] += air_slope
        return force, slope

    def drag_area_m2(self, speed_m_s: Array) -> Array:
        """All that multiplies ½ρ·flow·along in each cell, at the yaw of ``speed_m_s`` (N,)."""
        along = speed_m_s + self.wind_along_m_s
        yaw = np.arctan2(np.abs(self.wind_across_m_s), along)
        area = np.empty_like(along)
        for index, drag_area in enumerate(self.drag_areas):
            here = self.position == index
            area[here] = drag_area.m2_at(yaw[here])
        return area

    def steady_power_w(self, speed_m_s: Array | float, cell: int) -> float:
        """Rider power that holds ``speed_m_s`` in one cell."""
        air = air_force_n(
            np.array([speed_m_s], dtype=float),
            density_kg_m3=2.0 * self.half_density_kg_m3[cell : cell + 1],
            wind_along_m_s=self.wind_along_m_s[cell : cell + 1],
            wind_across_m_s=self.wind_across_m_s[cell : cell + 1],
            drag_area=self.drag_areas[int(self.position[cell])],
        )
        force = self.steady_n[cell] + self.bearing_n_per_m_s * float(speed_m_s) + float(air[0])
        return float(force * float(speed_m_s) / self.efficiency)

    def walking_power_w(self) -> Array:
        """Rider power (N,) that holds the slowest speed a bicycle is ridden at, with a margin."""
        speed = np.full(self.cell_m.size, WALKING_M_S)
        force, _ = self.resistance_n_and_slope(speed)
        return np.asarray(np.maximum(force, 0.0) * speed / self.efficiency)


def road_for(
    race: Race, *, clock_s: Array | None = None, position: NDArray[np.intp] | None = None
) -> Road:
    """Put together what ``race`` asks, cell by cell.

    ``clock_s`` (N,) is the time of day in each cell, for weather that changes with the hours
    (default: the start's); ``position`` (N,) the rider's position in each (default: the first).
    """
    course, bike, rider, day = race.course, race.bike, race.rider, race.day
    cells = course.gradient.size
    clock = np.full(cells, race.plan.start_clock_s) if clock_s is None else clock_s
    height_m = 0.5 * (course.elevation_m[:-1] + course.elevation_m[1:])
    along, across = day.wind_at_rider(course.heading_deg, course.wind_share, clock)
    cosine = 1.0 / np.sqrt(1.0 + course.gradient**2)
    weight_n = race.mass_kg * GRAVITY_M_S2
    steady = weight_n * cosine * (course.gradient + bike.crr * course.crr_factor) + bike.bearing_n
    spin_out = np.inf
    if bike.top_gear is not None:
        spin_out = bike.top_gear * rider.max_cadence_rpm / 60.0 * bike.wheel_circumference_m
    return Road(
        cell_m=course.cell_length_m,
        steady_n=steady,
        half_density_kg_m3=0.5 * np.asarray(day.density_kg_m3(height_m, clock)),
        wind_along_m_s=np.asarray(along),
        wind_across_m_s=np.asarray(across),
        position=np.zeros(cells, dtype=np.intp) if position is None else position,
        drag_areas=tuple(race.drag_area(p) for p in rider.positions),
        bearing_n_per_m_s=bike.bearing_n_per_m_s,
        efficiency=bike.efficiency,
        effective_mass_kg=race.effective_mass_kg,
        traction_n=TRACTION_SHARE * weight_n,
        spin_out_m_s=spin_out,
        limit_m_s=speed_limits_m_s(course, max_speed_m_s=rider.max_speed_m_s, dry=race.plan.dry),
    )
