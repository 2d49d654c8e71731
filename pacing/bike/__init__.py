"""The bicycle: drag area, rolling, bearings, gears, and the forces they make."""

from pacing.bike.bike import BEARINGS, Bike
from pacing.bike.drag_area import CONVENTIONS, DragArea

__all__ = ["BEARINGS", "CONVENTIONS", "Bike", "DragArea"]
