"""W′ along a ride: its balance at every node, and its lowest point in each piece with slopes."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.motion.simulate import Mode, Motion
from pacing.motion.slopes import PieceSlopes
from pacing.rider.budget import Advance, RecoveryLaw
from pacing.rider.recovery import Pools

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
    """W′ at its lowest in each piece (n,), and at each piece's end (n,)."""

    lowest_j: Array
    end_j: Array


class LowestSlopes(NamedTuple):
    """Slopes of `Lowest` in all piece powers (n, n)."""

    lowest: Array
    end: Array


def starting_pools(law: RecoveryLaw, w_prime_j: float, start_j: float | None) -> Pools:
    """Pools of a rider who starts with ``start_j`` of W′ left (None: rested)."""
    pools = law.full(w_prime_j)
    if start_j is None:
        return pools
    return tuple(pool * start_j / w_prime_j for pool in pools)


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
    pools = starting_pools(law, w_prime_j, start_j)
    left = np.empty(time_s.size + 1)
    left[0] = sum(pools)
    for cell, (excess, time) in enumerate(zip(excess_w.tolist(), time_s.tolist(), strict=True)):
        pools = law.advance(pools, excess, time, w_prime_j=w_prime_j)
        left[cell + 1] = sum(pools)
    return left


def runs_of(motion: Motion, *, starts: NDArray[np.intp], excess_w: Array) -> Runs:
    """Merge cells of one piece that are ridden at the same excess power."""
    mode = motion.mode
    idle = (motion.power_w == 0.0) & ((mode == Mode.COAST) | (mode == Mode.LIMIT))
    driven = mode == Mode.POWER
    new = np.ones(mode.size, dtype=bool)
    new[1:] = ~(
        ((driven[1:] & driven[:-1]) | (idle[1:] & idle[:-1])) & (excess_w[1:] == excess_w[:-1])
    )
    new[starts] = True
    first = np.flatnonzero(new)
    return Runs(
        first=first,
        piece=np.searchsorted(starts, first, side="right") - 1,
        excess_w=excess_w[first],
        duration_s=np.add.reduceat(motion.time_s, first),
    )


class RunSlopes(NamedTuple):
    """Slopes of each run's excess power and duration (R, 2) in its piece's own power and entry
    energy."""

    excess: Array
    duration: Array


def run_slopes(runs: Runs, slopes: PieceSlopes, *, power_share: Array) -> RunSlopes:
    """Gather the slopes by cell into slopes by run."""
    share = power_share[runs.first]
    excess = [slopes.power_own[runs.first] / share, slopes.power_entry[runs.first] / share]
    duration = [
        np.add.reduceat(slopes.time_own, runs.first),
        np.add.reduceat(slopes.time_entry, runs.first),
    ]
    return RunSlopes(np.stack(excess, axis=1), np.stack(duration, axis=1))


def lowest_in_pieces(
    law: RecoveryLaw,
    runs: Runs,
    *,
    pieces: int,
    w_prime_j: float,
    start_j: float | None = None,
) -> Lowest:
    """Lowest and last W′ of every piece."""
    pools = starting_pools(law, w_prime_j, start_j)
    left = []
    for excess, duration in zip(runs.excess_w.tolist(), runs.duration_s.tolist(), strict=True):
        pools = law.advance(pools, excess, duration, w_prime_j=w_prime_j)
        left.append(sum(pools))
    first = np.searchsorted(runs.piece, np.arange(pieces))
    after = np.array(left)
    return Lowest(np.minimum.reduceat(after, first), after[np.append(first[1:], after.size) - 1])


def lowest_slopes(
    law: RecoveryLaw,
    runs: Runs,
    slopes: PieceSlopes,
    *,
    power_share: Array,
    w_prime_j: float,
    start_j: float | None = None,
) -> LowestSlopes:
    """Exact slopes of the lowest and last W′ of every piece in all piece powers."""
    count = slopes.entry_energy.shape[0]
    change = run_slopes(runs, slopes, power_share=power_share)
    by_time, by_power = change.duration.tolist(), change.excess.tolist()
    excess, duration = runs.excess_w.tolist(), runs.duration_s.tolist()
    first_run = np.searchsorted(runs.piece, np.arange(count)).tolist()
    first_run.append(runs.first.size)

    pools = starting_pools(law, w_prime_j, start_j)
    size = len(pools)
    entry_jacobian = np.zeros((size, count))
    by_lowest, by_end = np.empty((count, count)), np.empty((count, count))
    for k in range(count):
        low, low_local, local = 0.0, None, None
        for r in range(first_run[k], first_run[k + 1]):
            step = law.advance_and_slopes(pools, excess[r], duration[r], w_prime_j=w_prime_j)
            pools = step.pools
            local = _through(step, local, by_power[r], by_time[r])
            left = sum(pools)
            if low_local is None or left < low:
                low, low_local = left, local
        assert local is not None and low_local is not None
        entry = slopes.entry_energy[k]
        jacobian = _spread(local, entry, entry_jacobian, k)
        by_end[k] = by_lowest[k] = jacobian.sum(axis=0)
        if low_local is not local:
            by_lowest[k] = _spread(low_local, entry, entry_jacobian, k).sum(axis=0)
        entry_jacobian = jacobian
    return LowestSlopes(by_lowest, by_end)


