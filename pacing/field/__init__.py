"""From rides and tests back to numbers."""

from pacing.field.power_fit import fit_power
from pacing.field.power_result import PowerFit

__all__ = ["PowerFit", "fit_power"]
