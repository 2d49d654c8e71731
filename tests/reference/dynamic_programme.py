"""The pacing problem by Bellman's principle, with no gradients: a grid of speed and W′ left.

The course is cut into stages of a few cells ridden at one power. Backwards from the finish, the
least time to go is tabulated over (speed, W′ left), trying every power of a list; between grid
points it is interpolated linearly. Forwards, the ride that the table recommends is ridden for
real: its time is that of a ride that keeps the reserve, so never below the optimum, and it comes
down to it as the grid is refined. One-pool laws only: none, and Skiba 2015.

Source: Bellman 1957, Dynamic Programming (common knowledge; from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from exported import SLOWEST_M_S, Exported


@dataclass(frozen=True)
class Table:
    """Least time to go from each stage: values (S+1, speeds, balances)."""

    speeds_m_s: np.ndarray
    balances_j: np.ndarray
    to_go_s: np.ndarray


@dataclass(frozen=True)
class DynamicProgramme:
    """``road`` in stages of ``per_stage`` cells; the others are the sizes of the grids."""

    road: Exported
    per_stage: int
    speeds: int
    balances: int
    powers: int

    @property
    def stages(self) -> int:
        return self.road.cells // self.per_stage

    def power_list_w(self, stage: int, count: int) -> np.ndarray:
        """Powers tried: evenly from least to most, and critical power itself."""
        road, cell = self.road, stage * self.per_stage
        most = float(road.highest_power_w()[cell])
        held = float(road.critical_power_w[cell] * road.power_share[cell])
        return np.append(np.linspace(road.min_power_w, most, count), min(held, most))

    def through(
        self, stage: int, speed: np.ndarray, left: np.ndarray, power: np.ndarray
    ) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Speed, W′ left and time after a stage; all broadcast. Stalled: infinite time."""
        road = self.road
        v, w, time = speed, left, np.zeros_like(speed)
        for cell in range(stage * self.per_stage, (stage + 1) * self.per_stage):
            after = self._next_speed(cell, v, power)
            dt = 2.0 * road.cell_m[cell] / (v + after)
            over = power / road.power_share[cell] - road.critical_power_w[cell]
            decay = 1.0
            if road.recovery_law["name"] == "skiba-2015":
                decay = np.exp(np.minimum(over, 0.0) * dt / road.w_prime_j)
            debt = road.w_prime_j - w
            w = np.where(over > 0.0, w - over * dt, road.w_prime_j - debt * decay)
            time = time + np.where(after <= SLOWEST_M_S, np.inf, dt)
            v = after
        return v, w, time

    def _next_speed(self, cell: int, v: np.ndarray, power: np.ndarray) -> np.ndarray:
        """The motion's equation over a cell, solved by halving: nothing is differentiated."""
        road, h = self.road, self.road.cell_m[cell]
        at = slice(cell, cell + 1)
        before = road.resistance_n(v, at)
        low = np.full(np.broadcast(v, power).shape, SLOWEST_M_S)
        high = np.full_like(low, min(road.limit_m_s[cell + 1], 35.0))
        for _ in range(30):
            middle = 0.5 * (low + high)
            drive = 2.0 * road.efficiency[cell] * power / (v + middle)
            gain = road.effective_mass_kg * (middle**2 - v**2) / (2.0 * h)
            short = gain + 0.5 * (before + road.resistance_n(middle, at)) < drive
            low, high = np.where(short, middle, low), np.where(short, high, middle)
        return 0.5 * (low + high)

    def table(self) -> Table:
        """Backwards: least time to go from every stage, speed and balance."""
        road = self.road
        v = np.linspace(3.0, 22.0, self.speeds)
        w = np.linspace(road.reserve_j, road.w_prime_j, self.balances)
        to_go = np.zeros((self.stages + 1, v.size, w.size))
        for stage in range(self.stages - 1, -1, -1):
            power = self.power_list_w(stage, self.powers)
            speed, left, time = self.through(
                stage, v[:, None, None], w[None, :, None], power[None, None, :]
            )
            rest = _interpolated(v, w, to_go[stage + 1], speed, left)
            total = np.where(left < road.reserve_j - 1e-6, np.inf, time + rest)
            to_go[stage] = total.min(axis=2)
        return Table(v, w, to_go)

    def ride(self, table: Table, *, candidates: int = 400) -> tuple[float, np.ndarray, float]:
        """Forwards: time, stage powers (S,) and least W′ of the ride the table recommends."""
        road = self.road
        v, w, total, least = road.start_speed_m_s, road.w_prime_j, 0.0, road.w_prime_j
        chosen = []
        for stage in range(self.stages):
            power = self.power_list_w(stage, candidates)
            speed, left, time = self.through(stage, np.array([v]), np.array([w]), power)
            rest = _interpolated(
                table.speeds_m_s, table.balances_j, table.to_go_s[stage + 1], speed, left
            )
            pick = int(np.argmin(np.where(left < road.reserve_j, np.inf, time + rest)))
            v, w, total = float(speed[pick]), float(left[pick]), total + float(time[pick])
            least = min(least, w)
            chosen.append(float(power[pick]))
        return total, np.array(chosen), least


def _interpolated(
    v: np.ndarray, w: np.ndarray, values: np.ndarray, speed: np.ndarray, left: np.ndarray
) -> np.ndarray:
    """Bilinear, held at the table's edges; ``speed`` and ``left`` broadcast."""
    a = np.clip((speed - v[0]) / (v[1] - v[0]), 0.0, v.size - 1.0)
    b = np.clip((left - w[0]) / (w[1] - w[0]), 0.0, w.size - 1.0)
    i = np.minimum(a.astype(int), v.size - 2)
    j = np.minimum(b.astype(int), w.size - 2)
    a, b = a - i, b - j
    lower = values[i, j] * (1.0 - b) + values[i, j + 1] * b
    upper = values[i + 1, j] * (1.0 - b) + values[i + 1, j + 1] * b
    return lower * (1.0 - a) + upper * a
