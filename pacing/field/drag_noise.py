"""How the errors of neighbouring stretches hang together, and how large they are.

Three causes: an error at each end of a stretch (heights, speed), shared with the stretch that
begins there; a random walk (drift of the barometer, posture, road); and gusts, whose work grows
with air density, drag area and the square of the speed, and which neighbours feel alike.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.linalg.lapack import dpbtrf, dtbtrs

from pacing.errors import OurFaultError
from pacing.field.drag_segments import Segments

Array = NDArray[np.float64]

GUST_S = 15.0
"""How long a gust is felt: the error of the wind forgets over this time (common practice)."""
MOST_ALIKE = 0.45
LOG_SD = 1.0
MOST_ITERATIONS = 15
LONGEST_STEP, NEAR_ENOUGH = 0.8, 0.03


@dataclass(frozen=True)
class Noise:
    """Covariance of the stretches per unit of each cause: ``causes`` (3, 2, K), lower bands.

    In order: errors at the ends, a random walk, gusts. ``typical`` (3,) are the standard
    deviations expected beforehand [J, J/√s, m/s], known within a factor of about e either way.
    """

    causes: Array
    typical: Array

    def band(self, log_sd: Array) -> Array:
        """Covariance of the stretches as a lower band (2, K)."""
        size = np.exp(2.0 * log_sd)
        first, second, third = self.causes
        return np.asarray(size[0] * first + size[1] * second + size[2] * third)

    def times(self, values: Array) -> Array:
        """Each cause's covariance per unit, times ``values`` (…, K): (3, …, K)."""
        wide = (3, *(1,) * (values.ndim - 1), values.shape[-1])
        middle, beside = self.causes[:, 0].reshape(wide), self.causes[:, 1].reshape(wide)
        found = middle * values
        found[..., :-1] += beside[..., :-1] * values[..., 1:]
        found[..., 1:] += beside[..., :-1] * values[..., :-1]
        return np.asarray(found)


def noise_of(segments: Segments, *, lasting_s: Array, gust_w: Array, typical: Array) -> Noise:
    """The causes for stretches (K,) lasting so long, in which a gust of 1 m/s takes ``gust_w``."""
    weight = segments.node_weight
    causes = np.zeros((3, 2, len(segments)))
    causes[0, 0] = weight[:, 0] ** 2 + weight[:, 1] ** 2
    causes[1, 0] = lasting_s
    span = lasting_s / GUST_S
    causes[2, 0] = 2.0 * (GUST_S * gust_w) ** 2 * (span - 1.0 + np.exp(-span))
    if len(segments) > 1:
        shared = segments.shared()
        causes[0, 1, :-1] = -np.where(shared, weight[:-1, 1] * weight[1:, 0], 0.0)
        tail = GUST_S * gust_w * (1.0 - np.exp(-span))
        # Only neighbours are held to be alike; more than this would be no covariance.
        most = MOST_ALIKE * np.sqrt(causes[2, 0, 1:] * causes[2, 0, :-1])
        causes[2, 1, :-1] = np.where(shared, np.minimum(tail[1:] * tail[:-1], most), 0.0)
    return Noise(causes, typical)


