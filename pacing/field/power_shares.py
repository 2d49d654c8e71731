"""Power shares of positions, from maximal efforts ridden in more than one."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.errors import UnusableInputError
from pacing.field.power_forms import FormFit

Array = NDArray[np.float64]


@dataclass(frozen=True)
class PositionShare:
    """Power in a position over that in the tested one; ``se`` None where it cannot be told."""

    position: str
    power_share: float
    se: float | None
    efforts: int


def tested_position(positions: tuple[str, ...]) -> str:
    """The position with the most efforts, the first of them in a draw."""
    return Counter(positions).most_common(1)[0][0]


def fit_shares(
    duration_s: Array, power_w: Array, positions: tuple[str, ...]
) -> tuple[tuple[PositionShare, ...], FormFit]:
    """Shares of all positions, the tested one first with share 1, and the curve they lie on.

    P = share · (W′/t + CP), all numbers fitted together, so that the errors of CP and W′ carry
    those of the shares; power is uncertain by an equal share of it.
    Raises `UnusableInputError` where the efforts are fewer than two and one for every further
    position.
    """
    from scipy.optimize import least_squares

    tested = tested_position(positions)
    others = [name for name in dict.fromkeys(positions) if name != tested]
    count = Counter(positions)
    reference = PositionShare(tested, 1.0, 0.0, count[tested])
    free = duration_s.size - 2 - len(others)
    if free < 0:
        raise UnusableInputError(
            f"{duration_s.size} efforts in {len(count)} positions",
            expected="two efforts and one more for every further position",
        )
    member = np.array([[name == other for other in others] for name in positions], dtype=float)

    def misses(x: Array) -> Array:
        curve = np.maximum(x[0] + x[1] / duration_s, 1e-9)
        return np.asarray(np.log(curve / power_w) + member @ x[2:])

    start = [0.8 * float(power_w.min()), 15_000.0]
    fit = least_squares(
        misses,
        [*start, *([0.0] * len(others))],
        x_scale=[*start, *([0.1] * len(others))],
        jac="3-point",
        xtol=1e-15,
        ftol=1e-15,
        gtol=1e-15,
    )
    share = np.exp(fit.x[2:])
    errors: list[float | None] = [None] * len(others)
    covariance, scatter = None, None
    if free > 0:
        slopes = np.asarray(fit.jac)
        scale = np.linalg.norm(slopes, axis=0)
        normal = (slopes / scale).T @ (slopes / scale)
        if np.linalg.cond(normal) > 1e12:
            raise UnusableInputError(
                "positions and durations that cannot be told apart",
                expected="efforts of at least two durations in one position",
            )
        scatter = float(np.sqrt(fit.fun @ fit.fun / free))
        whole = scatter**2 * np.linalg.inv(normal) / np.outer(scale, scale)
        covariance = np.asarray(whole[:2, :2])
        errors = (share * np.sqrt(np.diag(whole)[2:])).tolist()
    curve = (float(fit.x[0]), float(fit.x[1]))
    if min(curve) <= 0.0:
        raise UnusableInputError(
            f"efforts that give a critical power of {curve[0]:.0f} W",
            expected="shorter efforts at more power than longer ones in the same position",
        )
    shares = tuple(
        PositionShare(name, float(s), e, count[name])
        for name, s, e in zip(others, share, errors, strict=True)
    )
    return (reference, *shares), FormFit(
        "power against 1/time, positions together", curve, covariance, free, scatter
    )
