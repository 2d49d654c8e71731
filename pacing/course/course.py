"""The course as ridden: a grid along the road, what stands beside it, and what was repaired."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True)
class SlowPoint:
    """A place where the road, not the rider, sets the speed (given by the user)."""

    at_m: float
    speed_m_s: float
    length_m: float = 15.0
    note: str = ""


@dataclass(frozen=True)
class Bend:
    """A bend found in the line. ``at_m`` is its middle; ``radius_m`` is None where unknown.

    ``turn_deg`` is positive to the right; ``confidence`` is the chance that the true radius lies
    within a quarter of the one found. Where the radius is unknown, ``widest_m`` is the widest path
    that the points and the width of a road allow at its tightest place.
    """

    at_m: float
    length_m: float
    radius_m: float | None
    turn_deg: float
    confidence: float
    widest_m: float | None = None

    @property
    def planning_radius_m(self) -> float | None:
        """The radius to plan with: the one found, else a guess from the widest, if any.

        A bend is hardly ever as wide as its points allow, and the less so the wider that is. The
        two figures were chosen so that 18 invented roads with bends of 20 to 500 m take on average
        as long from points 10 to 80 m apart as from points 5 m apart.
        """
        if self.radius_m is not None:
            return self.radius_m
        return None if self.widest_m is None else 1.0 / (1.0 / (0.75 * self.widest_m) + 1.0 / 130.0)


@dataclass(frozen=True)
class Landmark:
    """Something the rider sees at a known place."""

    at_m: float
    name: str


@dataclass(frozen=True)
class Repair:
    """One repair of the file, along the course as read: what, where, how much."""

    what: str
    from_km: float
    to_km: float
    amount: str


@dataclass(frozen=True)
class CourseSpec:
    """What the race file says of the course: the file, and how it is ridden.

    Distances are of one lap, in the ridden direction.
    """

    file: Path
    track: str | int | None = None
    laps: int = 1
    reverse: bool = False
    from_km: float | None = None
    to_km: float | None = None
    official_km: float | None = None
    heights: str | None = None
    flat: bool = False
    smoothing_m: float | None = None
    surface: str = "smooth"
    ignore_bends_km: tuple[float, ...] = ()
    slow_points: tuple[dict[str, Any], ...] = ()
    stretches: tuple[dict[str, Any], ...] = ()
    landmarks: tuple[dict[str, Any], ...] = ()


@dataclass(frozen=True)
class CourseReport:
    """What reading and repairing found; printed by ``pacing course``.

    Lengths and climbing are of the whole course, all laps included; kilometres of the repairs are
    along one lap in the direction of the file. ``verdict`` is ``good``, ``usable`` (with these
    ``cautions``) or ``unusable`` (for these ``reasons``). The raw heights (K,) of the file stand
    at road distances of one lap as ridden.
    """

    length_horizontal_m: float
    climbing_raw_m: float
    climbing_m: float
    height_source: str
    height_noise_m: float
    gradient_error_pct: float
    repairs: tuple[Repair, ...] = ()
    cautions: tuple[str, ...] = ()
    reasons: tuple[str, ...] = ()
    verdict: str = "good"
    raw_distance_m: Array = field(default_factory=lambda: np.empty(0))
    raw_elevation_m: Array = field(default_factory=lambda: np.empty(0))


@dataclass(frozen=True)
class Course:
    """A course on a grid of N cells between N + 1 nodes, all laps included.

    ``distance_m`` (N+1,) is road distance, rise included, from 0; ``lat_deg``, ``lon_deg`` and
    ``elevation_m`` (N+1,) are at the nodes. Per cell (N,): ``gradient`` is rise over horizontal
    run, ``heading_deg`` the direction of travel (0 north, 90 east), ``crr_factor`` multiplies the
    tyre's Crr, ``wind_share`` the wind that reaches the rider.
    """

    name: str
    distance_m: Array
    lat_deg: Array
    lon_deg: Array
    elevation_m: Array
    gradient: Array
    heading_deg: Array
    crr_factor: Array
    wind_share: Array
    lap_length_m: float
    laps: int
    slow_points: tuple[SlowPoint, ...]
    bends: tuple[Bend, ...]
    landmarks: tuple[Landmark, ...]
    report: CourseReport

    @property
    def length_m(self) -> float:
        """Road distance of the whole course."""
        return float(self.distance_m[-1])

    @property
    def cell_length_m(self) -> Array:
        """Road length of each cell (N,)."""
        return np.diff(self.distance_m)
