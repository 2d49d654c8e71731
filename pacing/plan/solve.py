"""Sequential quadratic programming (SLSQP) over piece powers, with exact gradients."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq, minimize

from pacing.errors import CannotBeRiddenError
from pacing.plan.problem import Cuts, Problem, Ride, ride

Array = NDArray[np.float64]

MOST_ITERATIONS = 300
MOST_SIDE_CHANGES = 12
CROSSING_W = HELD_W = 1e-3
LEAST_CROSSING_GAIN_S = 1e-3
TIME_TOLERANCE_S = 1e-5
JOULES_PER_UNIT = 1000.0
FIRST_S = 30.0
"""The start, over which power has a cap of its own."""
EVENNESS = 0.05


@dataclass(frozen=True)
class Solution:
    """What SLSQP found, and how far it is from the conditions of an optimum.

    ``kkt_residual`` is the largest slope of the Lagrangian along any power not at its bound, in
    seconds per standard step of that power (order one where nothing is optimal).
    """

    ride: Ride
    status: int
    message: str
    iterations: int
    evaluations: int
    multipliers_s_per_j: Array
    kkt_residual: float


class _Bounds(NamedTuple):
    """Lowest and highest power of each piece (n,)."""

    low: Array
    high: Array


@dataclass
class _Memory:
    """The last candidate ridden, so that value and slopes of one point are found once."""

    problem: Problem
    starts: Cuts
    base_w: Array
    step_w: Array
    last: Ride
    evaluations: int = 0
    x: Array = field(default_factory=lambda: np.empty(0))

    def at(self, x: Array) -> Ride:
        if self.x.size != x.size or not np.array_equal(self.x, x):
            power = self.base_w + self.step_w * x
            self.last = ride(self.problem, self.starts, power, guess_m_s=self.last.motion.speed_m_s)
            self.x = x.copy()
            self.evaluations += 1
        return self.last


def power_bounds_w(problem: Problem, ridden: Ride) -> tuple[Array, Array]:
    """Lowest and highest power of each piece (n,): the pieces of the first 30 s have their own."""
    starts = ridden.starts
    low = np.full(starts.size, problem.min_power_w)
    high = np.full(starts.size, problem.max_power_w)
    early = ridden.motion.elapsed_s[starts] < FIRST_S
    high[early] = np.minimum(high[early], problem.first_30_s_max_w)
    return low, np.maximum(low, high)


def _held_to_sides(
    low: Array, high: Array, at_critical: Array, above: NDArray[np.bool_]
) -> _Bounds:
    """Bounds (n,) that keep each power on its side of critical power.

    At critical power spending turns into recovering and the slopes of W′ jump. On either side
    everything is smooth, so the solver is kept to one and the sides are changed between runs.
    """
    split = np.clip(at_critical, low, high)
    return _Bounds(np.where(above, split, low), np.where(above, high, split))


def standard_step_w(ridden: Ride) -> Array:
    """A step of each power (n,) that changes the Lagrangian's slope by about one second.

    From quasi-steady level riding, where time goes with power to the −1/3: the Lagrangian's
    second derivative in a piece of T seconds at P watts is about T/(3 P²).
    """
    power = np.maximum(ridden.power_w, 0.5 * float(np.mean(ridden.power_w)))
    return power * np.sqrt(3.0 / np.maximum(ridden.piece_time_s, 1.0))


def margins_j(ridden: Ride) -> Array:
    """What has to stay above zero: W′ over the reserve, in each piece or at the finish."""
    if ridden.problem.reserve_everywhere:
        return ridden.lowest.lowest_j - ridden.problem.reserve_j
    return ridden.lowest.end_j[-1:] - ridden.problem.reserve_j


def _margin_slopes(ridden: Ride) -> Array:
    if ridden.problem.reserve_everywhere:
        return ridden.lowest_slopes.lowest
    return ridden.lowest_slopes.end[-1:]


def _peak_margins_w(ridden: Ride) -> Array:
    """Room below CP + (Pmax − CP) W/W′ at each piece's lowest W′ (n,)."""
    share, cp, per_joule = _peak_terms(ridden)
    return cp + per_joule * ridden.lowest.lowest_j - ridden.power_w / share


def _peak_margin_slopes(ridden: Ride) -> Array:
    share, _, per_joule = _peak_terms(ridden)
    return per_joule[:, None] * ridden.lowest_slopes.lowest - np.diag(1.0 / share)


