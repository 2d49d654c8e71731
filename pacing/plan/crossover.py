"""When sitting up is faster: the speed and gradient at which two positions are equal."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from pacing.plan.position_choice import Choice
from pacing.plan.position_prices import outside_s
from pacing.plan.position_road import asked_in_pieces, with_pieces
from pacing.plan.problem import Ride, ride
from pacing.race import Race
from pacing.rider import Position
from pacing.units import GRAVITY_M_S2, KMH_PER_M_S

Array = NDArray[np.float64]

LOWEST_SHARE, HIGHEST_SHARE = 0.5, 1.5
GRADIENTS_PCT = np.arange(-3.0, 12.01, 0.25)
FASTEST_M_S = 40.0


@dataclass(frozen=True)
class Still:
    """Rider, bike and calm air: ``half_density_kg_m3`` ½ρ, ``weight_n`` and what resists.

    ``efficiency`` wheel power over the rider's, bearings ``bearing_n`` and per m/s.
    """

    half_density_kg_m3: float
    weight_n: float
    crr: float
    bearing_n: float
    bearing_n_per_m_s: float
    efficiency: float

    def slope_force_n(self, gradient: Array | float) -> Array:
        """Gravity, rolling and constant bearing drag on a ``gradient``."""
        grade = np.asarray(gradient, dtype=float)
        return self.weight_n * (grade + self.crr) / np.sqrt(1.0 + grade**2) + self.bearing_n

    def gradient_of(self, force_n: float) -> float:
        """The gradient on which `slope_force_n` is ``force_n``; inf where none is so steep."""
        sine = (force_n - self.bearing_n) / (self.weight_n * np.hypot(1.0, self.crr))
        return float(np.tan(np.arcsin(sine) - np.arctan(self.crr))) if sine < 1.0 else np.inf


@dataclass(frozen=True)
class Seat:
    """A position in calm air: drag area straight ahead and share of power."""

    area_m2: float
    power_share: float


def crossover(lower: Seat, upper: Seat, still: Still, *, effort_w: float) -> tuple[float, float]:
    """Speed (m/s) and gradient at which both positions are as fast at ``effort_w``.

    Effort is power over power share. Slower than that, and steeper, the upper one is faster.
    (nan, nan) where one of them is faster everywhere.
    """
    gain_w = still.efficiency * effort_w * (upper.power_share - lower.power_share)
    drag = still.half_density_kg_m3 * (upper.area_m2 - lower.area_m2)
    if gain_w <= 0.0 or drag <= 0.0:
        return np.nan, np.nan
    speed = (gain_w / drag) ** (1.0 / 3.0)
    wheel_n = still.efficiency * effort_w * lower.power_share / speed
    air_n = still.half_density_kg_m3 * lower.area_m2 * speed**2
    return speed, still.gradient_of(wheel_n - air_n - still.bearing_n_per_m_s * speed)


def equal_speed_m_s(lower: Seat, upper: Seat, still: Still, gradient: Array) -> Array:
    """Speed on each ``gradient`` at which both positions ask for the same effort.

    Below it the upper one asks for less; nan where there is no such speed.
    """
    by_power = 1.0 / lower.power_share - 1.0 / upper.power_share
    by_drag = still.half_density_kg_m3 * (
        upper.area_m2 / upper.power_share - lower.area_m2 / lower.power_share
    )
    force = still.slope_force_n(gradient)
    if by_power <= 0.0 or by_drag <= 0.0:
        return np.full(force.shape, np.nan)
    ratio = by_power / by_drag
    middle = ratio * still.bearing_n_per_m_s
    under = middle**2 + 4.0 * ratio * force
    return np.where(force > 0.0, 0.5 * (middle + np.sqrt(np.maximum(under, 0.0))), np.nan)


def steady_speed_m_s(seat: Seat, still: Still, gradient: float, *, effort_w: float) -> float:
    """Steady speed on a ``gradient`` at an effort."""
    wheel_w = still.efficiency * effort_w * seat.power_share
    slope_n = float(still.slope_force_n(gradient))

    def spare_w(speed: float) -> float:
        air_n = still.half_density_kg_m3 * seat.area_m2 * speed**2
        return wheel_w - speed * (slope_n + still.bearing_n_per_m_s * speed + air_n)

    return float(brentq(spare_w, 0.1, FASTEST_M_S))


def break_even_share(upper: Ride, position: int, *, now: float) -> float:
    """Power share at which ``position``, all the way, is as fast as the ride ``upper``.

    The same effort is held in every piece, so W′ is spent alike. ``now`` is the position's own
    share. nan where no share between 0.5 and 1.5 is.
    """
    problem, starts = upper.problem, upper.starts
    other = with_pieces(problem, starts, np.full(starts.size, position))
    effort = upper.power_w / problem.power_share[starts]
    guess = upper.motion.speed_m_s

    def slower_s(share: float) -> float:
        lower = ride(other, starts, effort * share, guess_m_s=guess)
        return lower.motion.total_s - upper.motion.total_s

    low, high = max(LOWEST_SHARE, now - 0.25), min(HIGHEST_SHARE, now + 0.25)
    if slower_s(low) < 0.0 or slower_s(high) > 0.0:
        return np.nan
    return float(brentq(slower_s, low, high, xtol=1e-4))


def positions_report(race: Race, ridden: Ride, choice: Choice) -> dict[str, Any] | None:
    """What there is to say of a rider's positions on this course; None with only one.

    ``ridden`` is the ride as printed.
    """
    positions = race.rider.positions
    if len(positions) == 1:
        return None
    still, effort_w = still_air(race, ridden), float(ridden.problem.critical_power_w[0])
    order = np.argsort([seat_of(race, position).area_m2 for position in positions], kind="stable")
    lowest, highest = int(order[0]), int(order[-1])
    pairs = [_pair(race, still, choice, int(a), int(b), effort_w) for a, b in pairwise(order)]
    widest = pairs[0] if len(pairs) == 1 else _pair(race, still, choice, lowest, highest, effort_w)
    asked = asked_in_pieces(ridden.problem, ridden.starts)
    worth = None
    if choice.single_s is not None:
        worth = choice.single_s - choice.solution.ride.motion.total_s
    return {
        **widest,
        "effort_w": effort_w,
        "worth_s": worth,
        "best_single": None if choice.single is None else positions[choice.single].name,
        "changes": int(np.sum(np.diff(asked) != 0)),
        "outside_s": outside_s(ridden),
        "pairs": pairs,
        "lines": _lines(race, still, lowest, highest, effort_w),
    }


def seat_of(race: Race, position: Position) -> Seat:
    """Drag area straight ahead, wheels and bike included, and power share."""
    return Seat(float(race.drag_area(position).m2_at(np.zeros(1))[0]), position.power_share)


def still_air(race: Race, ridden: Ride) -> Still:
    """The race on its mean day without wind."""
    bike, road = race.bike, ridden.problem.road
    return Still(
        half_density_kg_m3=float(np.mean(road.half_density_kg_m3)),
        weight_n=race.mass_kg * GRAVITY_M_S2,
        crr=bike.crr * float(np.median(race.course.crr_factor)),
        bearing_n=bike.bearing_n,
        bearing_n_per_m_s=bike.bearing_n_per_m_s,
        efficiency=bike.efficiency,
    )


def _pair(
    race: Race, still: Still, choice: Choice, low: int, high: int, effort_w: float
) -> dict[str, Any]:
    lower, upper = race.rider.positions[low], race.rider.positions[high]
    speed, gradient = crossover(
        seat_of(race, lower), seat_of(race, upper), still, effort_w=effort_w
    )
    return {
        "lower": lower.name,
        "upper": upper.name,
        "crossover_kmh": _known(speed * KMH_PER_M_S),
        "crossover_gradient_pct": _known(100.0 * gradient),
        "break_even_share": _known(
            break_even_share(choice.singles[high].ride, low, now=lower.power_share)
        ),
        "power_share": lower.power_share,
        "upper_power_share": upper.power_share,
    }


def _lines(race: Race, still: Still, low: int, high: int, effort_w: float) -> dict[str, Any]:
    """What the picture over speed and gradient draws."""
    seats = [seat_of(race, race.rider.positions[p]) for p in (low, high)]
    gradient = GRADIENTS_PCT / 100.0
    speeds = [
        [KMH_PER_M_S * steady_speed_m_s(seat, still, g, effort_w=effort_w) for g in gradient]
        for seat in seats
    ]
    equal = KMH_PER_M_S * equal_speed_m_s(seats[0], seats[1], still, gradient)
    return {
        "gradient_pct": GRADIENTS_PCT.tolist(),
        "lower_kmh": speeds[0],
        "upper_kmh": speeds[1],
        "equal_kmh": [_known(speed) for speed in equal.tolist()],
    }


def _known(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
