"""A primal-dual interior point for problems in stages: banded, so that effort grows with length.

Stage i takes the state s_i to s_(i+1) under controls y_i. Every term of the objective, every
equation and every inequality couples (s_i, y_i, s_(i+1)) alone. Each Newton step eliminates
inequalities and controls stage by stage (small dense systems, batched) and solves the states and
multipliers that remain as one banded system.

Source: nocedal-wright-2006 (chapter 19, slack form, fraction to the boundary, monotone barrier).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import LinAlgError, solve_banded

Array = NDArray[np.float64]

MOST_ITERATIONS = 60
BOUNDARY = 0.995
DUAL_REGULARISATION = 1e-9
LEAST_DAMPING = 1e-3


class Terms(NamedTuple):
    """All terms of every stage at a point; the local variables are w = (s_i, y_i, s_(i+1)).

    ``cost`` (n,), ``cost_slope`` (n, w); ``equation`` (n, e) and ``equation_slope`` (n, e, w);
    ``spare`` (n, g) >= 0 wanted, ``spare_slope`` (n, g, w); ``curvature`` (n, w, w) of the
    Lagrangian cost − λ·equation − ν·spare.
    """

    cost: Array
    cost_slope: Array
    equation: Array
    equation_slope: Array
    spare: Array
    spare_slope: Array
    curvature: Array


class Staged(Protocol):
    """A problem in stages: ``first`` (e,) is the given first state, ``controls`` their number."""

    first: Array
    controls: int

    def values(self, local: Array) -> tuple[Array, Array, Array]:
        """Cost (n,), equations (n, e) and spare (n, g) at local variables (n, w)."""

    def terms(self, local: Array, equation_price: Array, spare_price: Array) -> Terms:
        """Everything at local variables (n, w), for multipliers (n, e) and (n, g)."""


@dataclass(frozen=True)
class Found:
    """The point reached: states (n + 1, e), controls (n, c), prices (n, g), how good it is."""

    state: Array
    control: Array
    spare_price: Array
    cost: float
    error: float
    iterations: int
    converged: bool


@dataclass
class _Point:
    state: Array
    control: Array
    slack: Array
    price: Array
    spare_price: Array

    def local(self) -> Array:
        return np.concatenate([self.state[:-1], self.control, self.state[1:]], axis=1)


def minimise(
    problem: Staged, state: Array, control: Array, *, tolerance: float = 1e-6, barrier: float = 1e-2
) -> Found:
    """Minimise from states (n + 1, e) and controls (n, c); variables and terms of order one.

    ``tolerance`` bounds the largest of stationarity, equation error and complementarity.
    """
    point = _Point(state.copy(), control.copy(), np.empty(0), np.zeros_like(state[1:]), np.empty(0))
    point.state[0] = problem.first
    _, _, spare = problem.values(point.local())
    point.slack = np.maximum(spare, 1e-3)
    point.spare_price = barrier / point.slack
    merit_price, error, damping = 1.0, np.inf, 0.0
    for iteration in range(MOST_ITERATIONS):
        local = point.local()
        terms = problem.terms(local, point.price, point.spare_price)
        stationarity = _stationarity(terms, point, state.shape[1])
        infeasible = max(_largest(terms.equation), _largest(terms.spare - point.slack))
        complementary = _largest(point.slack * point.spare_price)
        error = max(_largest(stationarity), infeasible, complementary)
        if error < tolerance:
            total = float(terms.cost.sum())
            return _found(point, total, error, iteration, True)
        inner = max(
            _largest(stationarity), infeasible, _largest(point.slack * point.spare_price - barrier)
        )
        if inner < 10.0 * barrier:
            barrier = max(0.1 * tolerance, min(0.15 * barrier, barrier**1.4))
        step, damping = _newton(terms, point, barrier, damping)
        merit_price = max(merit_price, 1.1 * _largest(step.price_after))
        taken = _advance(problem, point, step, terms, barrier, merit_price)
        if taken < 0.3:
            damping = max(4.0 * damping, LEAST_DAMPING)
        elif taken > 0.7:
            damping = 0.3 * damping if damping > LEAST_DAMPING else 0.0
    cost, _, _ = problem.values(point.local())
    return _found(point, float(cost.sum()), error, MOST_ITERATIONS, False)


def _found(point: _Point, cost: float, error: float, iterations: int, converged: bool) -> Found:
    return Found(point.state, point.control, point.spare_price, cost, error, iterations, converged)


def _largest(values: Array) -> float:
    return float(np.max(np.abs(values))) if values.size else 0.0


def _stationarity(terms: Terms, point: _Point, e: int) -> Array:
    """Slope of the Lagrangian in every state after the first and every control."""
    by_local = (
        terms.cost_slope
        - np.einsum("ne,new->nw", point.price, terms.equation_slope)
        - np.einsum("ng,ngw->nw", point.spare_price, terms.spare_slope)
    )
    states = by_local[:, -e:].copy()
    states[:-1] += by_local[1:, :e]
    return np.concatenate([by_local[:, e:-e].ravel(), states.ravel()])


class _Step(NamedTuple):
    state: Array
    control: Array
    slack: Array
    price_after: Array
    spare_price: Array


def _newton(terms: Terms, point: _Point, barrier: float, damping: float) -> tuple[_Step, float]:
    """One Newton step of the perturbed conditions; curvature is raised until it can be taken."""
    ratio = point.spare_price / point.slack
    weighted = terms.spare_slope * ratio[:, :, None]
    base = terms.curvature + np.matmul(terms.spare_slope.transpose(0, 2, 1), weighted)
    pull = barrier / point.slack - ratio * (terms.spare - point.slack)
    slope = terms.cost_slope - np.einsum("ng,ngw->nw", pull, terms.spare_slope)
    for _ in range(12):
        curved = base + damping * np.eye(base.shape[1])
        try:
            state, control, price = _solve_stages(curved, slope, terms)
        except (LinAlgError, np.linalg.LinAlgError):
            damping = max(10.0 * damping, 1e-4)
            continue
        local = np.concatenate([state[:-1], control, state[1:]], axis=1)
        bend = float(np.einsum("nw,nwv,nv->", local, curved, local))
        if np.all(np.isfinite(local)) and bend > 1e-10 * float(np.sum(local**2)):
            break
        damping = max(10.0 * damping, 1e-4)
    slack = np.einsum("ngw,nw->ng", terms.spare_slope, local) + terms.spare - point.slack
    spare_price = barrier / point.slack - ratio * slack - point.spare_price
    return _Step(state, control, slack, price, spare_price), damping


def _solve_stages(curved: Array, slope: Array, terms: Terms) -> tuple[Array, Array, Array]:
    """Solve the equality-constrained quadratic model for states, controls and new multipliers."""
    count, e = terms.equation.shape
    w = curved.shape[1]
    outer = np.r_[0:e, w - e : w]
    inner = np.arange(e, w - e)
    y_block = curved[:, inner[:, None], inner]
    np.linalg.cholesky(y_block)  # raises where the controls' curvature is not positive
    coupling = curved[:, inner[:, None], outer]
    a_y, a_s = terms.equation_slope[:, :, inner], terms.equation_slope[:, :, outer]
    right = np.concatenate([coupling, a_y.transpose(0, 2, 1), slope[:, inner, None]], axis=2)
    solved = np.linalg.solve(y_block, right)
    by_s, by_price, by_one = solved[:, :, : 2 * e], solved[:, :, 2 * e : 3 * e], solved[:, :, -1]
    # y = −by_s s + by_price λ − by_one
    s_block = curved[:, outer[:, None], outer] - np.matmul(coupling.transpose(0, 2, 1), by_s)
    s_slope = slope[:, outer] - np.einsum("nyo,ny->no", coupling, by_one)
    a_eff = a_s - np.matmul(a_y, by_s)
    price_block = np.matmul(a_y, by_price) + DUAL_REGULARISATION * np.eye(e)
    equation = terms.equation - np.einsum("nep,np->ne", a_y, by_one)

    size = 2 * e
    half = 2 * size - 1
    band = np.zeros((2 * half + 1, count * size))
    rhs = np.zeros((count, size))
    rhs[:, :e] = -equation
    rhs[:, e:] = -s_slope[:, e:]
    rhs[:-1, e:] -= s_slope[1:, :e]
    _put(band, half, size, 0, 0, np.concatenate([price_block, a_eff[:, :, e:]], axis=2))
    after = s_block[:, e:, e:].copy()
    after[:-1] += s_block[1:, :e, :e]
    _put(
        band, half, size, e, 0, np.concatenate([-a_eff[:, :, e:].transpose(0, 2, 1), after], axis=2)
    )
    # to the stage before: equation i on s_i, and the curvature between s_i and s_(i+1)
    _put(band, half, size, 0, -e, a_eff[1:, :, :e], first=1)
    _put(band, half, size, e, -e, s_block[1:, e:, :e], first=1)
    # to the stage after
    _put(band, half, size, e, size, -a_eff[1:, :, :e].transpose(0, 2, 1), first=0)
    _put(band, half, size, e, size + e, s_block[1:, :e, e:], first=0)
    flat = solve_banded((half, half), band, rhs.ravel(), check_finite=False, overwrite_ab=True)
    x = np.asarray(flat).reshape(count, size)
    price, states = x[:, :e], np.concatenate([np.zeros((1, e)), x[:, e:]])
    around = np.concatenate([states[:-1], states[1:]], axis=1)
    control = (
        -np.einsum("nyo,no->ny", by_s, around) + np.einsum("nye,ne->ny", by_price, price) - by_one
    )
    return states, control, price


def _put(
    band: Array, half: int, size: int, row: int, column: int, block: Array, *, first: int = 0
) -> None:
    """Write ``block`` (m, r, c) at (row, column) within stages first, first + 1, … of the band."""
    stages = np.arange(first, first + block.shape[0]) * size
    for r in range(block.shape[1]):
        for c in range(block.shape[2]):
            column_index = stages + column + c
            band[half + row + r - column - c, column_index] = block[:, r, c]


def _advance(
    problem: Staged, point: _Point, step: _Step, terms: Terms, barrier: float, merit_price: float
) -> float:
    """Take as much of the step as keeps slacks positive and makes the merit fall."""
    primal = _to_boundary(point.slack, step.slack)
    dual = _to_boundary(point.spare_price, step.spare_price)
    missing = np.abs(terms.equation).sum() + np.abs(terms.spare - point.slack).sum()
    before = terms.cost.sum() - barrier * np.log(point.slack).sum() + merit_price * missing
    slope = float(
        np.sum(
            terms.cost_slope
            * np.concatenate([step.state[:-1], step.control, step.state[1:]], axis=1)
        )
        - barrier * np.sum(step.slack / point.slack)
        - merit_price * missing
    )
    size = primal
    for _ in range(12):
        trial = _Point(
            point.state + size * step.state,
            point.control + size * step.control,
            point.slack + size * step.slack,
            point.price,
            point.spare_price,
        )
        with np.errstate(all="ignore"):
            cost, equation, spare = problem.values(trial.local())
            missing = np.abs(equation).sum() + np.abs(spare - trial.slack).sum()
            after = cost.sum() - barrier * np.log(trial.slack).sum() + merit_price * missing
        if np.isfinite(after) and after <= before + 1e-4 * size * min(slope, 0.0) + 1e-10 * abs(
            before
        ):
            break
        size *= 0.5
    point.state, point.control, point.slack = trial.state, trial.control, trial.slack
    point.price = point.price + size * (step.price_after - point.price)
    spare_price = point.spare_price + dual * step.spare_price
    # keep the product of slack and price near the barrier, as the theory asks
    point.spare_price = np.clip(
        spare_price, barrier / (1e8 * point.slack), 1e8 * barrier / point.slack
    )
    return size


def _to_boundary(value: Array, step: Array) -> float:
    falling = step < 0.0
    if not np.any(falling):
        return 1.0
    return float(min(1.0, BOUNDARY * np.min(-value[falling] / step[falling])))
