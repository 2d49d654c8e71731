"""The optimum, and what a person can follow of it."""

from pacing.plan.plan import Plan, plan_race

__all__ = ["Plan", "plan_race"]
