"""How slowly W′ comes back: published time constants against the power below critical power.

The argument is D = CP − P in W, above 0. Each works on a float, as the planner needs it, and on
an array.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Protocol, overload

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


class TimeConstant(Protocol):
    """A time constant in s that depends on D in W."""

    @overload
    def tau_s(self, deficit_w: float) -> float: ...
    @overload
    def tau_s(self, deficit_w: Array) -> Array: ...
    def tau_s(self, deficit_w: float | Array) -> float | Array:
        """τ at D."""

    def slope_s_per_w(self, deficit_w: float) -> float:
        """dτ/dD at D."""


@dataclass(frozen=True)
class PowerOfDeficit:
    """τ = ``scale`` · D^−``exponent`` + ``offset_s``."""

    scale: float
    exponent: float
    offset_s: float = 0.0

    @overload
    def tau_s(self, deficit_w: float) -> float: ...
    @overload
    def tau_s(self, deficit_w: Array) -> Array: ...
    def tau_s(self, deficit_w: float | Array) -> float | Array:
        """τ at D."""
        tau: float | Array = self.scale * deficit_w**-self.exponent + self.offset_s
        return tau

    def slope_s_per_w(self, deficit_w: float) -> float:
        """dτ/dD at D."""
        slope: float = -self.exponent * self.scale * deficit_w ** (-self.exponent - 1.0)
        return slope


@dataclass(frozen=True)
class ExponentialOfDeficit:
    """τ = ``height_s`` · exp(−``per_w`` · D) + ``floor_s``."""

    height_s: float
    per_w: float
    floor_s: float

    @overload
    def tau_s(self, deficit_w: float) -> float: ...
    @overload
    def tau_s(self, deficit_w: Array) -> Array: ...
    def tau_s(self, deficit_w: float | Array) -> float | Array:
        """τ at D."""
        if isinstance(deficit_w, np.ndarray):
            return self.height_s * np.exp(-self.per_w * deficit_w) + self.floor_s
        return self.height_s * math.exp(-self.per_w * deficit_w) + self.floor_s

    def slope_s_per_w(self, deficit_w: float) -> float:
        """dτ/dD at D."""
        return -self.per_w * self.height_s * math.exp(-self.per_w * deficit_w)


SKIBA_2012 = ExponentialOfDeficit(height_s=546.0, per_w=0.01, floor_s=316.0)
"""Source: skiba-2012 (there D is CP less the mean of all recovery power)."""

BARTRAM_2018 = PowerOfDeficit(scale=2287.2, exponent=0.688)
"""Source: bartram-2018 (elite riders)."""

WEIGEND_2022 = PowerOfDeficit(scale=2112.44, exponent=0.3892, offset_s=-14.506)
"""Source: weigend-2022 (fitted to the group means of caen-2019)."""


def skiba_2015(w_prime_j: float) -> PowerOfDeficit:
    """τ = W′/D. Source: skiba-2015."""
    return PowerOfDeficit(scale=max(w_prime_j, 1e-9), exponent=1.0)
