"""A race: course, rider, bicycle, air and settings for one start, frozen."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from pacing.air import Day
from pacing.bike import Bike, DragArea
from pacing.course.course import Course
from pacing.rider import Position, Rider


@dataclass(frozen=True)
class PlanSettings:
    """How the race is to be planned.

    ``start_clock_s`` is seconds of the day; powers are true power in W; ``None`` stands for a
    limit that does not hold.
    """

    start_clock_s: float
    start_speed_m_s: float
    reserve_j: float
    risk_pct: float | None
    min_power_w: float
    max_power_w: float | None
    first_30_s_max_w: float | None
    max_cues: int
    shortest_cue_s: float
    power_step_w: int
    dry: bool
    units: str


@dataclass(frozen=True)
class Uncertainty:
    """One standard deviation of each uncertain input, in the units of the race file."""

    cda_pct: float
    crr_pct: float
    mass_kg: float
    critical_power_pct: float
    w_prime_kj: float
    power_meter_pct: float
    wind_speed_m_s: float
    wind_from_deg: float
    wind_at_rider_pct: float


@dataclass(frozen=True)
class Race:
    """One race.

    ``inputs`` is the race file with every default filled in, JSON-able; ``given`` what was
    written, files merged, from which `pacing.race.vary` makes other races. ``options``
    are the overrides to compare, as written.
    """

    course: Course
    rider: Rider
    bike: Bike
    day: Day
    plan: PlanSettings
    uncertainty: Uncertainty
    options: tuple[Mapping[str, Any], ...]
    inputs: Mapping[str, Any]
    file: Path
    cautions: tuple[str, ...] = ()
    given: Mapping[str, Any] = field(default_factory=dict, repr=False)

    @property
    def mass_kg(self) -> float:
        """Rider, kit and bicycle."""
        return self.rider.mass_kg + self.rider.kit_mass_kg + self.bike.mass_kg

    @property
    def effective_mass_kg(self) -> float:
        """What is accelerated: the mass and I/r² of the wheels."""
        return self.mass_kg + self.bike.rotating_mass_kg

    def drag_area(self, position: Position) -> DragArea:
        """All that multiplies ½ρ·flow·along in that position: rider, bike by yaw, wheels."""
        area = position.drag_area.plus(self.bike.wheel_rotation_m2)
        return area if self.bike.cda_by_yaw is None else area + self.bike.cda_by_yaw
