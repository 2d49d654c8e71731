"""Drag area against yaw, on the road's axis: smooth, exact in its slope, quick to evaluate.

Everything is tabled over sin² of yaw. A drag area is even in yaw, so this is the natural
variable: the slope at 0° is zero by itself, a wind from behind 90° is treated as its mirror
image 180° − yaw without a kink, and no arctangent is needed in the innermost loop.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Literal, NamedTuple, get_args

import numpy as np
from numpy.typing import NDArray

from pacing.errors import UnusableInputError

Array = NDArray[np.float64]
Floats = float | Array | Sequence[float]
Convention = Literal["road", "axial", "tunnel"]

CONVENTIONS: tuple[str, ...] = get_args(Convention)
SINGLE_VALUE_TO_DEG = 30.0
"""A single axial or tunnel value is taken to hold up to this yaw, in its own convention."""
TUNNEL_TO_DEG = 80.0


class DragAreaAndSlope(NamedTuple):
    """A drag area in m² and its slope in the named variable, both of the argument's shape."""

    m2: Array
    slope: Array


@dataclass(frozen=True)
class DragArea:
    """Force along the road over ½ρ·flow·along, in m², against yaw.

    ``yaw_deg`` and ``m2`` are the table, yaw rising within 0 to 90°. Between its entries the
    curve is a cubic without overshoot, before the first and after the last it is held. A table
    may be negative (a change added to another). ``slope_m2`` is dm²/d(sin² yaw) at the entries,
    chosen here unless given.
    """

    yaw_deg: tuple[float, ...]
    m2: tuple[float, ...]
    slope_m2: tuple[float, ...] = ()
    _knots: Array = field(init=False, repr=False, compare=False)
    _cubics: Array = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        yaw, value = _checked_table(self.yaw_deg, self.m2)
        knots = np.sin(np.radians(yaw)) ** 2
        if len(self.slope_m2):
            slope = np.asarray(self.slope_m2, dtype=float)
        else:
            slope = _slopes_without_overshoot(knots, value, from_zero=yaw[0] == 0.0)
        for name, column in (("yaw_deg", yaw), ("m2", value), ("slope_m2", slope)):
            object.__setattr__(self, name, tuple(column.tolist()))
        object.__setattr__(self, "_knots", knots)
        object.__setattr__(self, "_cubics", _cubics(knots, value, slope))

    @classmethod
    def from_convention(cls, yaw_deg: Floats, m2: Floats, convention: str = "road") -> DragArea:
        """A drag area given in one of the conventions in use, brought to the road's axis.

        ``yaw_deg`` and ``m2`` (n,) or single numbers. "road": force along the road over
        ½ρ·flow·along. "axial": over ½ρ·along² (field tests, Martin 1998), times cos yaw.
        "tunnel": body-axis force over ½ρ·flow², divided by cos yaw. The conversion is exact at
        every whole degree of the table, not only at its entries.

        Raises `UnusableInputError` on an unknown convention or a table that is not one.
        """
        if convention not in CONVENTIONS:
            raise UnusableInputError(
                f"{convention!r} is no drag-area convention", expected=" or ".join(CONVENTIONS)
            )
        given = cls(_as_tuple(yaw_deg), _as_tuple(m2))
        if convention == "road":
            return given
        last = SINGLE_VALUE_TO_DEG if len(given.m2) == 1 else given.yaw_deg[-1]
        if convention == "tunnel" and last > TUNNEL_TO_DEG:
            raise UnusableInputError(
                f"a tunnel table up to {last:g}° of yaw",
                expected=f"at most {TUNNEL_TO_DEG:g}°, where a force on the road axis still means"
                " something",
            )
        fine = np.unique(np.concatenate([np.arange(0.0, last), [last], given.yaw_deg]))
        fine = fine[fine <= last]
        cosine = np.cos(np.radians(fine))
        values = given.m2_at(np.radians(fine)) * (cosine if convention == "axial" else 1 / cosine)
        return cls(_as_tuple(fine), _as_tuple(values))

    @property
    def constant(self) -> bool:
        """Whether yaw makes no difference."""
        return not self._cubics.size

    def m2_at(self, yaw_rad: Floats) -> Array:
        """Drag area at ``yaw_rad`` (any shape, either sign)."""
        return self.m2_and_slope_in_sin2(np.sin(np.asarray(yaw_rad)) ** 2).m2

    def m2_and_slope(self, yaw_rad: Floats) -> DragAreaAndSlope:
        """Drag area at ``yaw_rad`` (any shape) and its exact slope per radian."""
        yaw = np.asarray(yaw_rad)
        value, slope = self.m2_and_slope_in_sin2(np.sin(yaw) ** 2)
        return DragAreaAndSlope(value, slope * np.sin(2.0 * yaw))

    def m2_and_slope_in_sin2(self, sin2_yaw: Array) -> DragAreaAndSlope:
        """Drag area where sin² of yaw is ``sin2_yaw``, and its exact slope in that."""
        if self.constant:
            return DragAreaAndSlope(np.full_like(sin2_yaw, self.m2[0]), np.zeros_like(sin2_yaw))
        knots = self._knots
        inside = np.minimum(np.maximum(sin2_yaw, knots[0]), knots[-1])
        piece = np.searchsorted(knots[1:-1], inside.real, side="right")
        x = inside - knots.take(piece)
        c0, c1, c2, c3 = (row.take(piece) for row in self._cubics)
        value = ((c3 * x + c2) * x + c1) * x + c0
        slope = (3.0 * c3 * x + 2.0 * c2) * x + c1
        # No test for the held ends: the curve meets them with slope zero, save at 0° itself.
        return DragAreaAndSlope(value, slope)

    def plus(self, change_m2: float) -> DragArea:
        """The same curve, ``change_m2`` higher at every yaw."""
        return DragArea(self.yaw_deg, tuple(v + change_m2 for v in self.m2), self.slope_m2)

    def scaled(self, factor: float) -> DragArea:
        """The same curve times ``factor``."""
        return DragArea(
            self.yaw_deg,
            tuple(v * factor for v in self.m2),
            tuple(s * factor for s in self.slope_m2),
        )

    def __add__(self, other: DragArea) -> DragArea:
        """The exact sum of two curves (a position's and a bicycle's change)."""
        if other.constant:
            return self.plus(other.m2[0])
        if self.constant:
            return other.plus(self.m2[0])
        yaw = np.union1d(self.yaw_deg, other.yaw_deg)
        sin2 = np.sin(np.radians(yaw)) ** 2
        mine, others = self.m2_and_slope_in_sin2(sin2), other.m2_and_slope_in_sin2(sin2)
        return DragArea(
            _as_tuple(yaw),
            _as_tuple(mine.m2 + others.m2),
            _as_tuple(mine.slope + others.slope),
        )


