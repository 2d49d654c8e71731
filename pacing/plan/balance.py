"""W′ along a ride: its balance at every node, and its lowest point in each piece with slopes."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.motion.simulate import Mode, Motion
from pacing.motion.slopes import PieceSlopes
from pacing.rider.budget import RecoveryLaw

Array = NDArray[np.float64]


class Runs(NamedTuple):
    """Stretches of constant excess power, in order: what the W′ law is stepped over.

    ``first`` (R,) is each run's first cell, ``piece`` (R,) the piece it lies in.
    """

    first: NDArray[np.intp]
    piece: NDArray[np.intp]
    excess_w: Array
    duration_s: Array


class Lowest(NamedTuple):
    """W′ at its lowest in each piece (n,), at each piece's end (n,), and their slopes (n, n)."""

    lowest_j: Array
    end_j: Array
    lowest_slopes: Array
    end_slopes: Array


def excess_w(motion: Motion, *, power_share: Array, critical_power_w: Array) -> Array:
    """Power above critical power in each cell (N,), by the position's power share."""
    return motion.power_w / power_share - critical_power_w


def balance_at_nodes(
    law: RecoveryLaw,
    *,
    excess_w: Array,
    time_s: Array,
    w_prime_j: float,
    start_j: float | None = None,
) -> Array:
    """W′ left at every node (N+1,), from ``start_j`` (default: full)."""
    pools = law.full(w_prime_j)
    if start_j is not None:
        pools = tuple(pool * start_j / w_prime_j for pool in pools)
    left = np.empty(time_s.size + 1)
    left[0] = sum(pools)
    for cell, (excess, time) in enumerate(zip(excess_w.tolist(), time_s.tolist(), strict=True)):
        pools = law.advance(pools, excess, time, w_prime_j=w_prime_j)
        left[cell + 1] = sum(pools)
    return left


def runs_of(motion: Motion, *, starts: NDArray[np.intp], excess_w: Array) -> Runs:
    """Merge cells of one piece that are ridden at the same excess power."""
    cells = motion.time_s.size
    new = np.ones(cells, dtype=bool)
    steady = (motion.mode == Mode.POWER) | (motion.mode == Mode.COAST)
    new[1:] = ~(
        steady[1:]
        & steady[:-1]
        & (motion.mode[1:] == motion.mode[:-1])
        & (excess_w[1:] == excess_w[:-1])
    )
    new[starts] = True
    first = np.flatnonzero(new)
    return Runs(
        first=first,
        piece=np.searchsorted(starts, first, side="right") - 1,
        excess_w=excess_w[first],
        duration_s=np.add.reduceat(motion.time_s, first),
    )


def lowest_in_pieces(
    law: RecoveryLaw,
    motion: Motion,
    slopes: PieceSlopes,
    *,
    starts: NDArray[np.intp],
    excess_w: Array,
    power_share: Array,
    w_prime_j: float,
    start_j: float | None = None,
) -> Lowest:
    """Lowest and last W′ of every piece, with exact slopes in all piece powers."""
    count = starts.size
    runs = runs_of(motion, starts=starts, excess_w=excess_w)
    # slopes of each run in its piece's own power and entry energy
    by_time = np.stack(
        [
            np.add.reduceat(slopes.time_own, runs.first),
            np.add.reduceat(slopes.time_entry, runs.first),
        ],
        axis=1,
    ).tolist()
    by_power = np.stack(
        [
            slopes.power_own[runs.first] / power_share[runs.first],
            slopes.power_entry[runs.first] / power_share[runs.first],
        ],
        axis=1,
    ).tolist()
    excess, duration = runs.excess_w.tolist(), runs.duration_s.tolist()
    first_run = np.searchsorted(runs.piece, np.arange(count)).tolist()
    first_run.append(runs.first.size)

    pools = law.full(w_prime_j)
    if start_j is not None:
        pools = tuple(pool * start_j / w_prime_j for pool in pools)
    size = len(pools)
    entry_jacobian = np.zeros((size, count))
    lowest, ends = np.empty(count), np.empty(count)
    lowest_slopes, end_slopes = np.empty((count, count)), np.empty((count, count))
    for k in range(count):
        # local slopes of the pools in (own power, entry energy, pools at entry)
        local = [[0.0, 0.0, *(1.0 if i == j else 0.0 for j in range(size))] for i in range(size)]
        low, low_local = sum(pools) + 1.0, None
        for r in range(first_run[k], first_run[k + 1]):
            step = law.advance_and_slopes(pools, excess[r], duration[r], w_prime_j=w_prime_j)
            pools = step.pools
            width = size + 2
            local = [
                [
                    sum(step.d_pools[i][j] * local[j][c] for j in range(size))
                    + (
                        step.d_excess[i] * by_power[r][c] + step.d_duration[i] * by_time[r][c]
                        if c < 2
                        else 0.0
                    )
                    for c in range(width)
                ]
                for i in range(size)
            ]
            left = sum(pools)
            if low_local is None or left < low:
                low = left
                low_local = [sum(row[c] for row in local) for c in range(width)]
        jacobian = _spread(np.array(local), slopes.entry_energy[k], entry_jacobian, k)
        lowest[k], ends[k] = low, sum(pools)
        lowest_slopes[k] = _spread(
            np.array([low_local]), slopes.entry_energy[k], entry_jacobian, k
        )[0]
        end_slopes[k] = jacobian.sum(axis=0)
        entry_jacobian = jacobian
    return Lowest(lowest, ends, lowest_slopes, end_slopes)


def _spread(local: Array, entry_energy: Array, entry_jacobian: Array, piece: int) -> Array:
    """Turn slopes in (own power, entry energy, entry pools) into slopes in all powers."""
    rows = np.outer(local[:, 1], entry_energy) + local[:, 2:] @ entry_jacobian
    rows[:, piece] += local[:, 0]
    return rows
