"""The pacing problem as one would write it on a first evening.

SLSQP with finite differences over piece powers; each trial rides the course with scipy's adaptive
`solve_ivp` in time, looking the road up as it goes. One-pool recovery as d(debt)/dt = −D·debt/W′
(Skiba 2015), or none. It is here as a yardstick of effort; `gradient_seconds` times one gradient,
from which a whole solve may be extrapolated (the caller says so).
"""

from __future__ import annotations

import time
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from exported import SLOWEST_M_S, Exported
from scipy.integrate import solve_ivp
from scipy.optimize import minimize


class Trial(NamedTuple):
    """Finish time and the least W′ left on the way."""

    time_s: float
    least_j: float


@dataclass(frozen=True)
class FirstEvening:
    """A road and its pieces (first cells ``starts``)."""

    road: Exported
    starts: np.ndarray

    def ride(self, power_w: np.ndarray) -> Trial:
        """Integrate the whole course in time at piece powers ``power_w``."""
        road = self.road
        node = np.concatenate([[0.0], np.cumsum(road.cell_m)])
        edge = node[self.starts]
        steady, half = road.steady_n, 0.5 * road.density_kg_m3 * road.cda_m2
        limit2 = road.limit_m_s**2
        recovers = road.recovery_law["name"] == "skiba-2015"

        def slopes(_: float, state: np.ndarray) -> list[float]:
            at, v, left = state
            v = max(v, 0.5)
            i = min(max(int(np.searchsorted(node, at, side="right")) - 1, 0), road.cells - 1)
            watts = float(power_w[np.searchsorted(edge, at, side="right") - 1])
            along = v + road.wind_along_m_s[i]
            air = half[i] * np.hypot(along, road.wind_across_m_s[i]) * along
            drive = min(road.efficiency[i] * watts / v, road.traction_n)
            resist = steady[i] + road.bearing_n_per_m_s * v + air
            gain = (drive - resist) / road.effective_mass_kg
            share = min(max((at - node[i]) / road.cell_m[i], 0.0), 1.0)
            if v * v >= limit2[i] + share * (limit2[i + 1] - limit2[i]):
                held = (limit2[i + 1] - limit2[i]) / (2.0 * road.cell_m[i])
                if gain > held:
                    needed = (road.effective_mass_kg * held + resist) * v / road.efficiency[i]
                    watts, gain = min(max(needed, 0.0), watts), held
            over = watts / road.power_share[i] - road.critical_power_w[i]
            debt = road.w_prime_j - left
            return [v, gain, -over if over > 0 or not recovers else -over * debt / road.w_prime_j]

        def finish(_: float, state: np.ndarray) -> float:
            return float(state[0] - node[-1])

        finish.terminal = True  # type: ignore[attr-defined]
        begin = [0.0, max(min(road.start_speed_m_s, road.limit_m_s[0]), 0.0), road.w_prime_j]
        longest = node[-1] / SLOWEST_M_S
        found = solve_ivp(
            slopes, (0.0, longest), begin, events=finish, rtol=1e-6, atol=1e-6, max_step=5.0
        )
        return Trial(float(found.t[-1]), float(np.min(found.y[2])))

    def gradient_seconds(self, power_w: np.ndarray, *, columns: int | None = None) -> float:
        """Seconds that one finite-difference gradient takes; from ``columns`` of it, if given."""
        count = power_w.size if columns is None else columns
        began = time.perf_counter()
        self.ride(power_w)
        for k in range(count):
            moved = power_w.copy()
            moved[k] += 0.1
            self.ride(moved)
        spent = time.perf_counter() - began
        return spent * (power_w.size + 1) / (count + 1)

    def solve(self, power_w: np.ndarray, *, most_iterations: int = 50) -> tuple[np.ndarray, Trial]:
        """SLSQP with finite differences, from ``power_w``; minutes even on a short course."""
        high = np.minimum.reduceat(self.road.highest_power_w(), self.starts)
        memory: dict[bytes, Trial] = {}

        def trial(x: np.ndarray) -> Trial:
            key = x.tobytes()
            if key not in memory:
                memory[key] = self.ride(100.0 * x)
            return memory[key]

        found = minimize(
            lambda x: trial(x).time_s,
            power_w / 100.0,
            method="SLSQP",
            bounds=[(self.road.min_power_w / 100.0, top / 100.0) for top in high],
            constraints={
                "type": "ineq",
                "fun": lambda x: (trial(x).least_j - self.road.reserve_j) / 1000.0,
            },
            options={"maxiter": most_iterations, "ftol": 1e-3, "eps": 1e-3},
        )
        best = 100.0 * np.asarray(found.x)
        return best, self.ride(best)