def _peak_terms(ridden: Ride) -> tuple[Array, Array, Array]:
    problem, starts = ridden.problem, ridden.starts
    assert problem.peak_power_w is not None
    share, cp = problem.power_share[starts], problem.critical_power_w[starts]
    return share, cp, (problem.peak_power_w - cp) / problem.w_prime_j


def solve(
    problem: Problem,
    starts: Cuts,
    power_w: Array,
    *,
    guess_m_s: Array | None = None,
    fixed: NDArray[np.bool_] | None = None,
    evenness: float = EVENNESS,
    tolerance_s: float = TIME_TOLERANCE_S,
) -> Solution:
    """Find the piece powers (n,) of least time from the starting powers ``power_w`` (n,).

    Powers marked ``fixed`` (n,) stay as they are. ``evenness`` weighs the near-ties towards
    even power (0: time alone), see `_Evenness`.
    """
    ridden = ride(problem, starts, power_w, guess_m_s=guess_m_s)
    fixed = np.zeros(starts.size, dtype=bool) if fixed is None else fixed
    at_critical = problem.at_critical_w[starts]
    above = power_w >= at_critical
    iterations = evaluations = 0
    for _ in range(MOST_SIDE_CHANGES):
        low, high = power_bounds_w(problem, ridden)
        bounds = _held_to_sides(low, high, at_critical, above)
        bounds = _Bounds(
            np.where(fixed, power_w, bounds.low), np.where(fixed, power_w, bounds.high)
        )
        solution = _solve_within(ridden, bounds, tolerance_s, evenness)
        iterations += solution.iterations
        evaluations += solution.evaluations
        ridden = solution.ride
        change = _pays_to_cross(solution, at_critical, above, evenness) & ~fixed
        early_ends = np.any(ridden.power_w > power_bounds_w(problem, ridden)[1] + 1e-6)
        if not np.any(change) and not early_ends:
            break
        above = above ^ change
    return replace(solution, iterations=iterations, evaluations=evaluations)


def _pays_to_cross(
    solution: Solution, at_critical: Array, above: NDArray[np.bool_], evenness: float
) -> NDArray[np.bool_]:
    """Pieces (n,) held at critical power for which the other side is better."""
    ridden = solution.ride
    held = np.abs(ridden.power_w - at_critical) < HELD_W
    if not np.any(held):
        return held
    aside = np.where(held, at_critical + np.where(above, -CROSSING_W, CROSSING_W), ridden.power_w)
    beside = ride(ridden.problem, ridden.starts, aside, guess_m_s=ridden.motion.speed_m_s)
    even = _Evenness(ridden, evenness)
    price = solution.multipliers_s_per_j @ _margin_slopes(beside)
    slope = beside.time_slopes + even.slopes(beside) - price
    gain = np.where(above, slope, -slope) * standard_step_w(ridden)
    return held & (gain > LEAST_CROSSING_GAIN_S)


class _Evenness:
    """What breaks ties between powers that cost the same: seconds for being uneven.

    A small share of the quasi-steady curvature about the mean power, and seconds for a target
    above what can be put out where a speed limit holds. Where time has a say it wins.
    """

    def __init__(self, first: Ride, weight: float) -> None:
        time = first.piece_time_s
        self.mean_w = float(np.sum(first.power_w * time) / np.sum(time))
        self.per_w2 = weight * time / (6.0 * self.mean_w**2)
        self.per_joule = 0.2 * weight / self.mean_w

    def seconds(self, ridden: Ride) -> float:
        """The term itself."""
        unused_j = np.sum((ridden.target_w - ridden.motion.power_w) * ridden.motion.time_s)
        return float(self.per_w2 @ (ridden.power_w - self.mean_w) ** 2 + self.per_joule * unused_j)

    def slopes(self, ridden: Ride) -> Array:
        """Its slopes in the piece powers (n,)."""
        unused = ridden.target_w - ridden.motion.power_w
        time, slopes = ridden.motion.time_s, ridden.slopes
        own = (1.0 - slopes.power_own) * time + unused * slopes.time_own
        entry = unused * slopes.time_entry - slopes.power_entry * time
        by_unused = np.add.reduceat(own, ridden.starts)
        by_unused += np.add.reduceat(entry, ridden.starts) @ slopes.entry_energy
        return 2.0 * self.per_w2 * (ridden.power_w - self.mean_w) + self.per_joule * by_unused


