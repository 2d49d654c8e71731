"""When to sit up: two positions over speed and gradient, and where the plan rides in which."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from pacing.report import style, words

if TYPE_CHECKING:
    from pacing.plan.plan import Plan

WIDE_MM, HIGH_MM = 150.0, 105.0
DOTS_PER_INCH = 150
SAID_PT = 8.0
MOST_NAME = 18


def save_positions(plan: Plan, file: Path) -> None:
    """Draw the positions of a plan with several into a PNG file."""
    with style.applied():
        figure(plan).savefig(file, format="png", dpi=DOTS_PER_INCH, metadata=style.PNG_METADATA)


def figure(plan: Plan) -> Figure:
    """One small picture; call inside ``style.applied()``. The plan has several positions."""
    assert plan.positions is not None
    found = plan.positions
    lower, upper = _name(found["lower"]), _name(found["upper"])
    units = words.units_named(plan.race.plan.units)
    picture = Figure(figsize=(style.inches(WIDE_MM), style.inches(HIGH_MM)))
    axes = picture.add_axes((0.09, 0.13, 0.88, 0.68))
    picture.text(0.09, 0.935, f"{lower} or {upper}", fontsize=style.TITLE_PT, fontweight="bold")
    said = _said(found, upper, units)
    picture.text(0.09, 0.885, said, fontsize=SAID_PT, color=style.GREY)
    faster = plan_speed(units)
    _draw_regions(axes, found["lines"], (lower, upper), faster)
    _draw_cues(axes, plan, faster)
    axes.set_xlabel("gradient, %")
    axes.set_title(f"speed, {units.speed}", loc="left", fontsize=9)
    axes.set_xlim(-3.0, 12.0)
    axes.set_ylim(bottom=0.0)
    style.quiet_axes(axes)
    return picture


def plan_speed(units: words.Units) -> float:
    """What a km/h is in the printed unit of speed."""
    return 1.0 if units.speed == "km/h" else 1.0 / 1.609344


def _said(found: Any, upper: str, units: words.Units) -> str:
    if found["crossover_kmh"] is None:
        return f"at the same effort {upper} is faster nowhere"
    speed = words.speed(found["crossover_kmh"] / 3.6, units)
    return (
        f"at {words.number(found['effort_w'])} W of effort, in calm air, {upper} is faster below "
        f"{speed} {units.speed}, above {words.number(found['crossover_gradient_pct'], 1)} %"
    )


def _draw_regions(axes: Axes, lines: Any, names: tuple[str, str], unit: float) -> None:
    gradient = np.array(lines["gradient_pct"])
    equal = unit * np.array([np.nan if v is None else v for v in lines["equal_kmh"]])
    lower, upper = (unit * np.array(lines[key]) for key in ("lower_kmh", "upper_kmh"))
    axes.plot(gradient, lower, color=style.INK, lw=1.3, label=f"{names[0]} at that effort")
    axes.plot(
        gradient, upper, color=style.INK, lw=1.3, ls=(0, (4, 2)), label=f"{names[1]} at that effort"
    )
    known = np.isfinite(equal)
    if not np.any(known):
        return
    axes.fill_between(gradient[known], 0.0, equal[known], color=style.FILL, lw=0, zorder=0)
    axes.text(
        11.8, 1.5, f"here {names[1]} asks for less effort", ha="right", va="bottom", fontsize=8
    )


def _draw_cues(axes: Axes, plan: Plan, unit: float) -> None:
    """Each cue at its mean gradient and speed: filled in the lower position."""
    assert plan.positions is not None
    lowest, last = plan.positions["lower"], plan.positions["lines"]["gradient_pct"][-1]
    first = plan.positions["lines"]["gradient_pct"][0]
    inside = plan.cues[plan.cues["gradient_pct"].between(first, last)]
    low = inside["position"] == lowest
    for shown, fill, said in (
        (inside[low], style.INK, f"cues ridden on {_name(lowest)}"),
        (inside[~low], style.PAPER, "cues ridden otherwise"),
    ):
        if len(shown):
            axes.plot(
                shown["gradient_pct"].to_numpy(),
                unit * shown["speed_kmh"].to_numpy(),
                marker="o",
                ms=5,
                mfc=fill,
                mec=style.INK,
                ls="none",
                zorder=3,
                label=said,
            )
    axes.legend(loc="upper right")


def _name(name: str) -> str:
    text = style.drawable(words.filled(name))
    return text if len(text) <= MOST_NAME else f"{text[: MOST_NAME - 1]}…"
