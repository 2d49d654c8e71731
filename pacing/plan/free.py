"""The fine solve: power free along the whole course, by an interior point of our own.

States are energy and what is owed to each W′ pool, controls the power above and below critical
power, what comes back to each pool, and braking. What it finds is ridden by the simulator, so its
time is that of a ride that can be ridden. The problem is not convex: a local optimum, no bound.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.motion.road import Road
from pacing.plan.approach import freewheeling_in
from pacing.plan.cut import Priced
from pacing.plan.interior_point import Found, Terms, minimise
from pacing.plan.problem import Cuts, Problem, Ride, ride
from pacing.plan.solve import spare_j

Array = NDArray[np.float64]

ENERGY_UNIT, WORK_UNIT_J, POWER_UNIT_W, FORCE_UNIT_N = 50.0, 1000.0, 100.0, 100.0
LEAST_DEFICIT_W = 0.05
CAP_SHARPNESS = 8.0
IDLE_PRICE = 1e-3
"""Seconds that a second at 100 W below critical power costs extra: keeps u or q at zero."""
COARSEST_M = 30.0
BARRIER = 1.0
AT_CRITICAL = 0.03
MOST_HALVINGS = 14


@dataclass(frozen=True)
class _Blocks:
    """The road merged into blocks of cells: ``first`` (n,) cells, lengths and a coarser road."""

    first: Cuts
    road: Road
    critical_power_w: Array
    power_share: Array
    most_w: Array


def _merged_road(road: Road, first: Cuts) -> Road:
    """The road over blocks of cells: length-weighted means, the lowest limit of each end's node."""
    length = np.add.reduceat(road.cell_m, first)

    def mean(values: Array) -> Array:
        return np.add.reduceat(values * road.cell_m, first) / length

    nodes = np.append(first, road.cell_m.size)
    return Road(
        cell_m=length,
        steady_n=mean(road.steady_n),
        half_density_kg_m3=mean(road.half_density_kg_m3),
        wind_along_m_s=mean(road.wind_along_m_s),
        wind_across_m_s=mean(road.wind_across_m_s),
        position=road.position[first],
        drag_areas=road.drag_areas,
        bearing_n_per_m_s=road.bearing_n_per_m_s,
        efficiency=road.efficiency,
        effective_mass_kg=road.effective_mass_kg,
        traction_n=road.traction_n,
        spin_out_m_s=road.spin_out_m_s,
        limit_m_s=road.limit_m_s[nodes],
    )


def _blocks(problem: Problem, ridden: Ride) -> _Blocks:
    """Blocks of up to `COARSEST_M`, single cells at the start and where a limit is near."""
    road = problem.road
    own = float(np.max(road.limit_m_s))
    near = (road.limit_m_s < 0.999 * own) & (ridden.motion.speed_m_s > 0.97 * road.limit_m_s)
    near_cell = near[1:] | near[:-1]
    fine = np.convolve(near_cell, np.ones(5), mode="full")[2:-2] > 0
    elapsed = ridden.motion.elapsed_s
    fine[elapsed[1:] < 40.0] = True
    per_block = max(1, round(COARSEST_M / float(road.cell_m[0])))
    index = np.arange(road.cell_m.size)
    new = fine | (index % per_block == 0)
    new[1:] |= fine[:-1] | (road.position[1:] != road.position[:-1])
    new[0] = True
    first = np.flatnonzero(new)
    most = np.full(first.size, problem.max_power_w)
    most[elapsed[first] < 30.0] = min(problem.max_power_w, problem.first_30_s_max_w)
    return _Blocks(
        first=first,
        road=_merged_road(road, first),
        critical_power_w=problem.critical_power_w[first],
        power_share=problem.power_share[first],
        most_w=most,
    )


