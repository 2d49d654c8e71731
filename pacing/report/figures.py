"""Two pictures of a plan: four strips over distance, and the course seen from above."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from pacing.report import course_map, profile, style

if TYPE_CHECKING:
    from pacing.plan.plan import Plan

DPI = 150


def save_profile(plan: Plan, file: Path) -> None:
    """Write ``profile.png``: height, power, speed and W′ left over one distance axis."""
    with style.applied():
        figure = profile.figure(plan)
        figure.savefig(file, format="png", dpi=DPI, metadata=style.PNG_METADATA)


def save_map(plan: Plan, file: Path) -> None:
    """Write ``map.png``: the course from above, coloured by share of critical power."""
    with style.applied():
        figure = course_map.figure(plan)
        figure.savefig(file, format="png", dpi=DPI, metadata=style.PNG_METADATA)
