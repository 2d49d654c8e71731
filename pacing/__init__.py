"""Pacing plans for cycling time trials, from a course file and a rider to a cue sheet.

>>> import pacing
>>> race = pacing.load_race("race.toml")  # doctest: +SKIP
>>> plan = pacing.plan_race(race)  # doctest: +SKIP
>>> plan.save("out")  # doctest: +SKIP
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from pacing.course import load_course as load_course
    from pacing.errors import CannotBeRiddenError as CannotBeRiddenError
    from pacing.errors import OurFaultError as OurFaultError
    from pacing.errors import PacingError as PacingError
    from pacing.errors import UnusableInputError as UnusableInputError
    from pacing.field import debrief_ride as debrief_ride
    from pacing.field import fit_drag as fit_drag
    from pacing.field import fit_power as fit_power
    from pacing.plan import Plan as Plan
    from pacing.plan import plan_race as plan_race
    from pacing.race import Race as Race
    from pacing.race import load_race as load_race
    from pacing.race import vary as vary

__version__ = "0.1.0"

_HOMES = {
    "load_course": "pacing.course",
    "CannotBeRiddenError": "pacing.errors",
    "OurFaultError": "pacing.errors",
    "PacingError": "pacing.errors",
    "UnusableInputError": "pacing.errors",
    "debrief_ride": "pacing.field",
    "fit_drag": "pacing.field",
    "fit_power": "pacing.field",
    "Plan": "pacing.plan",
    "plan_race": "pacing.plan",
    "Race": "pacing.race",
    "load_race": "pacing.race",
    "vary": "pacing.race",
}
__all__ = ["__version__", *_HOMES]


def __getattr__(name: str) -> Any:
    """Imports a public name when it is first asked for, so that ``import pacing`` stays quick."""
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(_HOMES[name]), name)


def __dir__() -> list[str]:
    return sorted(__all__)
