"""The rider: positions, critical power, and the energy budget above it."""

from pacing.rider.position import Position
from pacing.rider.rider import FIT_FORMS, LONG_DECLINE_SHARE, Rider

__all__ = ["FIT_FORMS", "LONG_DECLINE_SHARE", "Position", "Rider"]