class _Stages:
    """The pacing problem in stages, in units of order one (see `interior_point.Staged`).

    Local variables: E₀, X₀…, u, q, b, E₁, X₁… with E = v²/2, X what is owed to each pool,
    P/share = CP + u − q and b the braking force.
    """

    controls = 3

    def __init__(self, problem: Problem, blocks: _Blocks) -> None:
        self.problem, self.blocks = problem, blocks
        self.flow = _Flow(problem)
        self.pools = self.flow.pools
        self.e = 1 + self.pools
        start = 0.5 * problem.start_speed_m_s**2 / ENERGY_UNIT
        start_j = problem.w_prime_j if problem.w_start_j is None else problem.w_start_j
        owed = self.flow.sizes * (1.0 - start_j / problem.w_prime_j)
        self.first = np.concatenate([[start], owed])
        road = blocks.road
        self.mass = road.effective_mass_kg
        self.limit = 0.5 * np.minimum(road.limit_m_s[1:], 60.0) ** 2 / ENERGY_UNIT
        self.cp = blocks.critical_power_w / POWER_UNIT_W
        self.most_u = blocks.most_w / blocks.power_share / POWER_UNIT_W - self.cp
        self.most_q = self.cp - problem.min_power_w / blocks.power_share / POWER_UNIT_W
        self.drive = road.efficiency * blocks.power_share * POWER_UNIT_W
        self.left = (problem.w_prime_j - problem.reserve_j) / WORK_UNIT_J
        k = self.pools
        self.i_e0, self.i_x0 = 0, np.arange(1, 1 + k)
        self.i_u, self.i_q, self.i_b = self.e, self.e + 1, self.e + 2
        self.i_e1 = self.e + self.controls
        self.i_x1 = self.i_e1 + 1 + np.arange(k)
        self.i_flow = np.concatenate([[self.i_u, self.i_q], self.i_x0])

    def _motion(self, local: Array) -> tuple[Array, Array, Array, Array, Array]:
        v0 = np.sqrt(np.maximum(2.0 * ENERGY_UNIT * local[:, self.i_e0], 1e-6))
        v1 = np.sqrt(np.maximum(2.0 * ENERGY_UNIT * local[:, self.i_e1], 1e-6))
        r0, d0 = self.blocks.road.resistance_n_and_slope(v0)
        r1, d1 = self.blocks.road.resistance_n_and_slope(v1)
        return v0, v1, r0 + r1, d0 / v0, d1 / v1

    def values(self, local: Array) -> tuple[Array, Array, Array]:
        """See `interior_point.Staged`."""
        v0, v1, resistance, _, _ = self._motion(local)
        time = 2.0 * self.blocks.road.cell_m / (v0 + v1)
        flow = self.flow.values(local[:, self.i_flow])
        cost = time + IDLE_PRICE * time * local[:, self.i_q]
        return cost, self._equations(local, time, resistance, flow), self._spares(local)

    def _equations(self, local: Array, time: Array, resistance: Array, flow: Array) -> Array:
        cell = self.blocks.road.cell_m
        power = self.cp + local[:, self.i_u] - local[:, self.i_q]
        scale = self.mass * ENERGY_UNIT
        motion = (
            local[:, self.i_e1]
            - local[:, self.i_e0]
            + (
                0.5 * cell * resistance
                + cell * FORCE_UNIT_N * local[:, self.i_b]
                - self.drive * power * time
            )
            / scale
        )
        owed = local[:, self.i_x1] - local[:, self.i_x0] - time[:, None] * flow
        return np.concatenate([motion[:, None], owed], axis=1)

    def _spares(self, local: Array) -> Array:
        u, q, e1 = local[:, self.i_u], local[:, self.i_q], local[:, self.i_e1]
        left = self.left - local[:, self.i_x1].sum(axis=1)
        floor = 0.5 / ENERGY_UNIT
        return np.stack(
            [u, self.most_u - u, q, self.most_q - q, local[:, self.i_b], self.limit - e1,
             e1 - floor, left],
            axis=1,
        )  # fmt: skip

    def terms(self, local: Array, equation_price: Array, spare_price: Array) -> Terms:
        """See `interior_point.Staged`."""
        n, w = local.shape
        cell = self.blocks.road.cell_m
        v0, v1, resistance, d0, d1 = self._motion(local)
        total = v0 + v1
        time = 2.0 * cell / total
        unit = ENERGY_UNIT
        t0, t1 = -time / (total * v0) * unit, -time / (total * v1) * unit
        t00 = (2.0 * time / (total**2 * v0**2) + time / (total * v0**3)) * unit**2
        t11 = (2.0 * time / (total**2 * v1**2) + time / (total * v1**3)) * unit**2
        t01 = 2.0 * time / (total**2 * v0 * v1) * unit**2
        u, q = local[:, self.i_u], local[:, self.i_q]
        power = self.cp + u - q
        scale = self.mass * unit
        drive = self.drive / scale
        price = equation_price
        flow, flow_slope = self.flow.values_and_slopes(local[:, self.i_flow])
        idle = 1.0 + IDLE_PRICE * q

        cost_slope = np.zeros((n, w))
        cost_slope[:, self.i_e0], cost_slope[:, self.i_e1] = idle * t0, idle * t1
        cost_slope[:, self.i_q] = IDLE_PRICE * time

        jac = np.zeros((n, self.e, w))
        jac[:, 0, self.i_e0] = -1.0 + 0.5 * cell * d0 * unit / scale - drive * power * t0
        jac[:, 0, self.i_e1] = 1.0 + 0.5 * cell * d1 * unit / scale - drive * power * t1
        jac[:, 0, self.i_u], jac[:, 0, self.i_q] = -drive * time, drive * time
        jac[:, 0, self.i_b] = cell * FORCE_UNIT_N / scale
        pools = np.arange(self.pools)
        jac[:, 1 + pools, self.i_x1] = 1.0
        jac[:, 1 + pools, self.i_x0] = -1.0
        jac[:, 1:, self.i_e0] = -t0[:, None] * flow
        jac[:, 1:, self.i_e1] = -t1[:, None] * flow
        jac[:, 1:, self.i_flow] -= time[:, None, None] * flow_slope

        curve = np.zeros((n, w, w))
        # d² of the Lagrangian in E₀, E₁: cost and every equation through the time
        through = idle + price[:, 0] * drive * power + np.sum(price[:, 1:] * flow, axis=1)
        air = 2.0 * self.blocks.road.half_density_kg_m3 * self._nominal_area()
        bend0 = 0.5 * cell * (air - d0) / v0**2 * unit**2 / scale
        bend1 = 0.5 * cell * (air - d1) / v1**2 * unit**2 / scale
        curve[:, self.i_e0, self.i_e0] = through * t00 - price[:, 0] * bend0
        curve[:, self.i_e1, self.i_e1] = through * t11 - price[:, 0] * bend1
        _both(curve, self.i_e0, self.i_e1, through * t01)
        by_flow = np.einsum("nk,nkj->nj", price[:, 1:], flow_slope)
        by_flow[:, 0] += price[:, 0] * drive
        by_flow[:, 1] += IDLE_PRICE - price[:, 0] * drive
        for j, index in enumerate(self.i_flow):
            _both(curve, self.i_e0, index, by_flow[:, j] * t0)
            _both(curve, self.i_e1, index, by_flow[:, j] * t1)
        bend = self.flow.curvature(local[:, self.i_flow], price[:, 1:] * time[:, None])
        curve[:, self.i_flow[:, None], self.i_flow] += bend
        return Terms(
            cost=time * idle,
            cost_slope=cost_slope,
            equation=self._equations(local, time, resistance, flow),
            equation_slope=jac,
            spare=self._spares(local),
            spare_slope=self._spare_slopes(n, w),
            curvature=curve,
        )

    def _nominal_area(self) -> Array:
        areas = np.array([area.m2[0] for area in self.blocks.road.drag_areas])
        return areas[self.blocks.road.position]

    def _spare_slopes(self, n: int, w: int) -> Array:
        slope = np.zeros((8, w))
        slope[0, self.i_u], slope[1, self.i_u] = 1.0, -1.0
        slope[2, self.i_q], slope[3, self.i_q] = 1.0, -1.0
        slope[4, self.i_b] = 1.0
        slope[5, self.i_e1], slope[6, self.i_e1] = -1.0, 1.0
        slope[7, self.i_x1] = -1.0
        return np.broadcast_to(slope, (n, 8, w))

    def start(self, ridden: Ride) -> tuple[Array, Array]:
        """States and controls near a ride, moved off every bound."""
        problem, blocks = self.problem, self.blocks
        nodes = np.append(blocks.first, problem.cells)
        speed = np.maximum(ridden.motion.speed_m_s[nodes], 1.5)
        owed = (problem.w_prime_j - ridden.balance_j[nodes]) / WORK_UNIT_J
        owed = np.clip(owed, 0.05 * self.left, 0.9 * self.left)
        state = np.column_stack(
            [0.5 * speed**2 / ENERGY_UNIT, np.outer(owed, np.array(problem.law.pool_shares))]
        )
        state[1:, 0] = np.minimum(state[1:, 0], 0.95 * self.limit)
        state[0] = self.first
        time = np.add.reduceat(ridden.motion.time_s, blocks.first)
        power = np.add.reduceat(ridden.motion.power_w * ridden.motion.time_s, blocks.first) / time
        excess = power / blocks.power_share / POWER_UNIT_W - self.cp
        up, down = np.maximum(excess, 0.0) + 0.1, np.maximum(-excess, 0.0) + 0.1
        control = np.full((blocks.first.size, self.controls), 0.1)
        control[:, 0] = np.clip(up, 0.1 * self.most_u, 0.9 * self.most_u)
        control[:, 1] = np.clip(down, 0.1 * self.most_q, 0.9 * self.most_q)
        return state, control


