"""The pacing problem transcribed for CasADi and IPOPT: an interior-point collocation.

Nothing of pacing computes here. Speeds at the grid's nodes and the W′ debt are unknowns, the
motion and the debt are equations in every cell (braking is the slack of the motion's inequality),
power is CP + u − q over the position's share with u, q >= 0, so that the kink at critical power
is exact. Power is free in every cell, or equal over given pieces.
"""

from __future__ import annotations

import time
from collections.abc import Sequence
from dataclasses import dataclass

import casadi as ca
import numpy as np
from casadi_program import Program
from exported import SLOWEST_M_S, Exported
from march import follow_pools, pools_of

WATTS, JOULES = 100.0, 5000.0  # units of the unknowns
HELD_PRICE = 1.0  # s on (target − power)/WATTS · (limit − speed): nil where a limit really holds
WASTE_PRICE = 0.1  # s per s on u·q: spending and recovering in one cell at once
NEAR_CP_W = 2.0  # a slow pool's rate D^a/scale is rounded off below about this
EMPTY_J = 30.0  # a pool gives less from about here on, nothing when empty


@dataclass(frozen=True)
class PeerSolution:
    """What IPOPT found, and its own time; ``build_s`` is that of the expressions beforehand."""

    time_s: float
    speed_m_s: np.ndarray
    power_w: np.ndarray
    target_w: np.ndarray  # each cell's piece power; with free cells the power itself
    debt_j: np.ndarray
    iterations: int
    solve_s: float
    solve_cpu_s: float
    build_s: float
    status: str
    wasted_j: float  # W′ spent and won back in one cell at once: 0 where the kink is exact


def march_speeds(road: Exported, power_w: np.ndarray | float) -> tuple[np.ndarray, np.ndarray]:
    """Speeds at nodes under ``power_w``, and the cells where a speed limit holds them."""
    power = np.broadcast_to(np.asarray(power_w, dtype=float), (road.cells,))
    steady, half = road.steady_n, 0.5 * road.density_kg_m3 * road.cda_m2
    rows = zip(
        road.cell_m.tolist(),
        (road.efficiency * power).tolist(),
        steady.tolist(),
        half.tolist(),
        road.wind_along_m_s.tolist(),
        (road.wind_across_m_s**2).tolist(),
        road.limit_m_s[1:].tolist(),
        strict=True,
    )
    mass, b1, grip = road.effective_mass_kg, road.bearing_n_per_m_s, road.traction_n
    v = min(road.start_speed_m_s, float(road.limit_m_s[0]))
    speeds, held = [v], np.zeros(road.cells, dtype=bool)
    for i, (h, work, st, hd, wa, wc2, limit) in enumerate(rows):

        def force(w: float, st: float = st, hd: float = hd, a: float = wa, c: float = wc2) -> float:
            return st + b1 * w + hd * np.sqrt((w + a) ** 2 + c) * (w + a)

        r0 = force(v)
        v1 = max(v, 2.0)
        for _ in range(20):
            drive = min(2.0 * work / (v + v1), grip)
            error = mass * (v1 * v1 - v * v) / (2.0 * h) + 0.5 * (r0 + force(v1)) - drive
            slope = mass * v1 / h + 0.5 * b1 + 2.0 * hd * abs(v1 + wa)
            slope += drive / (v + v1) if drive < grip else 0.0
            step = error / slope
            v1 = max(v1 - step, 0.5 * v1)
            if abs(step) < 1e-7:
                break
        held[i] = v1 >= limit
        v = max(min(v1, limit), SLOWEST_M_S)
        speeds.append(v)
    return np.array(speeds), held


@dataclass(frozen=True)
class _Groups:
    """Cells that share one power: index per cell, and how groups hang together in pieces."""

    of_cell: np.ndarray
    first: np.ndarray
    piece: np.ndarray
    released: np.ndarray  # may give less than the piece's target: held by a limit or by grip


