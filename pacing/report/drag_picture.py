"""The picture of a drag fit: height misfit along the ride, with its band and a zero line."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from pacing.field.drag_result import DragFit, Misfit
from pacing.report import style
from pacing.report.picture_file import save_figure

WIDE_IN, ROW_IN, HEAD_IN, FOOT_IN = 10.0, 2.6, 0.95, 0.6
MOST_RIDES = 8


def save_drag_picture(fit: DragFit, file: Path) -> None:
    """Draw the misfit into a file (.png, .pdf or .svg); complete or not at all."""
    with style.applied():
        save_figure(figure(fit), file)


def figure(fit: DragFit) -> Figure:
    """One strip a ride; call inside ``style.applied()``."""
    rides = fit.misfit[:MOST_RIDES]
    high = HEAD_IN + FOOT_IN + ROW_IN * len(rides)
    picture = Figure(figsize=(WIDE_IN, high))
    text = (
        f"CdA {fit.cda_m2:.3f} m² ({fit.cda_low_m2:.3f} to {fit.cda_high_m2:.3f}),"
        f" Crr {fit.crr:.4f} ({fit.crr_low:.4f} to {fit.crr_high:.4f})"
    )
    picture.text(0.075, 1 - 0.38 / high, text, fontsize=style.TITLE_PT, fontweight="bold")
    said = (
        "height recomputed from power and speed less recorded height, m; grey: where 19 of 20 lie"
    )
    picture.text(0.075, 1 - 0.66 / high, said, color=style.GREY)
    for row, misfit in enumerate(rides):
        bottom = FOOT_IN + ROW_IN * (len(rides) - 1 - row)
        axes = picture.add_axes((0.075, (bottom + 0.15) / high, 0.9, (ROW_IN - 0.55) / high))
        _draw(axes, misfit)
        if row == len(rides) - 1:
            axes.set_xlabel("km")
    return picture


def _draw(axes: Axes, misfit: Misfit) -> None:
    km, height, band = misfit.km, misfit.height_m, misfit.band_m
    axes.fill_between(km, -band, band, color=style.FILL, lw=0)
    axes.axhline(0.0, color=style.INK, lw=0.8)
    axes.plot(km, height, color=style.INK, lw=1.3)
    outside = np.isfinite(height) & (np.abs(height) > band)
    if outside.any():
        # Heavier where the ride leaves its band: the bad stretch to look at.
        axes.plot(km, np.where(outside, height, np.nan), color=style.INK, lw=3.2)
    known = np.abs(height[np.isfinite(height)])
    reach = 1.15 * max(float(band.max(initial=1.0)), float(known.max(initial=0.0)), 1.0)
    axes.set_ylim(-reach, reach)
    if km.size:
        axes.set_xlim(float(km[0]), max(float(km[-1]), float(km[0]) + 0.1))
    axes.set_title(style.drawable(misfit.ride), loc="left", fontsize=9)
    style.quiet_axes(axes)
