"""What a fit of critical power found, and what can be said of its error."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from pacing.field.power_forms import FormFit
from pacing.field.power_shares import PositionShare

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Effort:
    """One maximal effort and how it lies to the fitted curve.

    ``residual_w`` is measured less fitted, in the position it was ridden in. ``flagged`` says
    why it is doubted or was left out, empty if neither.
    """

    duration_s: float
    power_w: float
    residual_w: float
    flagged: str = ""
    used: bool = True
    position: str = ""


@dataclass(frozen=True)
class PowerFit:
    """Critical power and W′; errors are standard errors, None where they cannot be told.

    ``form`` is "two-parameter" (``chosen`` says which of ``forms``) or "three-parameter", ``why``
    the reason. ``shares`` is empty unless efforts name more than one position.
    """

    critical_power_w: float
    critical_power_se_w: float | None
    w_prime_j: float
    w_prime_se_j: float | None
    peak_power_w: float | None
    peak_power_se_w: float | None
    form: str
    why: str
    chosen: FormFit
    forms: tuple[FormFit, ...]
    efforts: tuple[Effort, ...]
    shares: tuple[PositionShare, ...]
    warnings: tuple[str, ...]

    @property
    def covariance(self) -> Array | None:
        """Covariance (2, 2) of CP (W) and W′ (J)."""
        whole = self.chosen.covariance
        return None if whole is None else whole[:2, :2]

    def power_at_w(self, duration_s: ArrayLike) -> Array:
        """The fitted curve, in the tested position."""
        return self.chosen.power_w(np.asarray(duration_s, dtype=float))

    def half_band_w(self, duration_s: ArrayLike, level: float = 0.95) -> Array | None:
        """Half the width of the curve's confidence band at each duration."""
        from scipy.stats import t as student

        if self.chosen.covariance is None:
            return None
        duration = np.atleast_1d(np.asarray(duration_s, dtype=float))
        slopes = self.chosen.slopes(duration)
        variance = np.einsum("ij,jk,ik->i", slopes, self.chosen.covariance, slopes)
        factor = float(student.ppf(0.5 + level / 2.0, self.chosen.degrees_of_freedom))
        return np.asarray(factor * np.sqrt(np.maximum(variance, 0.0)))

    def intervals(self, level: float = 0.95) -> tuple[tuple[float, float], ...] | None:
        """Confidence interval of CP (W), W′ (J) and, with three parameters, Pmax (W)."""
        from scipy.stats import t as student

        errors = self.chosen.standard_errors
        if errors is None:
            return None
        factor = float(student.ppf(0.5 + level / 2.0, self.chosen.degrees_of_freedom))
        pairs = zip(self.chosen.parameters, errors, strict=True)
        return tuple((value - factor * error, value + factor * error) for value, error in pairs)

    def joint_region(self, level: float = 0.95, points: int = 120) -> Array | None:
        """Edge of the joint confidence region (points, 2) of CP (W) and W′ (J)."""
        from scipy.stats import f as fisher

        covariance = self.covariance
        if covariance is None:
            return None
        radius = np.sqrt(2.0 * float(fisher.ppf(level, 2, self.chosen.degrees_of_freedom)))
        angle = np.linspace(0.0, 2.0 * np.pi, points)
        circle = np.column_stack([np.cos(angle), np.sin(angle)])
        scale = np.sqrt(np.diag(covariance))
        scale = np.where(scale > 0.0, scale, 1.0)
        values, vectors = np.linalg.eigh(covariance / np.outer(scale, scale))
        root = vectors * np.sqrt(np.maximum(values, 0.0))
        centre = np.array([self.critical_power_w, self.w_prime_j])
        return np.asarray(centre + radius * (circle @ root.T) * scale)