def _groups(road: Exported, starts: Sequence[int] | None, released: np.ndarray) -> _Groups:
    cells = road.cells
    if starts is None:
        every = np.arange(cells)
        return _Groups(every, every, every, np.zeros(cells, dtype=bool))
    piece = np.searchsorted(np.asarray(starts), np.arange(cells), side="right") - 1
    key: dict[tuple[float, ...], int] = {}
    of_cell = np.empty(cells, dtype=int)
    for i in range(cells):
        cell_key = (
            (float(piece[i]), -1.0, float(i))
            if released[i]
            else (float(piece[i]), road.power_share[i], road.critical_power_w[i])
        )
        of_cell[i] = key.setdefault(cell_key, len(key))
    _, first = np.unique(of_cell, return_index=True)
    return _Groups(of_cell, first, piece[first], released[first])


def solve(
    road: Exported,
    *,
    starts: Sequence[int] | None = None,
    constant_w: float | None = None,
    near_w: np.ndarray | None = None,
    tolerance: float = 1e-8,
    verbose: bool = False,
) -> PeerSolution:
    """Least time over ``road``; ``starts`` are the pieces' first cells, None frees every cell.

    IPOPT starts from a ride at ``constant_w`` (default: 0.97 CP), or at ``near_w`` (N,).
    """
    began = time.perf_counter()
    cells = road.cells
    cp, share = road.critical_power_w, road.power_share
    guess_w = np.full(cells, 0.97 * float(np.min(cp)) if constant_w is None else constant_w)
    guess_w = np.minimum(guess_w if near_w is None else near_w, road.highest_power_w())
    start_speeds, _ = march_speeds(road, guess_w)
    _, could_hold = march_speeds(road, road.max_power_w)
    slow_start = np.zeros(cells, dtype=bool)
    slow_start[:3] = road.start_speed_m_s < 3.0
    groups = _groups(road, starts, could_hold | slow_start)
    g, first = groups.of_cell, groups.first
    program = Program()

    low = np.full(cells + 1, SLOWEST_M_S)
    low[0] = min(road.start_speed_m_s, road.limit_m_s[0])
    high = np.minimum(road.limit_m_s, 40.0)
    high[0] = low[0]
    v = program.unknown(low, high, np.clip(start_speeds, low, high))
    over = (guess_w / share - cp)[first]
    least = 10.0 if near_w is None else 1.0
    spread = (road.max_power_w + cp[first]) / WATTS
    u = program.unknown(np.zeros(first.size), spread, np.maximum(over, least) / WATTS)
    q = program.unknown(np.zeros(first.size), spread, np.maximum(-over, least) / WATTS)
    power_g = share[first] * (cp[first] + WATTS * (u - q))
    top = road.highest_power_w()
    top_g = np.full(first.size, np.inf)
    np.minimum.at(top_g, g, top)
    program.hold(power_g / WATTS, np.full(first.size, road.min_power_w / WATTS), top_g / WATTS)

    power = power_g[g]
    v0, v1 = v[:-1], v[1:]
    pace = (v0 + v1) / (2.0 * road.cell_m)  # 1/dt
    _hold_motion(program, road, v0, v1, power, slow_start)
    if starts is not None:
        _hold_pieces(program, road, groups, power_g, v1)
    owed = None if near_w is None else _owed_j(road, near_w, start_speeds)
    debt, wasted = _hold_budget(program, road, u[g], q[g], pace, owed)
    program.prices.append(WASTE_PRICE * ca.sum1(u[g] * q[g] / pace))
    total = ca.sum1(1.0 / pace)
    found = program.solve(total, tolerance=tolerance, verbose=verbose)
    pick = program.evaluator([v, power, debt, total, wasted])
    speed, watts, joules, seconds, waste = (np.array(a).ravel() for a in pick(found.x))
    return PeerSolution(
        time_s=float(seconds[0]),
        speed_m_s=speed,
        power_w=watts,
        target_w=_targets(groups, watts),
        debt_j=joules,
        iterations=found.iterations,
        solve_s=found.seconds,
        solve_cpu_s=found.cpu_s,
        build_s=time.perf_counter() - began - found.seconds,
        status=found.status,
        wasted_j=float(waste[0]),
    )


