"""The picture of a critical-power fit: work against time, what is left over, how sure it is."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from numpy.typing import NDArray

from pacing.field.power_result import Effort, PowerFit
from pacing.report import style, words
from pacing.report.picture_file import save_figure

Array = NDArray[np.float64]

WIDE_IN, HIGH_IN = 10.0, 6.0


def save_power_picture(fit: PowerFit, file: Path) -> None:
    """Draw the fit into a file (.png, .pdf or .svg); complete or not at all."""
    with style.applied():
        save_figure(figure(fit), file)


def figure(fit: PowerFit) -> Figure:
    """Three parts; call inside ``style.applied()``."""
    picture = Figure(figsize=(WIDE_IN, HIGH_IN))
    work = picture.add_axes((0.075, 0.40, 0.54, 0.47))
    left_over = picture.add_axes((0.075, 0.09, 0.54, 0.22), sharex=work)
    region = picture.add_axes((0.70, 0.40, 0.275, 0.47))
    picture.text(0.075, 0.945, _title(fit), fontsize=style.TITLE_PT, fontweight="bold")
    if fit.shares:
        said = f"efforts brought to the position {style.drawable(fit.shares[0].position)}"
        picture.text(0.975, 0.945, said, ha="right", color=style.GREY)
    _draw_work(work, fit)
    _draw_left_over(left_over, fit)
    _draw_region(region, fit)
    _write_forms(picture, fit)
    return picture


def _title(fit: PowerFit) -> str:
    text = f"critical power {fit.critical_power_w:.0f} W, W′ {fit.w_prime_j / 1000.0:.1f} kJ"
    if fit.peak_power_w is not None:
        text += f", peak {fit.peak_power_w:.0f} W"
    return text


def _alike_w(fit: PowerFit, effort: Effort) -> float:
    """An effort's power brought to the tested position."""
    share = {found.position: found.power_share for found in fit.shares}.get(effort.position, 1.0)
    return effort.power_w / share


def _times(fit: PowerFit) -> Array:
    longest = max(effort.duration_s for effort in fit.efforts)
    return np.linspace(max(1.0, 0.01 * longest), 1.06 * longest, 300)


def _draw_work(axes: Axes, fit: PowerFit) -> None:
    times = _times(fit)
    work_kj = fit.power_at_w(times) * times / 1000.0
    half = fit.half_band_w(times)
    if half is not None:
        band = half * times / 1000.0
        axes.fill_between(times / 60.0, work_kj - band, work_kj + band, color=style.FILL, lw=0)
    axes.plot(times / 60.0, work_kj, color=style.INK, lw=1.2)
    for effort in fit.efforts:
        _dot(axes, effort, _alike_w(fit, effort) * effort.duration_s / 1000.0)
    axes.set_title("work done, kJ, with the fitted line", loc="left", fontsize=9)
    axes.set_xlim(0.0, times[-1] / 60.0)
    axes.set_ylim(bottom=0.0)
    axes.tick_params(labelbottom=False)
    style.quiet_axes(axes)


def _draw_left_over(axes: Axes, fit: PowerFit) -> None:
    times = _times(fit)
    half = fit.half_band_w(times)
    residuals = [_alike_w(fit, e) - float(fit.power_at_w(e.duration_s)) for e in fit.efforts]
    reach = 1.7 * max(4.0, *(abs(r) for r in residuals))
    if half is not None:
        axes.fill_between(times / 60.0, -half, half, color=style.FILL, lw=0)
        inside = times >= min(effort.duration_s for effort in fit.efforts)
        reach = max(reach, min(1.1 * float(half[inside].max()), 3.0 * reach))
    axes.axhline(0.0, color=style.INK, lw=0.8)
    pairs = sorted(zip(fit.efforts, residuals, strict=True), key=lambda pair: pair[0].duration_s)
    for row, (effort, residual) in enumerate(pairs):
        _dot(axes, effort, residual)
        last = effort.duration_s > 0.9 * times[-1]
        axes.text(
            effort.duration_s / 60.0,
            0.90 - 0.15 * (row % 2),
            f"{effort.power_w:.0f} W",
            transform=axes.get_xaxis_transform(),
            fontsize=8,
            ha="right" if last else "left",
        )
    axes.set_ylim(-reach, reach)
    title = "power off the curve, W"
    title += ", with its 95 % band" if half is not None else "; too few efforts for a band"
    axes.set_title(title, loc="left", fontsize=9)
    axes.set_xlabel("minutes")
    style.quiet_axes(axes)
    axes.grid(False)


def _dot(axes: Axes, effort: Effort, y: float) -> None:
    axes.plot(
        [effort.duration_s / 60.0],
        [y],
        marker="o" if effort.used else "x",
        ms=6,
        mfc=style.PAPER if effort.flagged else style.INK,
        mec=style.INK,
        ls="none",
        clip_on=False,
        zorder=3,
    )


def _draw_region(axes: Axes, fit: PowerFit) -> None:
    edge = fit.joint_region()
    axes.set_title("W′, kJ, over critical power, W", loc="left", fontsize=9)
    axes.plot(
        [fit.critical_power_w], [fit.w_prime_j / 1000.0], marker="+", ms=9, color=style.INK, ls=""
    )
    if edge is None:
        axes.text(0.5, 0.1, "no error from so few efforts", transform=axes.transAxes, ha="center")
    else:
        axes.fill(edge[:, 0], edge[:, 1] / 1000.0, fc=style.FILL, ec=style.INK, lw=0.8)
        axes.text(
            0.98, 0.96, "95 % of both together", transform=axes.transAxes, ha="right", fontsize=8
        )
        axes.margins(0.12)
    axes.grid(True)


def _write_forms(picture: Figure, fit: PowerFit) -> None:
    picture.text(0.70, 0.285, "form", fontsize=8, color=style.GREY)
    picture.text(0.91, 0.285, "CP, W", fontsize=8, color=style.GREY, ha="right")
    picture.text(0.975, 0.285, "W′, kJ", fontsize=8, color=style.GREY, ha="right")
    for row, form in enumerate(fit.forms):
        y = 0.25 - 0.038 * row
        picture.text(0.70, y, form.name, fontsize=8)
        picture.text(0.91, y, words.number(form.critical_power_w, 1), fontsize=8, ha="right")
        picture.text(0.975, y, words.number(form.w_prime_j / 1e3, 2), fontsize=8, ha="right")