class Whitening:
    """The inverse root of a banded covariance, and the logarithm of its determinant."""

    def __init__(self, band: Array) -> None:
        root, info = dpbtrf(band, lower=1)
        if info != 0:
            raise OurFaultError("The covariance of the stretches is not positive.")
        self.root = root
        self.log_determinant = 2.0 * float(np.sum(np.log(root[0])))

    def __call__(self, columns: Array) -> Array:
        """``columns`` (K,) or (K, p) with errors made independent and of size one."""
        return self._solved(columns, "N")

    def inverse_times(self, columns: Array) -> Array:
        """The inverse covariance times ``columns`` (K,) or (K, p)."""
        return self._solved(self._solved(columns, "N"), "T")

    def _solved(self, columns: Array, transposed: str) -> Array:
        white, info = dtbtrs(self.root, columns, uplo="L", trans=transposed)
        if info != 0:
            raise OurFaultError("The covariance of the stretches is singular.")
        return np.asarray(white)

    def inverse_band(self) -> Array:
        """Diagonal and first side diagonal (2, K) of the inverse covariance.

        Source: takahashi-1973 (elements of the inverse within the band).
        """
        first = (1.0 / self.root[0]).tolist()
        ratio = (self.root[1] / self.root[0]).tolist()
        diagonal, beside = [first[-1] ** 2], [0.0]
        for i in range(len(first) - 2, -1, -1):
            side = -ratio[i] * diagonal[-1]
            beside.append(side)
            diagonal.append(first[i] ** 2 - ratio[i] * side)
        return np.array([diagonal[::-1], beside[::-1]])


def likeliest_log_sd(
    noise: Noise,
    residual: Array,
    slopes: Array,
    *,
    precision: Array,
    pull: Array,
    guess: Array,
) -> Array:
    """Logarithms (3,) of the likeliest standard deviations of the causes.

    Restricted likelihood: the unknowns, with ``slopes`` (K, p) and ``precision`` (p, p)
    beforehand, are integrated out about the current values, from which ``pull`` (p,) leads to
    their means; maximised with the average information.

    Source: patterson-thompson-1971 (restricted likelihood), gilmour-1995 (average information).
    """
    off = residual + slopes @ pull
    expected = np.log(noise.typical)
    log_sd, last, damping = guess, np.inf, 0.0
    best, step = guess, np.zeros_like(guess)
    for _ in range(MOST_ITERATIONS):
        found = _likelihood(noise, log_sd, slopes, precision, off, expected)
        if found.unlikely > last + 1e-6:
            step, damping = 0.4 * step, damping + 1.0
            log_sd = best + step
            continue
        best, last = log_sd, found.unlikely
        away = np.linalg.solve(found.curvature + damping * np.eye(3), found.slope)
        step = np.asarray(np.clip(-away, -LONGEST_STEP, LONGEST_STEP), dtype=float)
        if np.max(np.abs(step)) < NEAR_ENOUGH:
            break
        log_sd = best + step
    return best


class _Likelihood(NamedTuple):
    """Twice the negative logarithm, its slope (3,) and average information (3, 3)."""

    unlikely: float
    slope: Array
    curvature: Array


def _likelihood(
    noise: Noise, log_sd: Array, slopes: Array, precision: Array, off: Array, expected: Array
) -> _Likelihood:
    """The whole covariance is V + J Λ⁻¹ Jᵀ; only the band V is ever inverted (Woodbury)."""
    variance = 2.0 * np.exp(2.0 * log_sd)
    whiten = Whitening(noise.band(log_sd))
    by_slopes = whiten.inverse_times(slopes)
    inner = np.linalg.inv(slopes.T @ by_slopes + precision)
    a = whiten.inverse_times(off)
    a = a - by_slopes @ (inner @ (slopes.T @ a))
    _, log_inner = np.linalg.slogdet(inner)
    of_a = variance[:, None] * noise.times(a)
    columns = np.ascontiguousarray(by_slopes.T)
    lost = np.sum(noise.times(columns) * (inner @ columns), axis=(1, 2))
    inverse = whiten.inverse_band()
    trace = noise.causes[:, 0] @ inverse[0] + 2.0 * noise.causes[:, 1] @ inverse[1]
    solved = whiten.inverse_times(of_a.T)
    solved = solved - by_slopes @ (inner @ (slopes.T @ solved))
    away = (log_sd - expected) / LOG_SD
    return _Likelihood(
        whiten.log_determinant - float(log_inner) + float(off @ a) + float(away @ away),
        variance * (trace - lost) - of_a @ a + 2.0 * away / LOG_SD,
        of_a @ solved + 2.0 / LOG_SD**2 * np.eye(3),
    )
