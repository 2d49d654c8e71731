"""Speed along the course for given rider power: Newton on all cells at once.

State is E = v²/2 at the nodes, distance the independent variable. In every cell

    m_eff (E₁ − E₀) = η P dt − h (R(v₀) + R(v₁))/2 − h·braking,    dt = 2 h/(v₀ + v₁),

a lower-bidiagonal system. Which equation holds at a node is part of the solution: the power
asked for, no power above spin-out, exactly the spin-out speed, or exactly the speed limit.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import NDArray
from scipy.linalg.lapack import dtbtrs

from pacing.errors import OurFaultError
from pacing.motion.road import Road

Array = NDArray[np.float64]

FLOOR_M_S = 1.0
"""Below this a bicycle cannot be ridden upright; a node here has stalled (common practice)."""

MOST_ITERATIONS = 60


class Mode(IntEnum):
    """Which equation decides the speed at the end of a cell."""

    POWER = 0
    TRACTION = 1
    COAST = 2
    SPIN_OUT = 3
    LIMIT = 4
    FLOOR = 5


@dataclass(frozen=True)
class Motion:
    """A ride: at nodes (N+1,) ``speed_m_s``; per cell (N,) the rest.

    ``power_w`` is what the rider puts out, ``braking_n`` the mean braking force, ``mode`` the
    equation that decided the speed at the cell's end (`Mode`).
    """

    speed_m_s: Array
    time_s: Array
    power_w: Array
    braking_n: Array
    mode: NDArray[np.int8]

    @property
    def total_s(self) -> float:
        """Time of the whole ride."""
        return float(self.time_s.sum())

    @property
    def elapsed_s(self) -> Array:
        """Time at the nodes (N+1,)."""
        return np.concatenate([[0.0], np.cumsum(self.time_s)])

    @property
    def stalled_cells(self) -> NDArray[np.intp]:
        """Cells the rider cannot get through upright: two or more in a row at the floor.

        One by itself is the first cell of a wall, which the trapezoid overshoots.
        """
        floor = self.mode == Mode.FLOOR
        beside = np.zeros_like(floor)
        beside[1:] |= floor[:-1]
        beside[:-1] |= floor[1:]
        return np.flatnonzero(floor & (beside | (floor.size == 1)))


@dataclass(frozen=True)
class CellSlopes:
    """Linearised motion per cell (N,): ``to`` dE₁ + ``start`` dE₀ = ``power`` dP."""

    to: Array
    start: Array
    power: Array


def solve_bidiagonal(diagonal: Array, below: Array, right: Array) -> Array:
    """x with diagonal_i x_i + below_i x_(i−1) = right_i; ``below[0]`` is not used.

    ``right`` (N,) or (N, k).
    """
    band = np.empty((2, diagonal.size))
    band[0] = diagonal
    band[1, :-1] = below[1:]
    x, info = dtbtrs(band, right, uplo="L")
    if info != 0:
        raise OurFaultError("The linearised motion is singular.")
    return np.asarray(x)


def _linearise(
    road: Road, target_w: Array, energy: Array
) -> tuple[Array, CellSlopes, NDArray[np.int8]]:
    """Residual, its slopes and the deciding mode of each cell, all scaled by the mass."""
    speed = np.sqrt(2.0 * energy)
    v0, v1 = speed[:-1], speed[1:]
    mass, cell = road.effective_mass_kg, road.cell_m
    r0, r0_slope = road.resistance_n_and_slope(v0)
    r1, r1_slope = road.resistance_n_and_slope(v1)
    v0_safe = np.maximum(v0, 1e-3)
    half = 0.5 * cell / mass
    coast = energy[1:] - energy[:-1] + half * (r0 + r1)
    to = 1.0 + half * r1_slope / v1
    start = -1.0 + half * r0_slope / v0_safe

    total = v0 + v1
    per_watt = road.efficiency * 2.0 * cell / (mass * total)
    work = per_watt * target_w
    most = road.traction_n * cell / mass
    slipping = work > most
    drive = np.where(slipping, most, work)
    drive_slope = np.where(slipping, 0.0, work / total)
    powered = coast - drive

    # v1 = max(floor, min(limit, max(coast, min(powered, spin-out)))): told by how far each
    # equation says e1 lies above its root, for residuals of unlike slopes can make it cycle
    e1 = energy[1:]
    powered_to = to + drive_slope / v1
    spin = e1 - 0.5 * road.spin_out_m_s**2
    limit = e1 - 0.5 * road.limit_m_s[1:] ** 2
    floor = e1 - 0.5 * FLOOR_M_S**2
    above = powered / powered_to
    spinning = spin > above
    above = np.where(spinning, spin, above)
    coasting = coast / to < above
    above = np.where(coasting, coast / to, above)
    limited = limit > above
    above = np.where(limited, limit, above)
    floored = floor < above

    mode = np.where(slipping, Mode.TRACTION, Mode.POWER).astype(np.int8)
    mode[spinning] = Mode.SPIN_OUT
    mode[coasting] = Mode.COAST
    mode[limited] = Mode.LIMIT
    mode[floored] = Mode.FLOOR
    residual = np.choose(mode, (powered, powered, coast, spin, limit, floor))

    driven = mode <= Mode.TRACTION
    moving = driven | (mode == Mode.COAST)
    slopes = CellSlopes(
        to=np.where(driven, powered_to, np.where(moving, to, 1.0)),
        start=np.where(moving, start + np.where(driven, drive_slope / v0_safe, 0.0), 0.0),
        power=np.where(mode == Mode.POWER, per_watt, 0.0),
    )
    return residual, slopes, mode


def simulate_motion(
    road: Road, target_w: Array, *, start_speed_m_s: float, guess_m_s: Array | None = None
) -> Motion:
    """Ride ``road`` holding ``target_w`` (N,), rider power, wherever speed and grip allow.

    ``guess_m_s`` (N+1,) is a nearby ride's speed; it changes the effort, not the answer. Nodes
    where the rider cannot stay upright are kept at a walking pace and marked `Mode.FLOOR`.

    Raises
    ------
    OurFaultError
        If the speeds cannot be found.
    """
    motion, _ = simulate_motion_and_slopes(
        road, target_w, start_speed_m_s=start_speed_m_s, guess_m_s=guess_m_s
    )
    return motion


def simulate_motion_and_slopes(
    road: Road, target_w: Array, *, start_speed_m_s: float, guess_m_s: Array | None = None
) -> tuple[Motion, CellSlopes]:
    """As `simulate_motion`, with the motion linearised about the ride (for exact derivatives)."""
    start_energy = 0.5 * min(start_speed_m_s, float(road.limit_m_s[0])) ** 2
    if guess_m_s is None:
        energy = _march(road, target_w, start_energy)
    else:
        energy = 0.5 * guess_m_s**2
        energy[0] = start_energy
    for attempt in range(2):
        found = _newton(road, target_w, energy)
        if found is not None:
            energy, slopes, mode = found
            return _ride(road, target_w, energy, mode), slopes
        if attempt == 0:
            energy = _march(road, target_w, start_energy)
    raise OurFaultError("The speeds along the course could not be found.")


def _newton(
    road: Road, target_w: Array, energy: Array
) -> tuple[Array, CellSlopes, NDArray[np.int8]] | None:
    energy = energy.copy()
    last_mode, moved, calm = np.full(target_w.size, -1), np.zeros(target_w.size), False
    share = np.ones(target_w.size)
    for _ in range(MOST_ITERATIONS):
        residual, slopes, mode = _linearise(road, target_w, energy)
        step = solve_bidiagonal(slopes.to, slopes.start, residual)
        # a cell thrown to and fro across a kink is let go less far each time
        thrown = (step * moved < 0.0) & (np.abs(step) > 0.5 * np.abs(moved))
        share = np.where(thrown, 0.5 * share, np.minimum(1.0, 1.3 * share))
        moved = share * step
        # an energy may fall to a tenth at most, so that speeds stay positive
        energy[1:] = np.maximum(energy[1:] - moved, 0.1 * energy[1:])
        was_calm, calm = calm, float(np.max(np.abs(step) / (1.0 + energy[1:]))) < 1e-7
        if calm and (was_calm or np.array_equal(mode, last_mode)):
            return energy, slopes, mode
        last_mode = mode
    return None


def _march(road: Road, target_w: Array, start_energy: float) -> Array:
    """A first guess, cell after cell by the implicit Euler rule, drag area at no yaw."""
    area = np.array([drag_area.m2[0] for drag_area in road.drag_areas])[road.position]
    columns = zip(
        (road.cell_m / road.effective_mass_kg).tolist(),
        (road.efficiency * target_w).tolist(),
        road.steady_n.tolist(),
        (road.half_density_kg_m3 * area).tolist(),
        road.wind_along_m_s.tolist(),
        (road.wind_across_m_s**2).tolist(),
        road.limit_m_s[1:].tolist(),
        strict=True,
    )
    energy = [start_energy]
    speed = max(math.sqrt(2.0 * start_energy), FLOOR_M_S)
    for per_mass, power, steady, air, wind, across2, limit in columns:
        before = energy[-1]
        for _ in range(4):
            along = speed + wind
            flow = math.sqrt(along * along + across2) + 1e-9
            drive = min(power / speed, road.traction_n)
            force = drive - steady - road.bearing_n_per_m_s * speed - air * flow * along
            slope = drive / speed + road.bearing_n_per_m_s + air * (flow + along * along / flow)
            error = 0.5 * speed * speed - before - per_mass * force
            speed = max(speed - error / (speed + per_mass * slope), 0.5 * speed)
        speed = max(min(speed, limit), FLOOR_M_S)
        energy.append(0.5 * speed * speed)
    return np.array(energy)


def _ride(road: Road, target_w: Array, energy: Array, mode: NDArray[np.int8]) -> Motion:
    """Power, braking and time in each cell from the speeds found."""
    speed = np.sqrt(2.0 * energy)
    v0, v1 = speed[:-1], speed[1:]
    time = 2.0 * road.cell_m / (v0 + v1)
    needed_w = _needed_work_j(road, energy, speed) / (road.efficiency * time)
    held = (mode == Mode.SPIN_OUT) | (mode == Mode.LIMIT)
    power = np.where(held, np.clip(needed_w, 0.0, target_w), target_w)
    power = np.where(mode == Mode.COAST, 0.0, power)
    power = np.where(
        mode == Mode.TRACTION,
        np.minimum(target_w, road.traction_n * road.cell_m / (road.efficiency * time)),
        power,
    )
    spare_j = road.efficiency * (power - needed_w) * time
    braking = np.where(mode == Mode.LIMIT, np.maximum(spare_j, 0.0) / road.cell_m, 0.0)
    return Motion(speed_m_s=speed, time_s=time, power_w=power, braking_n=braking, mode=mode)


def _needed_work_j(road: Road, energy: Array, speed: Array) -> Array:
    """Work at the wheel that the found speeds ask of each cell."""
    r0, _ = road.resistance_n_and_slope(speed[:-1])
    r1, _ = road.resistance_n_and_slope(speed[1:])
    gain = road.effective_mass_kg * (energy[1:] - energy[:-1])
    return gain + 0.5 * road.cell_m * (r0 + r1)