class _Flow:
    """How fast each pool is emptied, kJ/s, from (u, q, X…) (n, 2 + k); negative fills it.

    Spending takes from the pools by content; what comes back is X g(q) from each, together
    no more than q: min(q, R) made smooth as q R/(q^p + R^p)^(1/p).
    """

    def __init__(self, problem: Problem) -> None:
        self.law, self.w_prime_j = problem.law, problem.w_prime_j
        self.sizes = np.array(problem.law.pool_shares) * problem.w_prime_j / WORK_UNIT_J
        self.pools = self.sizes.size
        self.per = POWER_UNIT_W / WORK_UNIT_J

    def _rates(self, q: Array) -> tuple[Array, Array]:
        """1/τ (n, k), per second, and its slope in q."""
        watts = np.maximum(q * POWER_UNIT_W, 0.0) + LEAST_DEFICIT_W
        step = 1e-5 * watts
        rate = self.law.return_rates_per_s(watts, w_prime_j=self.w_prime_j)
        more = self.law.return_rates_per_s(watts + step, w_prime_j=self.w_prime_j)
        return rate.T, ((more - rate) / step * POWER_UNIT_W).T

    def values(self, at: Array) -> Array:
        """Flow out of each pool (n, k)."""
        return self.values_and_slopes(at)[0]

    def values_and_slopes(self, at: Array) -> tuple[Array, Array]:
        """Flow out of each pool (n, k), and its slopes in (u, q, X…) (n, k, 2 + k)."""
        n, k = at.shape[0], self.pools
        u, q = at[:, 0], np.maximum(at[:, 1], 1e-12)
        owed = np.maximum(at[:, 2:], 1e-9)
        rate, rate_slope = self._rates(q)
        each, each_q = owed * rate / self.per, owed * rate_slope / self.per
        total, total_q = each.sum(axis=1) + 1e-12, each_q.sum(axis=1)
        # share of the uncapped return that is allowed, M = q/(q^p + R^p)^(1/p)
        ratio = total / q
        base = 1.0 + ratio**CAP_SHARPNESS
        allowed = base ** (-1.0 / CAP_SHARPNESS)
        allowed_ratio = -allowed * ratio ** (CAP_SHARPNESS - 1.0) / base
        allowed_q = allowed_ratio * (total_q / q - ratio / q)
        slopes = np.zeros((n, k, 2 + k))
        content = np.maximum(self.sizes - at[:, 2:], 1e-6)
        left = content.sum(axis=1, keepdims=True)
        share = content / left
        slopes[:, :, 0] = self.per * share
        slopes[:, :, 1] = -self.per * (each_q * allowed[:, None] + each * allowed_q[:, None])
        for j in range(k):
            by_x = rate[:, j] / self.per
            slopes[:, :, 2 + j] = self.per * (
                u[:, None] * share / left - each * (allowed_ratio * by_x / q)[:, None]
            )
            slopes[:, j, 2 + j] -= self.per * (u / left[:, 0] + by_x * allowed)
        flow = self.per * (u[:, None] * share - each * allowed[:, None])
        return flow, slopes

    def curvature(self, at: Array, weight: Array) -> Array:
        """Second slopes of Σ weight · flow (n, 2 + k, 2 + k), by differences of the first."""
        width = at.shape[1]
        here = np.einsum("nk,nkj->nj", weight, self.values_and_slopes(at)[1])
        bend = np.empty((at.shape[0], width, width))
        bend[:, :, 0] = 0.0
        for j in range(1, width):
            step = 1e-6 * (1.0 + np.abs(at[:, j]))
            moved = at.copy()
            moved[:, j] += step
            there = np.einsum("nk,nkj->nj", weight, self.values_and_slopes(moved)[1])
            bend[:, :, j] = (there - here) / step[:, None]
        bend[:, 0, 1:] = bend[:, 0, 1:]
        bend[:, 1:, 0] = bend[:, 0, 1:]
        return 0.5 * (bend + bend.transpose(0, 2, 1))


