"""The bicycle: what it weighs, what it loses, how it is geared."""

from __future__ import annotations

import math
from dataclasses import dataclass

from pacing.bike.drag_area import DragArea

BEARINGS: dict[str, tuple[float, float]] = {
    "light grease": (0.091, 0.0087),
    "packed": (0.182, 0.0174),
}
"""Bearing drag of both wheels: N, and N per m/s.

Source: martin-1998; "packed" is twice that (common practice, no source).
"""


@dataclass(frozen=True)
class Bike:
    """One bicycle as ridden.

    ``crr`` is the tyres' on a smooth road. ``drivetrain_efficiency`` is wheel over crank power;
    with ``power_measured_at`` "hub" the meter sits behind the chain and nothing is lost.
    ``wheel_rotation_m2`` is drag area added by the turning wheels, 0 where a field-tested CdA
    already holds it. ``wheel_inertia_kg_m2`` is of both wheels. ``top_gear`` is wheel turns per
    crank turn, None for no spin-out. ``cda_by_yaw`` is a change added to every position's.

    Source: martin-1998 (efficiency, bearings, wheel inertia).
    """

    mass_kg: float
    crr: float
    drivetrain_efficiency: float = 0.976
    power_measured_at: str = "crank"
    bearing_n: float = BEARINGS["light grease"][0]
    bearing_n_per_m_s: float = BEARINGS["light grease"][1]
    wheel_rotation_m2: float = 0.0
    wheel_inertia_kg_m2: float = 0.14
    top_gear: float | None = None
    wheel_circumference_m: float = 2.10
    cda_by_yaw: DragArea | None = None

    @property
    def efficiency(self) -> float:
        """Wheel power over the power the meter stands for."""
        return 1.0 if self.power_measured_at == "hub" else self.drivetrain_efficiency

    @property
    def rotating_mass_kg(self) -> float:
        """Mass that the wheels' inertia adds to what is accelerated, I/r²."""
        radius_m = self.wheel_circumference_m / (2.0 * math.pi)
        return self.wheel_inertia_kg_m2 / radius_m**2

    def spin_out_m_s(self, max_cadence_rpm: float) -> float:
        """Speed above which pedalling adds nothing; infinite without a top gear."""
        if self.top_gear is None:
            return math.inf
        return self.top_gear * max_cadence_rpm / 60.0 * self.wheel_circumference_m

    def drag_area(self, position: DragArea) -> DragArea:
        """All that multiplies ½ρ·flow·along with the rider in a ``position`` of that drag area."""
        whole = position if self.cda_by_yaw is None else position + self.cda_by_yaw
        return whole.plus(self.wheel_rotation_m2) if self.wheel_rotation_m2 else whole