Local = list[list[float]]
"""Slopes of each pool in (own power, entry energy, pools at the piece's entry)."""


def _through(step: Advance, local: Local | None, power: list[float], time: list[float]) -> Local:
    """Chain one run onto the slopes of the runs before it in the piece."""
    own, entry = power[0], power[1]
    by_own, by_entry = time[0], time[1]
    rows = []
    for d_pools, excess, duration in zip(step.d_pools, step.d_excess, step.d_duration, strict=True):
        row = [excess * own + duration * by_own, excess * entry + duration * by_entry]
        if local is None:
            row += d_pools
        else:
            for j, slope in enumerate(d_pools):
                row[0] += slope * local[j][0]
                row[1] += slope * local[j][1]
            row += [
                sum(slope * local[j][c] for j, slope in enumerate(d_pools))
                for c in range(2, 2 + len(d_pools))
            ]
        rows.append(row)
    return rows


def _spread(local: Local, entry_energy: Array, entry_jacobian: Array, piece: int) -> Array:
    """Turn slopes in (own power, entry energy, entry pools) into slopes in all powers (k, n)."""
    rows = np.empty_like(entry_jacobian)
    for i, (own, entry, *pools) in enumerate(local):
        row = entry * entry_energy
        for j, slope in enumerate(pools):
            row += slope * entry_jacobian[j]
        row[piece] += own
        rows[i] = row
    return rows


class Prices(NamedTuple):
    """What the optimum pays: seconds a joule is worth, seen from each cell (N,).

    ``per_w`` is the slope of Σ multiplier · lowest W′ in the delivered power of the cell,
    ``per_s`` in the time spent in it.
    """

    per_w: Array
    per_s: Array


def prices(
    law: RecoveryLaw,
    motion: Motion,
    *,
    runs: Runs,
    pieces: int,
    power_share: Array,
    w_prime_j: float,
    multipliers: Array,
    at_lowest: bool = True,
    start_j: float | None = None,
) -> Prices:
    """Slopes of Σ multiplier · W′ in every cell's power and time, by one backward pass.

    ``multipliers`` (n,) weigh each piece's lowest W′, or (1,) the last with ``at_lowest`` False.
    """
    pools = starting_pools(law, w_prime_j, start_j)
    steps = []
    for excess, duration in zip(runs.excess_w.tolist(), runs.duration_s.tolist(), strict=True):
        steps.append(law.advance_and_slopes(pools, excess, duration, w_prime_j=w_prime_j))
        pools = steps[-1].pools
    left = np.array([sum(step.pools) for step in steps])
    weight = np.zeros(left.size)
    if at_lowest:
        first_run = np.searchsorted(runs.piece, np.arange(pieces))
        for k, (a, b) in enumerate(
            zip(first_run, np.append(first_run[1:], left.size), strict=True)
        ):
            weight[a + int(np.argmin(left[a:b]))] += multipliers[k]
    else:
        weight[-1] = multipliers[-1]

    size = len(pools)
    value = [0.0] * size
    by_excess, by_time = np.empty(left.size), np.empty(left.size)
    for r in range(left.size - 1, -1, -1):
        value = [v + float(weight[r]) for v in value]
        step = steps[r]
        by_excess[r] = sum(value[i] * step.d_excess[i] for i in range(size))
        by_time[r] = sum(value[i] * step.d_duration[i] for i in range(size))
        value = [sum(value[i] * step.d_pools[i][j] for i in range(size)) for j in range(size)]
    run_of_cell = np.searchsorted(runs.first, np.arange(motion.time_s.size), side="right") - 1
    share_of_run = motion.time_s / runs.duration_s[run_of_cell]
    return Prices(
        per_w=by_excess[run_of_cell] * share_of_run / power_share,
        per_s=by_time[run_of_cell],
    )