def _solve_within(first: Ride, bounds: _Bounds, tolerance_s: float, evenness: float) -> Solution:
    """One run of SLSQP between fixed bounds."""
    problem, starts = first.problem, first.starts
    low, high = bounds
    even = _Evenness(first, evenness)
    base = np.clip(first.power_w, low, high)
    step = standard_step_w(first)
    memory = _Memory(problem, starts, base, step, first)
    constraints: list[dict[str, Any]] = [
        {
            "type": "ineq",
            "fun": lambda x: margins_j(memory.at(x)) / JOULES_PER_UNIT,
            "jac": lambda x: _margin_slopes(memory.at(x)) * step / JOULES_PER_UNIT,
        }
    ]
    if problem.peak_power_w is not None:
        constraints.append(
            {
                "type": "ineq",
                "fun": lambda x: _peak_margins_w(memory.at(x)) / step,
                "jac": lambda x: _peak_margin_slopes(memory.at(x)) * step / step[:, None],
            }
        )

    def slopes(x: Array) -> Array:
        ridden = memory.at(x)
        return (ridden.time_slopes + even.slopes(ridden)) * step

    result: Any = minimize(  # type: ignore[call-overload]
        lambda x: memory.at(x).motion.total_s + even.seconds(memory.at(x)),
        np.zeros(starts.size),
        jac=slopes,
        method="SLSQP",
        bounds=list(zip((low - base) / step, (high - base) / step, strict=True)),
        constraints=constraints,
        options={"maxiter": MOST_ITERATIONS, "ftol": tolerance_s},
    )
    best = memory.at(np.asarray(result.x))
    jacobian = np.concatenate([constraint["jac"](result.x) for constraint in constraints])
    multipliers = np.asarray(result.get("multipliers", np.zeros(len(jacobian))))
    return Solution(
        ride=best,
        status=int(result.get("status", 0)),  # absent where bounds leave no choice
        message=str(result.message),
        iterations=int(result.get("nit", 0)),
        evaluations=memory.evaluations,
        multipliers_s_per_j=multipliers[: margins_j(best).size] / JOULES_PER_UNIT,
        kkt_residual=_kkt_residual(
            slopes(result.x) - multipliers @ jacobian,
            at_low=best.power_w <= low + 1e-6 * step,
            at_high=best.power_w >= high - 1e-6 * step,
        ),
    )


def _kkt_residual(slope: Array, *, at_low: NDArray[np.bool_], at_high: NDArray[np.bool_]) -> float:
    """Largest slope of the Lagrangian that no bound holds back."""
    slope = np.where(at_low, np.minimum(slope, 0.0), slope)
    slope = np.where(at_high, np.maximum(slope, 0.0), slope)
    return float(np.max(np.abs(slope)))


def best_constant(problem: Problem) -> Ride:
    """The highest constant target that keeps the reserve under the same limits.

    The first 30 s keep their own cap, so the ride may have two pieces; the last is the target.

    Raises
    ------
    CannotBeRiddenError
        If no constant target within the bounds keeps it.
    """
    capped_w = min(problem.first_30_s_max_w, problem.max_power_w)
    start = ride(problem, np.zeros(1, dtype=np.intp), np.array([capped_w]))
    early = int(np.searchsorted(start.motion.elapsed_s, FIRST_S))
    starts = np.array([0, early] if early < problem.cells else [0], dtype=np.intp)
    last = start

    def margin(power: float) -> float:
        nonlocal last
        targets = np.array([min(power, capped_w), power])[2 - starts.size :]
        targets = np.minimum(targets, [capped_w, np.inf][: starts.size])
        last = ride(problem, starts, targets, guess_m_s=last.motion.speed_m_s)
        return spare_j(last)

    never_spends = float(np.min(problem.at_critical_w))
    low = max(problem.min_power_w, min(never_spends, problem.max_power_w))
    if margin(problem.max_power_w) >= 0.0:
        return last
    if margin(low) < 0.0:
        raise CannotBeRiddenError(
            f"The reserve of {problem.reserve_j / 1000:.1f} kJ cannot be kept even at the lowest "
            f"power of {low:.0f} W. Lower plan.min_power_w or plan.reserve_kj."
        )
    power = float(brentq(margin, low, problem.max_power_w, xtol=1e-4))
    while margin(power) < 0.0:
        power -= 1e-4
    return last


def spare_j(ridden: Ride) -> float:
    """W′ over what has to be kept: the reserve, and what the power limit that falls with W′ asks.

    Negative where the ride may not be ridden.
    """
    spare = float(np.min(margins_j(ridden)))
    if ridden.problem.peak_power_w is not None:
        _, _, per_joule = _peak_terms(ridden)
        spare = min(spare, float(np.min(_peak_margins_w(ridden) / per_joule)))
    return spare
