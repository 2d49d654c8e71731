"""Exact derivatives of a ride in the target powers of its pieces.

The speed at the end of a piece depends only on the speed at its start and on its own power. So
two bidiagonal solves for the whole course give, in every cell, the slopes in the piece's own
power and in the energy at its entry, and a chain over the pieces gives everything else.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.motion.road import Road
from pacing.motion.simulate import CellSlopes, Mode, Motion, solve_bidiagonal

Array = NDArray[np.float64]


class PieceSlopes(NamedTuple):
    """Slopes in a piece's own power (``own``, per W) and entry energy (``entry``, per m²/s²).

    Per cell (N,): of the time in the cell and of the delivered power. ``entry_energy`` (n, n):
    row k holds d(energy at the entry of piece k)/d(power of piece i).
    """

    time_own: Array
    time_entry: Array
    power_own: Array
    power_entry: Array
    entry_energy: Array


class CellEndSlopes(NamedTuple):
    """Slopes of a cell's time and delivered power in the energies at its two ends (N,)."""

    time_from: Array
    time_to: Array
    power_from: Array
    power_to: Array
    power_target: Array


def cell_end_slopes(road: Road, motion: Motion, target_w: Array) -> CellEndSlopes:
    """How time and delivered power in each cell follow the speeds at its ends and its target."""
    v0, v1 = motion.speed_m_s[:-1], motion.speed_m_s[1:]
    v0_safe = np.maximum(v0, 1e-3)
    time, mode = motion.time_s, motion.mode
    time_from = -time / ((v0 + v1) * v0_safe)
    time_to = -time / ((v0 + v1) * v1)

    power_from, power_to = np.zeros_like(time), np.zeros_like(time)
    power_target = np.where(mode == Mode.POWER, 1.0, 0.0)
    power_target[mode == Mode.FLOOR] = 1.0
    slipping = mode == Mode.TRACTION
    power_from[slipping] = -(motion.power_w * time_from / time)[slipping]
    power_to[slipping] = -(motion.power_w * time_to / time)[slipping]

    held = (mode == Mode.SPIN_OUT) | (mode == Mode.LIMIT)
    if np.any(held):
        full = held & (motion.power_w >= target_w)
        partly = held & (motion.power_w > 0.0) & ~full
        power_target[full] = 1.0
        _, r0_slope = road.resistance_n_and_slope(v0)
        _, r1_slope = road.resistance_n_and_slope(v1)
        mass, cell = road.effective_mass_kg, road.cell_m
        needed_from = -mass + 0.5 * cell * r0_slope / v0_safe
        needed_to = mass + 0.5 * cell * r1_slope / v1
        scale = 1.0 / (road.efficiency * time)
        by_from = needed_from * scale - motion.power_w * time_from / time
        by_to = needed_to * scale - motion.power_w * time_to / time
        power_from[partly] = by_from[partly]
        power_to[partly] = by_to[partly]
    return CellEndSlopes(time_from, time_to, power_from, power_to, power_target)


def piece_slopes(
    road: Road, motion: Motion, slopes: CellSlopes, *, starts: NDArray[np.intp], target_w: Array
) -> PieceSlopes:
    """Slopes by piece; ``starts`` (n,) is the first cell of each, ``target_w`` (N,) per cell."""
    below = slopes.start.copy()
    below[starts] = 0.0
    right = np.zeros((slopes.to.size, 2))
    right[:, 0] = slopes.power
    right[starts, 1] = -slopes.start[starts]
    to = solve_bidiagonal(slopes.to, below, right)
    own_to, entry_to = to[:, 0], to[:, 1]
    own_from = np.concatenate([[0.0], own_to[:-1]])
    own_from[starts] = 0.0
    entry_from = np.concatenate([[1.0], entry_to[:-1]])
    entry_from[starts] = 1.0

    ends = cell_end_slopes(road, motion, target_w)
    last = np.append(starts[1:], slopes.to.size) - 1
    return PieceSlopes(
        time_own=ends.time_from * own_from + ends.time_to * own_to,
        time_entry=ends.time_from * entry_from + ends.time_to * entry_to,
        power_own=ends.power_target + ends.power_from * own_from + ends.power_to * own_to,
        power_entry=ends.power_from * entry_from + ends.power_to * entry_to,
        entry_energy=_chain(own_to[last], entry_to[last]),
    )


def _chain(own_end: Array, entry_end: Array) -> Array:
    """d(entry energy of piece k)/d(power of piece i) from each piece's own two slopes."""
    count = own_end.size
    matrix = np.zeros((count, count))
    for k in range(1, count):
        matrix[k] = entry_end[k - 1] * matrix[k - 1]
        matrix[k, k - 1] = own_end[k - 1]
    return matrix


def time_adjoint(
    ends: CellEndSlopes, slopes: CellSlopes, *, per_energy: Array | None = None
) -> Array:
    """Multipliers (N,) of the motion equations for the total time.

    The slope of the time in anything that shifts the right-hand side of cell i's equation
    (scaled by the mass) by b is ``multiplier[i] * b``. ``per_energy`` (N,) replaces the slope
    of the objective in the energy at each cell's end.
    """
    objective = ends.time_to.copy()
    objective[:-1] += ends.time_from[1:]
    if per_energy is not None:
        objective = per_energy
    # transpose of the lower bidiagonal system: solve it backwards
    diagonal = slopes.to[::-1]
    below = np.concatenate([[0.0], slopes.start[1:][::-1]])
    return solve_bidiagonal(diagonal, below, objective[::-1])[::-1]
