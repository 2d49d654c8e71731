"""The optimum's question: which powers, piece by piece, make the time shortest."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from pacing.motion.road import Road
from pacing.motion.simulate import CellSlopes, Motion, simulate_motion_and_slopes
from pacing.motion.slopes import PieceSlopes, piece_slopes
from pacing.plan.balance import (
    Lowest,
    LowestSlopes,
    Runs,
    balance_at_nodes,
    excess_w,
    lowest_in_pieces,
    lowest_slopes,
    runs_of,
)
from pacing.rider.budget import RecoveryLaw

if TYPE_CHECKING:
    from pacing.plan.position_road import Sitting

Array = NDArray[np.float64]
Cuts = NDArray[np.intp]


@dataclass(frozen=True)
class Problem:
    """One road, one rider, one budget. Powers are the rider's true watts.

    Per cell (N,): ``critical_power_w`` as planned there and ``power_share`` of the position.
    ``peak_power_w`` is None unless the limit falls with W′ (three-parameter form).
    ``reserve_everywhere`` False checks the reserve at the finish alone. ``sitting`` is None for
    a rider with one position.
    """

    road: Road
    law: RecoveryLaw
    start_speed_m_s: float
    critical_power_w: Array
    power_share: Array
    w_prime_j: float
    reserve_j: float
    min_power_w: float
    max_power_w: float
    first_30_s_max_w: float
    peak_power_w: float | None = None
    w_start_j: float | None = None
    reserve_everywhere: bool = True
    sitting: Sitting | None = None

    @property
    def at_critical_w(self) -> Array:
        """The power that is critical power in the position of each cell (N,)."""
        return self.critical_power_w * self.power_share

    @property
    def cells(self) -> int:
        """Number of grid cells."""
        return self.road.cell_m.size


@dataclass(frozen=True)
class Ride:
    """A candidate: piece powers ridden by the simulator, slopes worked out when asked for."""

    problem: Problem
    starts: Cuts
    power_w: Array
    target_w: Array
    motion: Motion
    cell_slopes: CellSlopes

    @cached_property
    def slopes(self) -> PieceSlopes:
        """Slopes of the motion by piece."""
        return piece_slopes(
            self.problem.road,
            self.motion,
            self.cell_slopes,
            starts=self.starts,
            target_w=self.target_w,
        )

    @cached_property
    def time_slopes(self) -> Array:
        """d(total time)/d(power of each piece) (n,)."""
        own = np.add.reduceat(self.slopes.time_own, self.starts)
        entry = np.add.reduceat(self.slopes.time_entry, self.starts)
        return own + entry @ self.slopes.entry_energy

    @cached_property
    def piece_time_s(self) -> Array:
        """Time in each piece (n,)."""
        return np.add.reduceat(self.motion.time_s, self.starts)

    @cached_property
    def excess_w(self) -> Array:
        """Power above critical power in each cell (N,)."""
        return excess_w(
            self.motion,
            power_share=self.problem.power_share,
            critical_power_w=self.problem.critical_power_w,
        )

    @cached_property
    def runs(self) -> Runs:
        """Stretches of constant excess power."""
        return runs_of(self.motion, starts=self.starts, excess_w=self.excess_w)

    @cached_property
    def lowest(self) -> Lowest:
        """Lowest and last W′ in each piece."""
        return lowest_in_pieces(
            self.problem.law,
            self.runs,
            pieces=self.starts.size,
            w_prime_j=self.problem.w_prime_j,
            start_j=self.problem.w_start_j,
        )

    @cached_property
    def lowest_slopes(self) -> LowestSlopes:
        """Slopes of `lowest` in the piece powers."""
        return lowest_slopes(
            self.problem.law,
            self.runs,
            self.slopes,
            power_share=self.problem.power_share,
            w_prime_j=self.problem.w_prime_j,
            start_j=self.problem.w_start_j,
        )

    @cached_property
    def balance_j(self) -> Array:
        """W′ left at every node (N+1,)."""
        return balance_at_nodes(
            self.problem.law,
            excess_w=self.excess_w,
            time_s=self.motion.time_s,
            w_prime_j=self.problem.w_prime_j,
            start_j=self.problem.w_start_j,
        )


def targets(starts: Cuts, power_w: Array, cells: int) -> Array:
    """Piece powers (n,) spread over the cells (N,)."""
    return np.repeat(power_w, np.diff(np.append(starts, cells)))


def ride(problem: Problem, starts: Cuts, power_w: Array, *, guess_m_s: Array | None = None) -> Ride:
    """Ride piece powers ``power_w`` (n,) with pieces beginning at cells ``starts`` (n,)."""
    target = targets(starts, power_w, problem.cells)
    motion, slopes = simulate_motion_and_slopes(
        problem.road, target, start_speed_m_s=problem.start_speed_m_s, guess_m_s=guess_m_s
    )
    return Ride(problem, starts, power_w, target, motion, slopes)
