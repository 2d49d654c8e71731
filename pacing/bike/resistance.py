"""What holds a bicycle back, force by force, along the road."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.bike.drag_area import DragArea
from pacing.units import GRAVITY_M_S2

Array = NDArray[np.float64]
Floats = float | Array

_TINY = 1e-30


class ForceAndSlope(NamedTuple):
    """A force in N and its slope in speed in N per m/s, both of the argument's shape."""

    force_n: Array
    slope_n_per_m_s: Array


def air_force_n(
    speed_m_s: Floats,
    *,
    density_kg_m3: Floats,
    wind_along_m_s: Floats,
    wind_across_m_s: Floats,
    drag_area: DragArea,
    extra_m2: float = 0.0,
) -> Array:
    """Air resistance along the road, ½ρ (CdA(yaw) + ``extra_m2``) · flow · along.

    Arrays of one shape or broadcast; head wind positive, the side of the cross wind without
    effect. Negative where a tail wind outruns the rider. ``extra_m2`` is added drag area such
    as that of turning wheels.

    Source: martin-1998 (Pat, with the drag area on the road's axis).
    """
    return air_force_n_and_slope(
        speed_m_s,
        density_kg_m3=density_kg_m3,
        wind_along_m_s=wind_along_m_s,
        wind_across_m_s=wind_across_m_s,
        drag_area=drag_area,
        extra_m2=extra_m2,
    ).force_n


def air_force_n_and_slope(
    speed_m_s: Floats,
    *,
    density_kg_m3: Floats,
    wind_along_m_s: Floats,
    wind_across_m_s: Floats,
    drag_area: DragArea,
    extra_m2: float = 0.0,
) -> ForceAndSlope:
    """`air_force_n` and its exact slope in ground speed."""
    along = np.asarray(speed_m_s) + wind_along_m_s
    along2 = along * along
    across2 = np.asarray(wind_across_m_s, dtype=float) ** 2
    half_density = 0.5 * np.asarray(density_kg_m3, dtype=float)
    flow2 = along2 + across2
    flow = np.sqrt(flow2)
    along2_over_flow = along2 / np.maximum(flow, _TINY)
    if drag_area.constant:
        scale = half_density * (drag_area.m2[0] + extra_m2)
        return ForceAndSlope(scale * flow * along, scale * (along2_over_flow + flow))
    sin2_yaw = across2 / np.maximum(flow2, _TINY)
    area, area_slope = drag_area.m2_and_slope_in_sin2(sin2_yaw)
    area = area + extra_m2
    # d(sin² yaw)/dv = −2 sin² yaw · along/flow²
    force = half_density * area * flow * along
    slope = half_density * ((area - 2.0 * sin2_yaw * area_slope) * along2_over_flow + area * flow)
    return ForceAndSlope(force, slope)


def rolling_force_n(
    *,
    crr: Floats,
    mass_kg: Floats,
    gradient: Floats,
    gravity_m_s2: float = GRAVITY_M_S2,
) -> Array:
    """Rolling resistance of the tyres, Crr m g cos θ; ``gradient`` is rise over run.

    Source: martin-1998 (Prr).
    """
    slope = np.asarray(gradient, dtype=float)
    return np.asarray(crr * np.asarray(mass_kg) * gravity_m_s2 / np.sqrt(1.0 + slope * slope))


def gravity_force_n(
    *, mass_kg: Floats, gradient: Floats, gravity_m_s2: float = GRAVITY_M_S2
) -> Array:
    """Weight along the road, m g sin θ, positive uphill; ``gradient`` is rise over run.

    Source: martin-1998 (Ppe).
    """
    slope = np.asarray(gradient, dtype=float)
    return np.asarray(np.asarray(mass_kg) * gravity_m_s2 * slope / np.sqrt(1.0 + slope * slope))


def bearing_force_n(speed_m_s: Floats, *, bearing_n: float, bearing_n_per_m_s: float) -> Array:
    """Drag of the wheel bearings, b₀ + b₁ v.

    Source: martin-1998 (Pwb).
    """
    return np.asarray(bearing_n + bearing_n_per_m_s * np.asarray(speed_m_s))


class RoadPower(NamedTuple):
    """Where a rider's power goes, in W; ``total_w`` is at the crank, the others at the wheel."""

    air_w: Array
    rolling_w: Array
    bearings_w: Array
    gravity_w: Array
    kinetic_w: Array
    total_w: Array


def road_power_w(
    speed_m_s: Floats,
    *,
    mass_kg: float,
    gradient: Floats,
    density_kg_m3: Floats,
    drag_area: DragArea,
    crr: Floats,
    wind_along_m_s: Floats = 0.0,
    wind_across_m_s: Floats = 0.0,
    wheel_rotation_m2: float = 0.0,
    bearing_n: float = 0.0,
    bearing_n_per_m_s: float = 0.0,
    efficiency: float = 1.0,
    acceleration_m_s2: Floats = 0.0,
    effective_mass_kg: float | None = None,
    gravity_m_s2: float = GRAVITY_M_S2,
) -> RoadPower:
    """Power needed at ground speed ``speed_m_s``, part by part.

    ``effective_mass_kg`` is the mass with the wheels' inertia (default ``mass_kg``). All arrays
    of one shape or broadcast.

    Source: martin-1998.
    """
    speed = np.asarray(speed_m_s, dtype=float)
    air = speed * air_force_n(
        speed,
        density_kg_m3=density_kg_m3,
        wind_along_m_s=wind_along_m_s,
        wind_across_m_s=wind_across_m_s,
        drag_area=drag_area,
        extra_m2=wheel_rotation_m2,
    )
    rolling = speed * rolling_force_n(
        crr=crr, mass_kg=mass_kg, gradient=gradient, gravity_m_s2=gravity_m_s2
    )
    bearings = speed * bearing_force_n(
        speed, bearing_n=bearing_n, bearing_n_per_m_s=bearing_n_per_m_s
    )
    gravity = speed * gravity_force_n(mass_kg=mass_kg, gradient=gradient, gravity_m_s2=gravity_m_s2)
    inertia_kg = mass_kg if effective_mass_kg is None else effective_mass_kg
    kinetic = speed * inertia_kg * np.asarray(acceleration_m_s2)
    total = (air + rolling + bearings + gravity + kinetic) / efficiency
    return RoadPower(air, rolling, bearings, gravity, kinetic, total)
