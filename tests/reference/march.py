"""A printed plan ridden again, cell by cell, with fine Runge-Kutta steps in distance.

Inside a cell the power asked for, the gradient and the air are those of the trace; speed follows
from m dE/ds = drive − resistance with E = v²/2 and W′ from its recovery law written as a
differential equation in time. Nothing of pacing computes here, and nothing of the plan's own
speeds or times is used.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from exported import SLOWEST_M_S, Exported
from scipy.optimize import brentq


@dataclass(frozen=True)
class Ridden:
    """The march: at nodes (N+1,) speed, clock and W′ left; per cell (N,) mean power."""

    speed_m_s: np.ndarray
    elapsed_s: np.ndarray
    w_left_j: np.ndarray
    power_w: np.ndarray

    @property
    def time_s(self) -> float:
        return float(self.elapsed_s[-1])


def pools_of(law: Mapping[str, Any], w_prime_j: float) -> tuple[float, ...]:
    """Pools (J) of a rested rider."""
    if law["name"] == "two-phase":
        return (law["quick_share"] * w_prime_j, (1.0 - law["quick_share"]) * w_prime_j)
    return (w_prime_j,)


def time_constant_s(law: Mapping[str, Any], deficit_w: float, w_prime_j: float) -> float:
    """Published time constants of the one-pool laws at D = ``deficit_w`` (published values)."""
    name = law["name"]
    if name == "skiba-2015":
        return w_prime_j / deficit_w
    if name == "skiba-2012":
        return 546.0 * math.exp(-0.01 * deficit_w) + 316.0
    if name == "bartram-2018":
        return 2287.2 * deficit_w**-0.688
    if name == "weigend-2022":
        return 2112.44 * deficit_w**-0.3892 - 14.506
    raise ValueError(name)


def pool_rates_w(
    law: Mapping[str, Any], pools: tuple[float, ...], excess_w: float, w_prime_j: float
) -> tuple[float, ...]:
    """d(pools)/dt at ``excess_w`` above (or below) critical power, capped for planning."""
    if law["name"] == "two-phase":
        return _two_phase_rates_w(law, pools, excess_w, w_prime_j)
    if excess_w >= 0.0:
        return (-excess_w,)
    if law["name"] == "none":
        return (0.0,)
    debt = max(w_prime_j - pools[0], 0.0)
    return (min(debt / time_constant_s(law, -excess_w, w_prime_j), -excess_w),)


def _two_phase_rates_w(
    law: Mapping[str, Any], pools: tuple[float, ...], excess_w: float, w_prime_j: float
) -> tuple[float, ...]:
    share = law["quick_share"]
    if excess_w >= 0.0:
        quick, slow = max(pools[0], 0.0), max(pools[1], 0.0)
        held = quick + slow
        if held <= 0.0:
            return (-share * excess_w, -(1.0 - share) * excess_w)
        from_quick = law["by_content"] * quick / held + (1.0 - law["by_content"]) * share
        if quick <= 0.0:
            from_quick = 0.0
        elif slow <= 0.0:
            from_quick = 1.0
        return (-from_quick * excess_w, -(1.0 - from_quick) * excess_w)
    full = pools_of(law, w_prime_j)
    debts = [max(most - left, 0.0) for most, left in zip(full, pools, strict=True)]
    slow_tau = law["slow_tau_scale"] * (-excess_w) ** -law["slow_tau_exponent"]
    rates = (debts[0] / law["quick_tau_s"], debts[1] / slow_tau)
    eased = min(1.0, -excess_w / sum(rates)) if sum(rates) > 0.0 else 1.0
    return (rates[0] * eased, rates[1] * eased)


def follow_pools(
    law: Mapping[str, Any],
    pools: tuple[float, ...],
    excess_w: float,
    duration_s: float,
    w_prime_j: float,
    *,
    step_s: float = 0.5,
) -> tuple[float, ...]:
    """Pools after ``duration_s`` at ``excess_w``, by Heun steps no longer than ``step_s``."""
    steps = max(1, math.ceil(duration_s / step_s))
    dt = duration_s / steps
    full = pools_of(law, w_prime_j)
    for _ in range(steps):
        first = pool_rates_w(law, pools, excess_w, w_prime_j)
        ahead = tuple(p + dt * r for p, r in zip(pools, first, strict=True))
        second = pool_rates_w(law, ahead, excess_w, w_prime_j)
        moved = [p + 0.5 * dt * (a + b) for p, a, b in zip(pools, first, second, strict=True)]
        pools = _kept_whole(moved, full, spending=excess_w > 0.0)
    return pools


def _kept_whole(
    pools: list[float], full: tuple[float, ...], *, spending: bool
) -> tuple[float, ...]:
    """No pool above full; a pool that a step overdrew is made good by the other."""
    pools = [min(p, most) for p, most in zip(pools, full, strict=True)]
    if spending and len(pools) == 2 and sum(pools) > 0.0 and min(pools) < 0.0:
        return (0.0, sum(pools)) if pools[0] < 0.0 else (sum(pools), 0.0)
    return tuple(pools)


def w_left_j(
    road: Exported, power_w: np.ndarray, time_s: np.ndarray, *, step_s: float = 0.5
) -> np.ndarray:
    """W′ left at nodes (N+1,) when ``power_w`` is held for ``time_s`` in each cell."""
    excess = power_w / road.power_share - road.critical_power_w
    pools = pools_of(road.recovery_law, road.w_prime_j)
    left = [sum(pools)]
    for over, duration in zip(excess.tolist(), time_s.tolist(), strict=True):
        pools = follow_pools(
            road.recovery_law, pools, over, duration, road.w_prime_j, step_s=step_s
        )
        left.append(sum(pools))
    return np.array(left)


def march(road: Exported, target_w: np.ndarray, *, steps: int = 8) -> Ridden:
    """Ride ``target_w`` (N,) over ``road`` with ``steps`` Runge-Kutta steps in every cell.

    Where the target would carry the rider past the speed limit at the cell's end, less is put out
    over the whole cell, and where even coasting would, the brakes do the rest, evenly.
    """
    speed = [min(road.start_speed_m_s, float(road.limit_m_s[0]))]
    elapsed, power = [0.0], []
    columns = zip(
        road.cell_m.tolist(),
        np.asarray(target_w, dtype=float).tolist(),
        road.efficiency.tolist(),
        road.steady_n.tolist(),
        (0.5 * road.density_kg_m3 * road.cda_m2).tolist(),
        road.wind_along_m_s.tolist(),
        (road.wind_across_m_s**2).tolist(),
        road.limit_m_s[1:].tolist(),
        strict=True,
    )
    for length, target, eta, steady, drag, along, across2, limit in columns:
        cell = _Cell(road, length, steps, eta, steady, drag, along, across2)
        v, spent_s, put_out_w = cell.ride(speed[-1], target, limit)
        speed.append(v)
        elapsed.append(elapsed[-1] + spent_s)
        power.append(put_out_w)
    powers, clock = np.array(power), np.array(elapsed)
    left = w_left_j(road, powers, np.diff(clock))
    return Ridden(np.array(speed), clock, left, powers)


@dataclass(frozen=True)
class _Cell:
    """One cell of road, ridden in Runge-Kutta steps of energy over distance."""

    road: Exported
    length_m: float
    steps: int
    eta: float
    steady_n: float
    drag: float
    wind_m_s: float
    across2: float

    def ride(self, v: float, target_w: float, limit_m_s: float) -> tuple[float, float, float]:
        """Speed at the end, time, and mean power put out."""
        end, spent, drive_j = self._through(v, target_w, 0.0)
        if end <= limit_m_s:
            return end, spent, drive_j / (self.eta * spent)
        coasting, _, _ = self._through(v, 0.0, 0.0)
        if coasting <= limit_m_s:
            watts = brentq(lambda p: self._through(v, p, 0.0)[0] - limit_m_s, 0.0, target_w)
            end, spent, drive_j = self._through(v, watts, 0.0)
            return limit_m_s, spent, drive_j / (self.eta * spent)
        most = self.road.effective_mass_kg * v * v / self.length_m + 1000.0
        brake = brentq(lambda b: self._through(v, 0.0, b)[0] - limit_m_s, 0.0, most)
        _, spent, _ = self._through(v, 0.0, brake)
        return limit_m_s, spent, 0.0

    def _through(self, v: float, watts: float, brake_n: float) -> tuple[float, float, float]:
        step = self.length_m / self.steps
        spent = drive_j = 0.0
        grip = self.road.traction_n
        for _ in range(self.steps):
            after = max(self._rk4(v, step, watts * self.eta, brake_n), SLOWEST_M_S)
            dt = 2.0 * step / (v + after)
            spent += dt
            drive_j += min(watts * self.eta * dt, grip * step)
            v = after
        return v, spent, drive_j

    def _rk4(self, v: float, step: float, wheel_w: float, brake_n: float) -> float:
        mass, grip, least = self.road.effective_mass_kg, self.road.traction_n, 1e-4
        rolling = self.road.bearing_n_per_m_s

        def slope(energy: float) -> float:
            w = math.sqrt(2.0 * max(energy, least))
            along = w + self.wind_m_s
            air = self.drag * math.sqrt(along * along + self.across2) * along
            resist = self.steady_n + rolling * w + air + brake_n
            return (min(wheel_w / w, grip) - resist) / mass

        e = 0.5 * v * v
        k1 = slope(e)
        k2 = slope(e + 0.5 * step * k1)
        k3 = slope(e + 0.5 * step * k2)
        k4 = slope(e + step * k3)
        return math.sqrt(2.0 * max(e + step * (k1 + 2.0 * k2 + 2.0 * k3 + k4) / 6.0, least))
