"""What a fit of drag found, how sure it is, and where it does not fit."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.field.recording import Masked

Array = NDArray[np.float64]


class Interval(NamedTuple):
    """A value with its 95 % interval."""

    value: float
    low: float
    high: float

    @property
    def half(self) -> float:
        """Half the width."""
        return 0.5 * (self.high - self.low)


@dataclass(frozen=True)
class PositionDrag:
    """Drag area [m²] of one position, and how long it was ridden in what was used."""

    name: str
    cda_m2: Interval
    used_s: float


@dataclass(frozen=True)
class Difference:
    """Drag area of ``name`` less that of ``against`` [m²]: errors they share cancel."""

    name: str
    against: str
    cda_m2: Interval


@dataclass(frozen=True)
class RideWind:
    """Wind at the rider in one ride: where from, how strong, and whether the ride told it.

    ``from_deg`` None where every direction is possible. ``se_m_s`` is the larger standard error
    of its two components. ``contradicts`` where it was far off the race file's.
    """

    ride: str
    estimated: bool
    speed_m_s: float
    from_deg: float | None
    se_m_s: float
    contradicts: bool = False


@dataclass(frozen=True)
class Known:
    """What is known best where drag area and Crr cannot be told apart.

    At ``speed_m_s`` air and tyres together hold back with ``force_n`` on a level windless road.
    ``crr_per_m2`` is how much Crr goes down for each m² of drag area more.
    """

    speed_m_s: float
    force_n: Interval
    crr_per_m2: float


@dataclass(frozen=True)
class Misfit:
    """Height recomputed from the energy balance less the recorded one, along one ride.

    ``km`` and ``height_m`` (M,) with NaN where the ride was not used; ``band_m`` (M,) is half of
    the width within which it should stay 19 times out of 20.
    """

    ride: str
    km: Array
    height_m: Array
    band_m: Array


@dataclass(frozen=True)
class DragFit:
    """Drag area and rolling coefficient from field rides, with 95 % intervals.

    ``cda_m2`` is of the first position. ``budget`` says which share of the variance of ``cda_m2``
    comes from which cause. ``separable`` False means Crr rests on the race file. ``used_s`` is
    the time that was balanced, of ``moving_s``. ``on_course``
    says that the rides followed the race file's course, whose surface then is taken off Crr.
    """

    cda_m2: float
    cda_low_m2: float
    cda_high_m2: float
    crr: float
    crr_low: float
    crr_high: float
    separable: bool
    method: str
    positions: tuple[PositionDrag, ...]
    differences: tuple[Difference, ...]
    known: Known
    wind: tuple[RideWind, ...]
    budget: dict[str, float]
    masked: tuple[tuple[str, Masked], ...]
    warnings: tuple[str, ...]
    notes: tuple[str, ...]
    misfit: tuple[Misfit, ...]
    used_s: float
    moving_s: float
    stretches: int
    speed_range_m_s: tuple[float, float]
    on_course: bool = False
    fragment: str = ""

    @property
    def cda(self) -> Interval:
        """Drag area of the first position with its interval."""
        return self.positions[0].cda_m2
