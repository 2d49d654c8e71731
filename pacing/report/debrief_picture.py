"""The picture of a debrief: time lost over distance by cause, power, speed and W′ left."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from pacing.field.debrief import Debrief
from pacing.field.debrief_parts import PARTS
from pacing.field.debrief_predict import Prediction
from pacing.report import style, words
from pacing.units import KMH_PER_M_S

Array = NDArray[np.float64]

WIDE_IN, HIGH_IN, DPI = 10.0, 9.0, 110
LEFT, WIDE = 0.075, 0.78
STRIPS = ((0.62, 0.29), (0.44, 0.13), (0.26, 0.13), (0.07, 0.13))
"""Bottom and height of each strip."""
LINES = {
    "power": (0, (1, 1)),
    "air_and_rolling": (0, (5, 2)),
    "limits_and_braking": (0, (5, 2, 1, 2)),
    "stops": (0, (2, 4)),
    "unexplained": (0, (1, 4)),
}
LABELS = {
    "power": "power",
    "air_and_rolling": "air and rolling",
    "limits_and_braking": "limits, braking",
    "stops": "stops",
    "unexplained": "unexplained",
}
SMOOTH_M = 100.0
APART = 0.06


def save_debrief_picture(debrief: Debrief, file: Path) -> None:
    """Write ``debrief.png``."""
    with style.applied():
        figure(debrief).savefig(file, format="png", dpi=DPI, metadata=style.PNG_METADATA)


def figure(debrief: Debrief) -> Figure:
    """Four strips over the ridden part of the course; call inside ``style.applied()``."""
    picture = Figure(figsize=(WIDE_IN, HIGH_IN))
    side = "slower" if debrief.difference_s > 0 else "faster"
    after = f"{words.span(abs(debrief.difference_s))} {side} than planned"
    style.title(picture, debrief.name, after, (LEFT, 0.955), 220.0)
    node_m = debrief.plan.race.course.distance_m
    cells = debrief.basis.cells
    km = node_m[cells.start : cells.stop + 1] / 1000.0
    lost, power, speed, left = (
        picture.add_axes((LEFT, bottom, WIDE, high)) for bottom, high in STRIPS
    )
    _draw_lost(lost, debrief, km)
    shown = 1.0 / debrief.plan.race.rider.power_meter_factor
    middle = 0.5 * (km[1:] + km[:-1])
    ridden, basis = debrief.ridden, debrief.basis
    _draw_pair(
        power, middle, _smooth(shown * ridden.power_w, km), shown * basis.power_w, "power, W"
    )
    _draw_pair(
        speed, km, KMH_PER_M_S * ridden.speed_m_s, KMH_PER_M_S * basis.speed_m_s, "speed, km/h"
    )
    _draw_pair(left, km, ridden.balance_j / 1000.0, basis.balance_j / 1000.0, "W′ left, kJ")
    left.set_xlabel("km")
    for axes in (lost, power, speed):
        axes.tick_params(labelbottom=False)
    return picture


def _draw_lost(axes: Axes, debrief: Debrief, km: Array) -> None:
    """Seconds behind the plan so far, in all and by cause."""
    start = np.zeros(1)
    whole = np.concatenate([start, np.cumsum(debrief.parts.seconds.sum(axis=0))])
    axes.axhline(0.0, color=style.RULE, lw=0.8)
    ends = [("in all", float(whole[-1]), "bold")]
    for name, row in zip(PARTS, debrief.parts.seconds, strict=True):
        so_far = np.concatenate([start, np.cumsum(row)])
        axes.plot(km, so_far, color=style.GREY, lw=1.1, ls=LINES[name])
        ends.append((LABELS[name], float(so_far[-1]), "normal"))
    axes.plot(km, whole, color=style.INK, lw=1.8)
    axes.set_title("seconds lost to the plan so far, in all and by cause", loc="left", fontsize=9)
    axes.set_xlim(float(km[0]), float(km[-1]))
    style.quiet_axes(axes)
    _label_ends(axes, ends)


def _label_ends(axes: Axes, ends: list[tuple[str, float, str]]) -> None:
    """Names at the right end of their lines, moved apart where they would lie on each other."""
    low, high = axes.get_ylim()
    order = sorted(range(len(ends)), key=lambda i: ends[i][1])
    at = np.array([(ends[i][1] - low) / (high - low) for i in order])
    for k in range(1, at.size):
        at[k] = max(at[k], at[k - 1] + APART)
    at -= max(float(at[-1]) - 1.0, 0.0)
    for place, i in zip(at.tolist(), order, strict=True):
        name, seconds, weight = ends[i]
        text = f"{name} {words.number(seconds, 0, signed=True)}"
        axes.text(
            1.01, place, text, transform=axes.transAxes, va="center", fontsize=8, fontweight=weight
        )


def _draw_pair(axes: Axes, km: Array, ridden: Array, planned: Array, title: str) -> None:
    axes.plot(km, planned, color=style.GREY, lw=1.0, ls=(0, (4, 2)))
    axes.plot(km, ridden, color=style.INK, lw=1.1)
    axes.set_title(f"{title}: ridden, and planned (dashed)", loc="left", fontsize=9)
    axes.set_xlim(float(km[0]), float(km[-1]))
    style.quiet_axes(axes)


def _smooth(values: Array, km: Array) -> Array:
    """A running mean over a hundred metres, so that pedal strokes do not hide the ride."""
    wide = max(1, round(SMOOTH_M / (1000.0 * float(km[1] - km[0])))) | 1
    if wide >= values.size:
        return values
    padded = np.pad(values, wide // 2, mode="edge")
    return np.convolve(padded, np.ones(wide) / wide, mode="valid")


def save_prediction_picture(prediction: Prediction, ride: str, file: Path) -> None:
    """Write ``prediction.png``: predicted and ridden speed over distance."""
    with style.applied():
        picture = Figure(figsize=(WIDE_IN, 3.6))
        after = f"{words.number(prediction.error_pct, 1, signed=True)} % of time"
        style.title(picture, ride, after, (LEFT, 0.9), 220.0)
        axes = picture.add_axes((LEFT, 0.15, 0.9, 0.6))
        axes.plot(
            prediction.at_m / 1000.0,
            KMH_PER_M_S * prediction.predicted_m_s,
            color=style.GREY,
            lw=1.0,
            ls=(0, (4, 2)),
        )
        axes.plot(
            prediction.at_m / 1000.0, KMH_PER_M_S * prediction.ridden_m_s, color=style.INK, lw=1.1
        )
        axes.set_title("speed, km/h: ridden, and predicted (dashed)", loc="left", fontsize=9)
        axes.set_xlabel("km")
        style.quiet_axes(axes)
        picture.savefig(file, format="png", dpi=DPI, metadata=style.PNG_METADATA)
