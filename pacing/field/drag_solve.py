"""The likeliest unknowns of an energy balance, how sure they are, and what makes them unsure."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from pacing.field.drag_noise import Whitening, likeliest_log_sd, noise_of
from pacing.field.drag_system import System
from pacing.field.drag_wind import unknown_wind

Array = NDArray[np.float64]

STEPS_BY_ROUND = (3, 1, 1)
BATCH, FEWEST_BATCHES = 8, 4
SPENT_ON_SCATTER = 2.0
"""Degrees of freedom that go into estimating the scatter itself."""


@dataclass(frozen=True)
class Solved:
    """Unknowns ``theta`` (p,) with their ``covariance`` (p, p).

    ``scatter`` (p, p) is the part of it that comes from the scatter of the stretches;
    ``bare`` (p, p) the covariance were the scatter known,
    ``freedom`` the degrees of freedom that scatter is known by. ``left_j`` (K,) is the work left
    over in each stretch, ``white`` (K,) the same with errors made independent and of size one;
    ``log_sd`` (3,) the size of the causes of scatter; ``wandering`` by how much its variance was
    raised since long batches of stretches err alike.
    """

    system: System
    theta: Array
    covariance: Array
    scatter: Array
    freedom: float
    bare: Array
    left_j: Array
    white: Array
    log_sd: Array
    band: Array
    wandering: float = 1.0

    def budget(self, direction: Array) -> dict[str, float]:
        """Variance of ``direction``·theta by cause; they add up to the whole.

        The part of what is known beforehand is split by what each error known there adds.
        """
        u = self.system.unknowns
        scatter = float(direction @ self.scatter @ direction)
        through = self.bare @ direction
        found = {"scatter": scatter}
        for cause in dict.fromkeys(u.cause):
            here = np.array([c == cause for c in u.cause])
            part = np.where(here, through, 0.0)
            found[cause] = float(part @ u.precision @ part)
        return found

    def variance(self, direction: Array) -> float:
        """Variance of ``direction``·theta."""
        return float(direction @ self.covariance @ direction)

    def half_width(self, direction: Array, level: float = 0.95) -> float:
        """Half the width of the interval of ``direction``·theta.

        Scatter that is itself estimated counts by its degrees of freedom, what is known
        beforehand does not (Source: welch-1947).
        """
        from scipy.stats import t as student

        whole = self.variance(direction)
        scatter = float(direction @ self.scatter @ direction)
        share = min(max(scatter / whole, 1e-9), 1.0) if whole > 0.0 else 1.0
        freedom = self.freedom / share**2
        return float(student.ppf(0.5 + level / 2.0, freedom)) * float(np.sqrt(max(whole, 0.0)))


def solve_balance(system: System, *, typical: Array, theta: Array | None = None) -> Solved:
    """Bring all stretches into balance: Gauss-Newton, with the scatter estimated on the way.

    ``typical`` (3,) is the scatter expected beforehand, see `Noise`.
    """
    u = system.unknowns
    theta = u.mean.copy() if theta is None else theta.copy()
    log_sd = np.log(typical)
    free = ~u.fixed
    precision = u.precision[np.ix_(free, free)]
    for steps in STEPS_BY_ROUND:
        noise = noise_of(
            system.segments,
            lasting_s=system.lasting_s,
            gust_w=system.gust_w(theta),
            typical=typical,
        )
        whiten = Whitening(noise.band(log_sd))
        for _ in range(steps):
            left, slopes = system.balance(theta)
            step, spread = _step(whiten, left, slopes[:, free], precision, (u.mean - theta)[free])
            theta[free] += step
        unknown = unknown_wind(system.session, u, theta, _spread_out(spread, free))
        system = replace(system, wind=unknown)
        left, slopes = system.balance(theta)
        log_sd = likeliest_log_sd(
            noise,
            left,
            slopes[:, free],
            precision=precision,
            pull=(u.mean - theta)[free],
            guess=log_sd,
        )
    solved = _finish(system, theta, noise.band(log_sd), log_sd)
    ratio, batches = _slow_wandering(solved)
    if ratio <= 1.0:
        return solved
    log_sd = log_sd + 0.5 * np.log(ratio)
    slower = _finish(system, solved.theta, noise.band(log_sd), log_sd)
    return replace(slower, freedom=min(slower.freedom, float(batches)), wandering=ratio)


def _slow_wandering(solved: Solved) -> tuple[float, int]:
    """How much larger than by chance the sums over long batches are, and the number of batches.

    Wind, road and posture change over minutes to hours: then neighbouring stretches err alike,
    and so many of them are worth fewer. 1 unless chance would do it less than one time in twenty.
    """
    from scipy.stats import chi2

    system = solved.system
    squares: list[float] = []
    for number in range(len(system.session.rides)):
        white = solved.white[system.ride == number]
        count = white.size // BATCH
        if count >= 2:
            parts = np.array_split(white, count)
            squares += [float(part.sum() ** 2 / part.size) for part in parts]
    if len(squares) < FEWEST_BATCHES:
        return 1.0, 0
    ratio = float(np.mean(squares))
    limit = float(chi2.ppf(0.95, len(squares))) / len(squares)
    return (ratio, len(squares)) if ratio > limit else (1.0, len(squares))


def _step(
    whiten: Whitening, left: Array, slopes: Array, precision: Array, pull: Array
) -> tuple[Array, Array]:
    """The step of the free unknowns to balance, and their covariance."""
    white = whiten(np.column_stack([left, slopes]))
    r, x = white[:, 0], white[:, 1:]
    covariance = np.linalg.inv(x.T @ x + precision)
    return np.asarray(covariance @ (precision @ pull - x.T @ r)), np.asarray(covariance)


def _spread_out(covariance: NDArray[np.floating[Any]], free: NDArray[np.bool_]) -> Array:
    """A covariance of the free unknowns among all, zero for those known exactly."""
    whole = np.zeros((free.size, free.size))
    whole[np.ix_(free, free)] = covariance
    return whole


def _finish(system: System, theta: Array, band: Array, log_sd: Array) -> Solved:
    """Two more steps under the final scatter, then the covariances."""
    u = system.unknowns
    free = ~u.fixed
    precision = u.precision[np.ix_(free, free)]
    whiten = Whitening(band)
    for _ in range(2):
        left, slopes = system.balance(theta)
        step, _ = _step(whiten, left, slopes[:, free], precision, (u.mean - theta)[free])
        theta[free] += step
    left, slopes = system.balance(theta)
    white = whiten(np.column_stack([left, slopes[:, free]]))
    x = white[:, 1:]
    data = x.T @ x
    inverse = np.linalg.inv(data + precision)
    scatter = inverse @ data @ inverse
    freedom = max(len(system.segments) - float(np.trace(inverse @ data)), SPENT_ON_SCATTER + 1.0)
    # The scatter was estimated from the same stretches, which makes it look too small.
    more = freedom / (freedom - SPENT_ON_SCATTER) - 1.0
    return Solved(
        system=system,
        theta=theta,
        covariance=_spread_out(inverse + more * scatter, free),
        scatter=_spread_out((1.0 + more) * scatter, free),
        bare=_spread_out(inverse, free),
        freedom=freedom - SPENT_ON_SCATTER,
        left_j=left,
        white=white[:, 0],
        log_sd=log_sd,
        band=band,
    )
