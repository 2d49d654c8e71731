"""Critical power and W′ from efforts: the published forms, each a regression of its own.

They are one curve and differ only in what is taken to be uncertain. Without scatter they agree.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.errors import UnusableInputError

Array = NDArray[np.float64]

LONGEST_ASYMPTOTE_S = 300.0


@dataclass(frozen=True)
class FormFit:
    """One fitted form.

    ``parameters`` are CP (W), W′ (J) and, with three, Pmax (W). ``covariance`` is theirs, None
    where the efforts are no more than the parameters. ``scatter`` is the relative standard
    deviation of what the form takes to be uncertain (J for "work against time").
    """

    name: str
    parameters: tuple[float, ...]
    covariance: Array | None
    degrees_of_freedom: int
    scatter: float | None

    @property
    def critical_power_w(self) -> float:
        """CP."""
        return self.parameters[0]

    @property
    def w_prime_j(self) -> float:
        """W′."""
        return self.parameters[1]

    @property
    def asymptote_s(self) -> float:
        """W′/(Pmax − CP), the time by which the curve is shifted; 0 with two parameters."""
        if len(self.parameters) == 2:
            return 0.0
        return self.w_prime_j / (self.parameters[2] - self.critical_power_w)

    def power_w(self, duration_s: Array) -> Array:
        """The fitted curve."""
        return np.asarray(self.critical_power_w + self.w_prime_j / (duration_s + self.asymptote_s))

    def slopes(self, duration_s: Array) -> Array:
        """d power / d parameter (n, 2 or 3)."""
        if len(self.parameters) == 2:
            return np.column_stack([np.ones_like(duration_s), 1.0 / duration_s])
        k, above = self.asymptote_s, self.parameters[2] - self.critical_power_w
        by_k = -self.w_prime_j / (duration_s + k) ** 2
        return np.column_stack(
            [1.0 + by_k * k / above, 1.0 / (duration_s + k) + by_k / above, -by_k * k / above]
        )

    @property
    def standard_errors(self) -> tuple[float, ...] | None:
        """Of each parameter, None where there is no scatter to judge by."""
        if self.covariance is None:
            return None
        return tuple(np.sqrt(np.diag(self.covariance)).tolist())


def power_against_inverse_time(duration_s: Array, power_w: Array) -> FormFit:
    """P = W′/t + CP; each effort's power is uncertain by an equal share of it.

    A straight line, weighted anew by the fitted powers until nothing moves. The form for efforts
    of set duration. Source: simpson-2017.
    """
    design = np.column_stack([np.ones_like(duration_s), 1.0 / duration_s])
    fitted = power_w
    for _ in range(100):
        solution = _solved(design / fitted[:, None], power_w / fitted)
        before, fitted = fitted, design @ solution
        if np.any(fitted <= 0.0):
            raise _unusable(solution)
        if np.max(np.abs(fitted - before) / fitted) < 1e-14:
            break
    misses = (power_w - fitted) / fitted
    return _checked("power against 1/time", solution, design / fitted[:, None], misses)


def work_against_time(duration_s: Array, power_w: Array) -> FormFit:
    """W = CP t + W′; each effort's work is uncertain by an equal amount, so long ones lead.

    Source: simpson-2017.
    """
    design = np.column_stack([duration_s, np.ones_like(duration_s)])
    work = power_w * duration_s
    solution = _solved(design, work)
    return _checked("work against time", solution, design, work - design @ solution)


def time_against_power(duration_s: Array, power_w: Array) -> FormFit:
    """t = W′/(P − CP); each effort's time is uncertain by an equal share of it.

    The form for efforts of set power to exhaustion. Source: simpson-2017.
    """
    from scipy.optimize import least_squares

    start = power_against_inverse_time(duration_s, power_w)
    lowest = float(power_w.min())

    def misses(x: Array) -> Array:
        return np.asarray(np.log(duration_s * (power_w - x[0])) - x[1])

    def slopes(x: Array) -> Array:
        return np.column_stack([-1.0 / (power_w - x[0]), -np.ones_like(power_w)])

    critical = min(start.critical_power_w, lowest - 1e-3 * lowest)
    fit = least_squares(
        misses,
        [critical, np.log(start.w_prime_j)],
        jac=slopes,
        x_scale=[critical, 1.0],
        bounds=([-np.inf, -np.inf], [lowest * (1.0 - 1e-9), np.inf]),
        xtol=1e-15,
        ftol=1e-15,
        gtol=1e-15,
    )
    w_prime = float(np.exp(fit.x[1]))
    by_parameters = slopes(fit.x) / np.array([1.0, w_prime])
    return _checked("time against power", np.array([fit.x[0], w_prime]), by_parameters, fit.fun)


def three_parameter(duration_s: Array, power_w: Array) -> FormFit:
    """t = W′/(P − CP) − W′/(Pmax − CP); each effort's power is uncertain by an equal share.

    Fitted with the asymptote k = W′/(Pmax − CP) as third parameter, P = CP + W′/(t + k).

    Source: morton-1996.
    """
    from scipy.optimize import least_squares

    start = power_against_inverse_time(duration_s, power_w)

    def misses(x: Array) -> Array:
        return np.asarray(np.log(np.maximum(x[0] + x[1] / (duration_s + x[2]), 1e-9) / power_w))

    fit = least_squares(
        misses,
        [start.critical_power_w, start.w_prime_j, 10.0],
        x_scale=[start.critical_power_w, start.w_prime_j, 10.0],
        bounds=([0.0, 0.0, 1e-6], [np.inf, np.inf, LONGEST_ASYMPTOTE_S]),
        jac="3-point",
        xtol=1e-15,
        ftol=1e-15,
        gtol=1e-15,
    )
    critical, w_prime, k = fit.x.tolist()
    peak = critical + w_prime / k
    # (CP, W′, k) to (CP, W′, Pmax)
    change = np.array([[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [1.0, 1.0 / k, -w_prime / k**2]])
    by_parameters = np.asarray(fit.jac) @ np.linalg.inv(change)
    return _checked("three-parameter", np.array([critical, w_prime, peak]), by_parameters, fit.fun)


def _solved(design: Array, values: Array) -> Array:
    return np.asarray(np.linalg.lstsq(design, values, rcond=None)[0], dtype=float)


def _checked(name: str, solution: Array, design: Array, misses: Array) -> FormFit:
    """The fit with its covariance, from the scatter left and the design in the same units."""
    if solution[0] <= 0.0 or solution[1] <= 0.0:
        raise _unusable(solution)
    free = misses.size - solution.size
    covariance, scatter = None, None
    if free > 0:
        variance = float(misses @ misses) / free
        scale = np.linalg.norm(design, axis=0)
        inner = np.linalg.inv((design / scale).T @ (design / scale))
        covariance = np.asarray(variance * inner / np.outer(scale, scale))
        scatter = float(np.sqrt(variance))
    return FormFit(name, tuple(solution.tolist()), covariance, free, scatter)


def _unusable(solution: Array) -> UnusableInputError:
    return UnusableInputError(
        f"efforts that give a critical power of {solution[0]:.0f} W and W′ of"
        f" {solution[1] / 1000.0:.1f} kJ",
        expected="shorter efforts at more power, longer ones at less, all of them maximal",
    )
