"""From rides and tests back to numbers."""

from pacing.field.debrief import Debrief, debrief_ride
from pacing.field.drag_fit import fit_drag
from pacing.field.drag_result import DragFit
from pacing.field.power_fit import fit_power
from pacing.field.power_result import PowerFit

__all__ = ["Debrief", "DragFit", "PowerFit", "debrief_ride", "fit_drag", "fit_power"]
