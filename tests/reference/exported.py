"""The numbers that a plan exports, as the peers take them: nothing else of a plan is read.

`read_exported` takes the trace's columns and the scalars of ``inputs["model"]``; `invented_road`
makes the same numbers without any plan, so that the peers can be tried by themselves.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

TRACTION_SHARE = 0.25  # model: about 0.25 m g at the wheel; common practice, no source
SLOWEST_M_S = 1.0


@dataclass(frozen=True)
class Exported:
    """A course cell by cell (N,), limits at nodes (N+1,), and the rider's scalars. SI."""

    cell_m: np.ndarray
    gradient: np.ndarray
    crr: np.ndarray
    density_kg_m3: np.ndarray
    wind_along_m_s: np.ndarray
    wind_across_m_s: np.ndarray
    cda_m2: np.ndarray
    power_share: np.ndarray
    critical_power_w: np.ndarray
    efficiency: np.ndarray
    limit_m_s: np.ndarray
    early: np.ndarray  # cells that begin in the first 30 s
    gravity_m_s2: float
    mass_kg: float
    effective_mass_kg: float
    bearing_n: float
    bearing_n_per_m_s: float
    start_speed_m_s: float
    w_prime_j: float
    reserve_j: float
    min_power_w: float
    max_power_w: float
    first_30_s_max_w: float
    recovery_law: Mapping[str, Any]

    @property
    def cells(self) -> int:
        return self.cell_m.size

    @property
    def traction_n(self) -> float:
        return TRACTION_SHARE * self.mass_kg * self.gravity_m_s2

    @property
    def steady_n(self) -> np.ndarray:
        """Gravity, tyres and constant bearing drag (N,)."""
        cosine = 1.0 / np.sqrt(1.0 + self.gradient**2)
        weight = self.mass_kg * self.gravity_m_s2
        return weight * cosine * (self.gradient + self.crr) + self.bearing_n

    def resistance_n(self, speed: np.ndarray, cells: Any = slice(None)) -> np.ndarray:
        """Force against the motion at ``speed`` in ``cells``."""
        along = speed + self.wind_along_m_s[cells]
        flow = np.sqrt(along**2 + self.wind_across_m_s[cells] ** 2)
        air = 0.5 * self.density_kg_m3[cells] * self.cda_m2[cells] * flow * along
        return self.steady_n[cells] + self.bearing_n_per_m_s * speed + air

    def highest_power_w(self) -> np.ndarray:
        """Upper bound of power in every cell (N,)."""
        high = np.full(self.cells, self.max_power_w)
        high[self.early] = np.minimum(high[self.early], self.first_30_s_max_w)
        return high

    def under(self, **changes: Any) -> Exported:
        """The same road with some numbers replaced."""
        return replace(self, **changes)


def law_of(model: Mapping[str, Any]) -> dict[str, Any]:
    """The recovery law as a dict with a ``name``, whatever form it was exported in."""
    law = model["recovery_law"]
    return {"name": law} if isinstance(law, str) else dict(law)


def read_exported(trace: Any, model: Mapping[str, Any]) -> Exported:
    """From a plan's trace (DataFrame) and ``inputs["model"]``."""

    def column(name: str) -> np.ndarray:
        return trace[name].to_numpy(dtype=float)

    time = column("time_s")
    limit = np.append(column("speed_limit_from_m_s")[:1], column("speed_limit_to_m_s"))
    scalars = {
        name: float(model[name])
        for name in (
            "gravity_m_s2",
            "mass_kg",
            "effective_mass_kg",
            "bearing_n",
            "bearing_n_per_m_s",
            "start_speed_m_s",
            "w_prime_j",
            "reserve_j",
            "min_power_w",
            "max_power_w",
            "first_30_s_max_w",
        )
    }
    return Exported(
        cell_m=column("to_m") - column("from_m"),
        gradient=column("gradient"),
        crr=column("crr"),
        density_kg_m3=column("air_density_kg_m3"),
        wind_along_m_s=column("wind_along_m_s"),
        wind_across_m_s=column("wind_across_m_s"),
        cda_m2=column("cda_m2"),
        power_share=column("power_share"),
        critical_power_w=column("critical_power_w"),
        efficiency=column("efficiency"),
        limit_m_s=limit,
        early=np.cumsum(time) - time < 30.0,
        recovery_law=law_of(model),
        **scalars,
    )


TWO_PHASE = {
    "name": "two-phase",
    "quick_share": 0.365,
    "quick_tau_s": 26.0,
    "slow_tau_scale": 17430.0,
    "slow_tau_exponent": 0.64,
    "by_content": 0.75,
}


def invented_road(
    cells: int = 4000, *, law: Mapping[str, Any] | str = "two-phase", limits: bool = True
) -> Exported:
    """A rolling road of 10 m cells with wind that turns once and slow places each 4 km."""
    at = np.arange(cells + 1) * 10.0
    rise = 0.03 * np.sin(2 * np.pi * at / 3000) + 0.02 * np.sin(2 * np.pi * at / 1100 + 1)
    heading = 2 * np.pi * at[:-1] / at[-1]
    limit = np.full(cells + 1, 70 / 3.6)
    if limits:
        for slow in range(300, cells, 400):
            limit[slow : slow + 3] = 6.0
        for node in range(cells - 1, -1, -1):
            limit[node] = min(limit[node], np.sqrt(limit[node + 1] ** 2 + 2 * 2.4 * 10.0))
    name = law if isinstance(law, str) else law["name"]
    constants = TWO_PHASE if name == "two-phase" else {"name": name}
    early = np.zeros(cells, dtype=bool)
    early[: min(22, cells)] = True
    return Exported(
        cell_m=np.full(cells, 10.0),
        gradient=0.5 * (rise[1:] + rise[:-1]),
        crr=np.full(cells, 0.004),
        density_kg_m3=np.full(cells, 1.2),
        wind_along_m_s=2 * np.cos(heading),
        wind_across_m_s=2 * np.sin(heading),
        cda_m2=np.full(cells, 0.23),
        power_share=np.ones(cells),
        critical_power_w=np.full(cells, 305.0),
        efficiency=np.full(cells, 0.976),
        limit_m_s=limit,
        early=early,
        gravity_m_s2=9.80665,
        mass_kg=90.0,
        effective_mass_kg=90.0 + 0.14 / 0.334**2,
        bearing_n=0.091,
        bearing_n_per_m_s=0.0087,
        start_speed_m_s=0.0,
        w_prime_j=19000.0,
        reserve_j=2500.0,
        min_power_w=0.0,
        max_power_w=411.0,
        first_30_s_max_w=1.3 * 305.0,
        recovery_law=constants if isinstance(law, str) else dict(law),
    )