def _both(curve: Array, i: int, j: int, value: Array) -> None:
    curve[:, i, j] += value
    curve[:, j, i] += value


@dataclass(frozen=True)
class FreeRide:
    """The fine solve's ride, ridden by the simulator, and what departing from it costs."""

    ride: Ride
    found: Found
    priced: Priced


def ride_free(problem: Problem, start: Ride) -> FreeRide:
    """Free the power everywhere, from a ride that is already good or merely possible."""
    blocks = _blocks(problem, start)
    stages = _Stages(problem, blocks)
    state, control = stages.start(start)
    found = minimise(stages, state, control, barrier=BARRIER)
    power = (stages.cp + found.control[:, 0] - found.control[:, 1]) * POWER_UNIT_W
    power = np.clip(power * blocks.power_share, problem.min_power_w, blocks.most_w)
    ridden = _kept_to_reserve(problem, blocks.first, power)
    return FreeRide(ridden, found, _priced(ridden, found))


def _kept_to_reserve(problem: Problem, first: Cuts, power: Array) -> Ride:
    """Lower what lies above critical power by as little as keeps the reserve."""
    whole = ride(problem, first, power)
    if spare_j(whole) >= 0.0:
        return whole
    over = np.maximum(power - problem.at_critical_w[first], 0.0)
    low, high = 0.0, 1.0
    kept = ride(problem, first, power - over, guess_m_s=whole.motion.speed_m_s)
    for _ in range(MOST_HALVINGS):
        middle = 0.5 * (low + high)
        trial = ride(problem, first, power - middle * over, guess_m_s=kept.motion.speed_m_s)
        if spare_j(trial) >= 0.0:
            high, kept = middle, trial
        else:
            low = middle
    return kept


def _priced(ridden: Ride, found: Found) -> Priced:
    """One-sided prices of power in every cell, from the multipliers of its bounds."""
    cells = np.diff(np.append(ridden.starts, ridden.problem.cells))
    u, q, price = found.control[:, 0], found.control[:, 1], found.spare_price
    by_u = (price[:, 0] - price[:, 1]) / POWER_UNIT_W
    by_q = (price[:, 2] - price[:, 3]) / POWER_UNIT_W
    critical = (u < AT_CRITICAL) & (q < AT_CRITICAL)
    more = np.maximum(np.where(critical | (u > q), by_u, -by_q), 0.0)
    less = np.maximum(np.where(critical | (u <= q), by_q, -by_u), 0.0)
    time = ridden.motion.time_s
    held = ridden.motion.power_w < ridden.target_w - 1.0
    held |= freewheeling_in(ridden)
    return Priced(
        power_w=ridden.target_w,
        more_s_per_w=np.where(held, 0.0, np.repeat(more / cells, cells)),
        less_s_per_w=np.where(held, 0.0, np.repeat(less / cells, cells)),
        bend_s_per_w2=np.where(held, 0.0, time / (3.0 * np.mean(ridden.target_w) ** 2)),
        time_s=time,
    )
