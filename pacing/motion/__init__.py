"""Speed along the course, and its exact derivatives."""

from pacing.motion.road import Road, road_for
from pacing.motion.simulate import Mode, Motion, simulate_motion, simulate_motion_and_slopes

__all__ = ["Mode", "Motion", "Road", "road_for", "simulate_motion", "simulate_motion_and_slopes"]