def _as_tuple(values: Floats) -> tuple[float, ...]:
    return tuple(np.atleast_1d(np.asarray(values, dtype=float)).tolist())


def _checked_table(yaw_deg: Floats, m2: Floats) -> tuple[Array, Array]:
    yaw = np.atleast_1d(np.asarray(yaw_deg, dtype=float))
    value = np.atleast_1d(np.asarray(m2, dtype=float))
    if yaw.ndim != 1 or yaw.shape != value.shape or not yaw.size:
        raise UnusableInputError(
            f"{yaw.size} yaw angles and {value.size} drag areas", expected="one of each per entry"
        )
    if not (np.all(np.isfinite(yaw)) and np.all(np.isfinite(value))):
        raise UnusableInputError("a drag-area table with a value that is not finite")
    if yaw[0] < 0.0 or yaw[-1] > 90.0 or np.any(np.diff(yaw) <= 0.0):
        raise UnusableInputError(
            f"yaw angles {', '.join(f'{a:g}' for a in yaw)}", expected="rising within 0 to 90°"
        )
    return yaw, value


def _slopes_without_overshoot(knots: Array, value: Array, *, from_zero: bool) -> Array:
    """Slopes at the knots of a cubic that rises and falls only where the table does.

    Source: fritsch-butland-1984 (weighted harmonic mean, the end by three points).
    """
    slope = np.zeros_like(value)
    if value.size == 1:
        return slope
    step = np.diff(knots)
    rise = np.diff(value) / step
    if value.size > 2:
        first, second = 2.0 * step[1:] + step[:-1], step[1:] + 2.0 * step[:-1]
        same_way = rise[:-1] * rise[1:] > 0.0
        below, above = np.where(same_way, rise[:-1], 1.0), np.where(same_way, rise[1:], 1.0)
        slope[1:-1] = np.where(same_way, (first + second) / (first / below + second / above), 0.0)
    if from_zero:
        slope[0] = _end_slope(step, rise)
    return slope


def _end_slope(step: Array, rise: Array) -> float:
    if rise.size == 1:
        return float(rise[0])
    end = ((2.0 * step[0] + step[1]) * rise[0] - step[0] * rise[1]) / (step[0] + step[1])
    if end * rise[0] <= 0.0:
        return 0.0
    if rise[0] * rise[1] < 0.0 and abs(end) > 3.0 * abs(rise[0]):
        return float(3.0 * rise[0])
    return float(end)


def _cubics(knots: Array, value: Array, slope: Array) -> Array:
    """Coefficients (4, n−1), constant term first, of the Hermite cubics; none if all is equal."""
    if np.all(value == value[0]) and not np.any(slope):
        return np.empty((4, 0))
    step = np.diff(knots)
    rise = np.diff(value) / step
    square = (3.0 * rise - 2.0 * slope[:-1] - slope[1:]) / step
    cube = (slope[:-1] + slope[1:] - 2.0 * rise) / step**2
    return np.vstack([value[:-1], slope[:-1], square, cube])