def _targets(groups: _Groups, power_w: np.ndarray) -> np.ndarray:
    """The power asked for in each cell: the highest that any cell of its piece is ridden at."""
    piece = groups.piece[groups.of_cell]
    most = np.full(piece.max() + 1, -np.inf)
    steady = ~groups.released[groups.of_cell]
    np.maximum.at(most, piece[steady], power_w[steady])
    return np.where(np.isfinite(most[piece]), most[piece], power_w)


def _hold_motion(
    program: Program, road: Exported, v0: ca.SX, v1: ca.SX, power: ca.SX, slow: np.ndarray
) -> None:
    """m (v₁² − v₀²)/2h <= ηP · 2/(v₀ + v₁) − mean resistance: what is missing is braking."""

    def force(v: ca.SX) -> ca.SX:
        along = v + road.wind_along_m_s
        flow = ca.sqrt(along**2 + road.wind_across_m_s**2 + 1e-12)
        air = 0.5 * road.density_kg_m3 * road.cda_m2 * flow * along
        return road.steady_n + road.bearing_n_per_m_s * v + air

    drive = 2.0 * road.efficiency * power / (v0 + v1)
    gain = road.effective_mass_kg * (v1**2 - v0**2) / (2.0 * road.cell_m)
    spare = drive - gain - 0.5 * (force(v0) + force(v1))
    program.hold(spare / 20.0, np.zeros(road.cells), np.full(road.cells, np.inf))
    gripped = np.flatnonzero(slow | (road.gradient > 0.12))
    if gripped.size:
        use = (2.0 * road.efficiency * power / WATTS - road.traction_n * (v0 + v1) / WATTS)[gripped]
        program.hold(use, np.full(gripped.size, -np.inf), np.zeros(gripped.size))


def _hold_pieces(
    program: Program, road: Exported, groups: _Groups, power_g: ca.SX, v1: ca.SX
) -> None:
    """One target a piece; less than it only where a limit holds the speed."""
    for piece in np.unique(groups.piece):
        here = np.flatnonzero(groups.piece == piece)
        steady = here[~groups.released[here]]
        if steady.size == 0:
            continue
        base = power_g[int(steady[0])]
        others = steady[1:]
        if others.size:
            zero = np.zeros(others.size)
            program.hold((power_g[others] - base) / WATTS, zero, zero)
        loose = here[groups.released[here]]
        if not loose.size:
            continue
        less = (base - power_g[loose]) / WATTS
        program.hold(less, np.zeros(loose.size), np.full(loose.size, np.inf))
        cell = groups.first[loose]
        held = np.flatnonzero(cell >= 3)
        if held.size:
            room = road.limit_m_s[1:][cell[held]] - v1[cell[held]]
            program.prices.append(HELD_PRICE * ca.sum1(room * less[held]))


def _owed_j(road: Exported, power_w: np.ndarray, speed_m_s: np.ndarray) -> np.ndarray:
    """What each pool (k, N+1) is short of on the ride that the solve starts from."""
    time_s = 2.0 * road.cell_m / (speed_m_s[1:] + speed_m_s[:-1])
    pools = pools_of(road.recovery_law, road.w_prime_j)
    rows = [pools]
    excess = power_w / road.power_share - road.critical_power_w
    for over, duration in zip(excess.tolist(), time_s.tolist(), strict=True):
        pools = follow_pools(road.recovery_law, pools, over, duration, road.w_prime_j)
        rows.append(pools)
    table = np.array(rows).T
    return table[:, :1] - table


