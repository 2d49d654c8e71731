"""What a wind that could not be told from the drag still does.

Work against the air goes with the square of the wind, which does not average out: a cross wind
that nobody knows of looks like rolling resistance. How strong it may be is judged from how far
the wind that could be told was off the forecast.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.field.drag_session import Session
from pacing.field.drag_unknowns import Unknowns

Array = NDArray[np.float64]

MOST_OFF = 1.25
"""Forecast errors are taken as anything up to so many times the standard deviation stated."""
_SCALES = np.linspace(0.01, MOST_OFF, 120)


class UnknownWind(NamedTuple):
    """Covariance of each ride's wind (R, 2, 2) or (R, 1, 1) [m²/s²] as far as it is unknown.

    ``mean`` and ``sd`` (R,) scale it: the mean of the square of what is unknown and its
    standard deviation, over that covariance.
    """

    covariance: Array
    mean: Array
    sd: Array

    def squares(self, session: Session) -> tuple[Array, Array]:
        """What flow·along gains on average by it, and the standard deviation, at each step (S,)."""
        spread = self.covariance[session.ride]
        if not session.headed:
            here = spread[:, 0, 0]
        else:
            ee, nn, en = spread[:, 0, 0], spread[:, 1, 1], spread[:, 0, 1]
            sine, cosine = session.sine, session.cosine
            along = ee * sine**2 + nn * cosine**2 + 2.0 * en * sine * cosine
            across = ee * cosine**2 + nn * sine**2 - 2.0 * en * sine * cosine
            # d²(flow·along) is 2 along and 1 across, where the rider outruns the wind
            here = along + 0.5 * across
        here = here * session.wind_share**2
        return here * self.mean[session.ride], here * self.sd[session.ride]


def no_unknown_wind(rides: int) -> UnknownWind:
    """Nothing unknown, to begin with."""
    return UnknownWind(np.zeros((rides, 2, 2)), np.zeros(rides), np.zeros(rides))


def unknown_wind(
    session: Session, unknowns: Unknowns, theta: Array, covariance: Array
) -> UnknownWind:
    """What is unknown of the wind under the ``covariance`` (p, p) of the unknowns ``theta``."""
    first, wide = unknowns.start("wind"), 2 if session.headed else 1
    blocks, means, sds = [], [], []
    for number in range(len(session.rides)):
        here = slice(first + wide * number, first + wide * (number + 1))
        block = covariance[here, here]
        precision = unknowns.precision[here, here]
        off = theta[here] - unknowns.mean[here]
        told = float(wide - np.trace(block @ precision))
        mean, sd = _square(float(off @ precision @ off), max(told, 0.0))
        blocks.append(block)
        means.append(mean)
        sds.append(sd)
    return UnknownWind(np.stack(blocks), np.array(means), np.array(sds))


def _square(off_square: float, told: float) -> tuple[float, float]:
    """Mean and standard deviation of the square of an unknown component, stated sd as unit.

    The size of the forecast's error is anything up to `MOST_OFF`; ``told`` components of it are
    known and their squares sum to ``off_square``.
    """
    weight = _SCALES**-told * np.exp(-0.5 * (off_square + 4e-4 * told) / _SCALES**2)
    weight /= weight.sum()
    second, fourth = float(weight @ _SCALES**2), float(weight @ _SCALES**4)
    # The square is skewed: it cannot be below 0, and reaches less far down than up.
    return second, 0.6 * float(np.sqrt(max(3.0 * fourth - second**2, 0.0)))
