"""What the rider moves through: density and wind."""

from pacing.air.day import Day, Weather
from pacing.air.wind import SURROUNDINGS, Wind

__all__ = ["SURROUNDINGS", "Day", "Weather", "Wind"]