def _hold_budget(
    program: Program,
    road: Exported,
    u: ca.SX,
    q: ca.SX,
    pace: ca.SX,
    owed_j: np.ndarray | None,
) -> tuple[ca.SX, ca.SX]:
    """The W′ debt at nodes (N+1,) by the trapezoid rule, at most W′ − reserve; and the waste."""
    name = road.recovery_law["name"]
    room = road.w_prime_j - road.reserve_j
    cells = road.cells
    zero = np.zeros(cells)
    if name in ("none", "skiba-2015"):
        high = np.full(cells + 1, room / JOULES)
        high[0] = 0.0
        begin = 0.3 * high if owed_j is None else np.clip(owed_j[0] / JOULES, 0.0, high)
        debt = program.unknown(np.zeros(cells + 1), high, begin)
        middle = 0.5 * (debt[:-1] + debt[1:]) * JOULES / road.w_prime_j
        won = q * middle if name == "skiba-2015" else 0.0 * q
        change = (debt[1:] - debt[:-1]) * pace * JOULES / WATTS
        program.hold(change - u + won, zero, zero)
        return debt * JOULES, ca.sum1(ca.fmin(u, won) / pace) * WATTS
    if name == "two-phase":
        return _hold_two_pools(program, road, u, q, pace, owed_j)
    raise ValueError(f"no formulation of {name}")


def _hold_two_pools(
    program: Program,
    road: Exported,
    u: ca.SX,
    q: ca.SX,
    pace: ca.SX,
    owed_j: np.ndarray | None,
) -> tuple[ca.SX, ca.SX]:
    """Fast and slow deficits; recovery x · deficit/τ in each, in total at most q."""
    law, cells = road.recovery_law, road.cells
    room = road.w_prime_j - road.reserve_j
    shares = np.array([law["quick_share"], 1.0 - law["quick_share"]])
    deficits = []
    for k, share in enumerate(shares):
        high = np.full(cells + 1, share * road.w_prime_j / JOULES)
        high[0] = 0.0
        begin = 0.2 * high if owed_j is None else np.clip(owed_j[k] / JOULES, 0.0, high)
        deficits.append(program.unknown(np.zeros(cells + 1), high, begin))
    eased = program.unknown(np.zeros(cells), np.ones(cells), np.full(cells, 0.5))
    middle = [0.5 * (d[:-1] + d[1:]) for d in deficits]
    content = [share * road.w_prime_j / JOULES - d for share, d in zip(shares, middle, strict=True)]
    held = content[0] + content[1]
    slow_rate = (
        WATTS * q * ((WATTS * q) ** 2 + NEAR_CP_W**2) ** (0.5 * (law["slow_tau_exponent"] - 1.0))
    )
    slow_rate = slow_rate / law["slow_tau_scale"]
    rates = [1.0 / law["quick_tau_s"], slow_rate]
    won = [eased * d * r * JOULES / WATTS for d, r in zip(middle, rates, strict=True)]
    program.hold(q - won[0] - won[1], np.zeros(cells), np.full(cells, np.inf))
    mix = law["by_content"]
    by_size = [
        shares[k] * content[k] ** 2 / (content[k] ** 2 + (EMPTY_J / JOULES) ** 2) for k in range(2)
    ]
    wanted = [mix * content[k] / held + (1.0 - mix) * by_size[k] for k in range(2)]
    for k in range(2):
        spent = u * wanted[k] / (wanted[0] + wanted[1])
        change = (deficits[k][1:] - deficits[k][:-1]) * pace * JOULES / WATTS
        program.hold(change - spent + won[k], np.zeros(cells), np.zeros(cells))
    debt = deficits[0] + deficits[1]
    program.hold(debt[1:], np.zeros(cells), np.full(cells, room / JOULES))
    waste = ca.sum1(ca.fmin(u, won[0] + won[1]) / pace) * WATTS
    return debt * JOULES, waste
