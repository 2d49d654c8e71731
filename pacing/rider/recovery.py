"""What every recovery law of W′ answers: how the pools stand after a run at one power.

W′ left is held in one or more pools whose contents (J) add up to it. A run at ``excess_w``
= P/share − CP above 0 spends exactly that. Below 0 it recovers with D = −excess; for planning
the total never comes back faster than D, for a rider who could regain more than they hold back
could ride above critical power for ever.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Pools = tuple[float, ...]

LEAST_DEFICIT_W = 1e-9
"""Nearer to critical power than this nothing is recovered."""


class Advance(NamedTuple):
    """Pools (J) after a run and their exact derivatives.

    ``d_pools[i][j]`` is d new pool i / d old pool j, ``d_excess[i]`` in J/W, ``d_duration[i]``
    in J/s. At exactly critical power the derivative is the spending side's.
    """

    pools: Pools
    d_pools: tuple[Pools, ...]
    d_excess: Pools
    d_duration: Pools


class RecoveryLaw(ABC):
    """One law of spending and recovering W′."""

    name: str

    @property
    @abstractmethod
    def pool_shares(self) -> Pools:
        """Size of each pool over W′."""

    @property
    def constants(self) -> dict[str, float]:
        """The numbers that make the law reproducible, for `plan.json`."""
        return {}

    def full(self, w_prime_j: float) -> Pools:
        """Pools (J) of a rested rider."""
        return tuple(share * w_prime_j for share in self.pool_shares)

    @abstractmethod
    def advance(
        self,
        pools: Pools,
        excess_w: float,
        duration_s: float,
        *,
        w_prime_j: float,
        capped: bool = True,
    ) -> Pools:
        """Pools (J) after ``duration_s`` at ``excess_w`` above (or, negative, below) CP.

        ``capped`` False lets W′ return as fast as the law was published to.
        """

    @abstractmethod
    def advance_and_slopes(
        self,
        pools: Pools,
        excess_w: float,
        duration_s: float,
        *,
        w_prime_j: float,
        capped: bool = True,
    ) -> Advance:
        """`advance` with its exact derivatives."""

    @abstractmethod
    def advance_many(
        self,
        pools: Array,
        excess_w: Array,
        duration_s: Array,
        *,
        w_prime_j: float | Array,
        capped: bool = True,
    ) -> Array:
        """`advance` for n riders at once: ``pools`` (k, n), the others (n,) or single."""

    def return_rates_per_s(self, deficit_w: Array, *, w_prime_j: float) -> Array:
        """1/τ of each pool (k, n) at ``deficit_w`` (n,) above 0; what is owed decays at it."""
        return np.zeros((len(self.pool_shares), deficit_w.size))
