"""The race file: read, checked, defaults filled in; a frozen Race, and others made from it."""

from pacing.race.race import PlanSettings, Race, Uncertainty
from pacing.race.read import load_race
from pacing.race.variant import vary

__all__ = ["PlanSettings", "Race", "Uncertainty", "load_race", "vary"]
