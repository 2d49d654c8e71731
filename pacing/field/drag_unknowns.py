"""What an energy balance does not know, and what is known of each beforehand."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.air import Day
from pacing.air.wind import rider_height_factor
from pacing.field.drag_session import middle_clock_s
from pacing.field.drag_tilt import Tilt
from pacing.field.recording_check import Ride
from pacing.field.recording_drift import RATE_SD_M_PER_S
from pacing.race import Race

Array = NDArray[np.float64]

WEAK_CDA_M2, WEAK_CDA_SD_M2 = 0.30, 0.30
WEAK_CRR_SD = 0.01
FAR_OFF = (6.6, 9.2)
"""Chi-square of one and of two degrees of freedom that is exceeded one time in a hundred."""
DENSITY_SD = 0.005
"""Air density from a thermometer and a barometer nearby (common practice, no source)."""
HEIGHT_SCALE_SD = 0.02
"""Barometers take the air column for the standard one: some 7 K of difference is 2 %."""


@dataclass(frozen=True)
class Unknowns:
    """Names of p unknowns, their ``mean`` (p,) and ``precision`` (p, p) beforehand, and causes.

    In order: drag areas by position [m²], Crr, then what disturbs them: wind per ride (from
    east and from north, or head wind alone) [m/s], relative errors of power meter, density,
    speed and heights, mass [kg], drift of heights per ride [m/s], tilt of the road. ``cause``
    groups them for the budget of errors. An unknown known exactly is ``fixed``. ``loosened`` are
    the rides whose forecast wind proved wrong.
    """

    names: tuple[str, ...]
    cause: tuple[str, ...]
    mean: Array
    precision: Array
    fixed: NDArray[np.bool_]
    loosened: tuple[int, ...] = ()

    def at(self, name: str) -> int:
        """Index of an unknown; ValueError if there is none of that name."""
        return self.names.index(name)

    def start(self, name: str) -> int:
        """Index of the first unknown whose name begins so, −1 without any."""
        return next((i for i, n in enumerate(self.names) if n.startswith(name)), -1)


@dataclass
class _List:
    names: list[str]
    cause: list[str]
    mean: list[float]
    sd: list[float]

    def add(self, name: str, cause: str, mean: float, sd: float) -> None:
        self.names.append(name)
        self.cause.append(cause)
        self.mean.append(mean)
        self.sd.append(sd)


def unknowns_for(
    rides: Sequence[Ride],
    race: Race,
    *,
    positions: Sequence[str],
    crr: float,
    crr_sd: float | None,
    drag_area: tuple[float, float] = (WEAK_CDA_M2, WEAK_CDA_SD_M2),
    tilt: Tilt | None,
    headed: bool,
    begins_s: float = 0.0,
) -> Unknowns:
    """The unknowns of these rides, with the race file's uncertainties as what is known.

    ``crr`` is the rolling coefficient beforehand; ``crr_sd`` None leaves it to the rides.
    ``drag_area`` is mean and standard deviation beforehand. ``tilt`` is what is known of an even
    road's slope, None where heights are used as recorded. ``begins_s`` as in `session_of`.
    """
    known = race.uncertainty
    found = _List([], [], [], [])
    for name in positions:
        found.add(f"drag area {name}", "drag area", *drag_area)
    found.add("rolling", "rolling", crr, WEAK_CRR_SD if crr_sd is None else crr_sd)
    blocks = []
    for number, ride in enumerate(rides):
        mean, covariance = wind_beforehand(race, middle_clock_s(ride, race, begins_s))
        if not headed:
            mean, covariance = np.zeros(1), np.array([[np.trace(covariance) / 2.0]])
        blocks.append((len(found.names), covariance))
        for side, value in zip(("east", "north"), mean.tolist(), strict=False):
            found.add(f"wind {side} {number}", "wind", value, 1.0)
    found.add("wind square", "wind", 0.0, 1.0)
    speed_se = max(ride.speed.scale_se for ride in rides)
    found.add("meter", "power meter", 0.0, known.power_meter_pct / 100.0)
    found.add("mass", "mass", 0.0, known.mass_kg)
    found.add("density", "air density", 0.0, DENSITY_SD)
    found.add("speed", "speed", 1.0, speed_se)
    if tilt is None:
        found.add("height scale", "heights", 0.0, HEIGHT_SCALE_SD)
        for number, ride in enumerate(rides):
            rate, error = 0.0, RATE_SD_M_PER_S
            if ride.drift is not None:
                rate, error = ride.drift.rate_m_per_s, ride.drift.rate_se_m_per_s
            found.add(f"drift {number}", "heights", rate, max(error, 1e-4))
    else:
        blocks.append((len(found.names), tilt.covariance))
        for side, slope in zip(("east", "north"), tilt.slope.tolist(), strict=True):
            found.add(f"tilt {side}", "heights", slope, 1.0)
    return _unknowns(found, blocks)


def with_wind_believed(unknowns: Unknowns, theta: Array, rides: int) -> Unknowns:
    """The same, with less held of a forecast that the ride itself contradicts.

    Where the wind found lies further off the forecast than one time in a hundred, the stated
    errors of that ride's forecast are widened until it lies as far off as usual.
    """
    first = unknowns.start("wind east")
    wide = 1 if unknowns.start("wind north") < 0 else 2
    precision = unknowns.precision.copy()
    loosened = unknowns.loosened
    for number in range(rides):
        here = slice(first + wide * number, first + wide * (number + 1))
        off = theta[here] - unknowns.mean[here]
        ratio = float(off @ precision[here, here] @ off) / wide
        if ratio * wide > FAR_OFF[wide - 1]:
            precision[here, here] /= ratio
            loosened = (*loosened, number)
    if loosened == unknowns.loosened:
        return unknowns
    return replace(unknowns, precision=precision, loosened=loosened)


def _unknowns(found: _List, blocks: list[tuple[int, Array]]) -> Unknowns:
    sd = np.array(found.sd)
    fixed = sd <= 0.0
    precision = np.diag(np.where(fixed, 0.0, 1.0 / np.where(fixed, 1.0, sd) ** 2))
    for at, covariance in blocks:
        here = slice(at, at + covariance.shape[0])
        exact = bool(np.all(np.diag(covariance) <= 1e-12))
        fixed[here] = exact
        precision[here, here] = 0.0 if exact else np.linalg.inv(covariance)
    return Unknowns(tuple(found.names), tuple(found.cause), np.array(found.mean), precision, fixed)


def rolling_crr(race: Race) -> float:
    """The race file's rolling coefficient on its course's surface."""
    return race.bike.crr * float(np.median(race.course.crr_factor))


def wind_beforehand(race: Race, clock_s: float) -> tuple[Array, Array]:
    """Wind at the rider (from east, from north) [m/s] and its covariance (2, 2), as forecast.

    The errors of the race file: speed and direction of the forecast, and how much of it
    reaches the rider.
    """
    day, known = race.day, race.uncertainty
    east = float(day.wind_at_rider(90.0, 1.0, clock_s).along_m_s)
    north = float(day.wind_at_rider(0.0, 1.0, clock_s).along_m_s)
    factor = height_factor(day)
    base = (factor * known.wind_speed_m_s) ** 2
    along = base + ((known.wind_at_rider_pct / 100.0) ** 2) * (east**2 + north**2)
    across = base + np.radians(known.wind_from_deg) ** 2 * (east**2 + north**2)
    speed = np.hypot(east, north)
    way = np.array([east, north]) / speed if speed > 1e-9 else np.array([1.0, 0.0])
    side = np.array([-way[1], way[0]])
    covariance = along * np.outer(way, way) + across * np.outer(side, side)
    return np.array([east, north]), covariance


def height_factor(day: Day) -> float:
    """Wind at the rider over the wind as given, in the open."""
    weather = day.weathers[0]
    return rider_height_factor(weather.surroundings, wind_height_m=weather.wind_height_m)
