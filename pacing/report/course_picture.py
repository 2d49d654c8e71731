"""The picture of a course file: heights as given and as smoothed, gradient, repairs."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from pacing.course.course import Course, Repair
from pacing.course.gaps import SEGMENTS
from pacing.course.repair import MERGED
from pacing.report import style, words
from pacing.report.picture_file import save_figure

WIDE_IN, STRIPS_IN, LINE_IN = 12.0, 5.6, 0.19
LEFT_IN, RIGHT_IN, TOP_IN, FOOT_IN = 0.75, 0.2, 0.75, 0.5
MOST_LISTED = 12
STREWN = (MERGED, SEGMENTS, "start and finish brought to one height")


def save_picture(course: Course, file: Path) -> None:
    """Draw the course into a file; complete or not at all."""
    with style.applied():
        save_figure(figure(course), file)


def figure(course: Course) -> Figure:
    """Two strips over one distance axis and the repairs below; call inside ``style.applied()``."""
    listed = _listed(course.report.repairs)
    high_in = STRIPS_IN + LINE_IN * (len(listed) + 1 if listed else 0)
    picture = Figure(figsize=(WIDE_IN, high_in))
    heights = _strip(picture, high_in, 0.0, 0.62)
    gradient = _strip(picture, high_in, 0.70, 1.0)
    gradient.sharex(heights)
    heights.set_xlim(0.0, course.length_m / 1000.0)
    heights.xaxis.set_major_locator(MaxNLocator(20, steps=[1, 2, 2.5, 5, 10]))
    heights.tick_params(labelbottom=False)
    _draw_heights(heights, course)
    _draw_gradient(gradient, course)
    _mark(heights, gradient, listed)
    _write_list(picture, high_in, listed, len(course.report.repairs))
    report = course.report
    name = style.drawable(words.filled(course.name) or "course")
    shown = name if len(name) <= 60 else f"{name[:59]}…"
    left, right = LEFT_IN / WIDE_IN, 1 - RIGHT_IN / WIDE_IN
    top = 1 - 0.32 / high_in
    picture.text(
        left,
        top,
        f"{shown}, {words.distance(course.length_m, digits=2)} km",
        fontsize=13,
        fontweight="bold",
    )
    picture.text(right, top, f"verdict: {report.verdict}", fontsize=11, ha="right")
    return picture


def _strip(picture: Figure, high_in: float, from_share: float, to_share: float) -> Axes:
    """Axes over a share of the space between title and foot of the strips, from above."""
    top_in, space_in = high_in - TOP_IN, STRIPS_IN - TOP_IN - FOOT_IN
    strip = picture.add_axes(
        (
            LEFT_IN / WIDE_IN,
            (top_in - to_share * space_in) / high_in,
            1.0 - (LEFT_IN + RIGHT_IN) / WIDE_IN,
            (to_share - from_share) * space_in / high_in,
        )
    )
    style.quiet_axes(strip)
    return strip


def _draw_heights(strip: Axes, course: Course) -> None:
    report = course.report
    at = course.distance_m / 1000.0
    low = float(course.elevation_m.min())
    high = float(course.elevation_m.max())
    if report.raw_elevation_m.size:
        low = min(low, float(report.raw_elevation_m.min()))
        high = max(high, float(report.raw_elevation_m.max()))
    rise = max(high - low, 20.0)
    floor = low - 0.08 * rise
    strip.fill_between(at, course.elevation_m, floor, color=style.FILL, linewidth=0)
    strip.plot(
        report.raw_distance_m / 1000.0,
        report.raw_elevation_m,
        color=style.GREY,
        linewidth=0.8,
        linestyle=(0, (2, 1)),
        label="as in the file",
    )
    strip.plot(at, course.elevation_m, color=style.INK, linewidth=1.2, label="as smoothed")
    strip.set_ylim(floor, high + 0.12 * rise)
    if not report.raw_elevation_m.size:
        strip.set_yticks([])
        what = "ridden as level" if report.height_source == "level" else "no heights"
        _name(strip, f"height: {what}")
        return
    _name(strip, "height, m")
    strip.legend(loc="lower right", bbox_to_anchor=(1.0, 1.0), ncols=2, borderaxespad=0.2)


def _draw_gradient(strip: Axes, course: Course) -> None:
    """Mean gradient over 100 m, which is what the smoothing promises to know."""
    window = max(1, round(100.0 / float(course.cell_length_m[0])))
    weights = np.ones(min(window, course.gradient.size))
    smooth = np.convolve(course.gradient, weights, "same")
    smooth /= np.convolve(np.ones_like(course.gradient), weights, "same")
    percent = 100.0 * smooth
    middle = (course.distance_m[1:] + course.distance_m[:-1]) / 2000.0
    error = course.report.gradient_error_pct
    strip.fill_between(middle, percent - error, percent + error, color=style.FILL, linewidth=0)
    strip.plot(middle, percent, color=style.INK, linewidth=0.9)
    strip.axhline(0.0, color=style.GREY, linewidth=0.6)
    reach = max(2.0, 1.15 * float(np.max(np.abs(percent))))
    strip.set_ylim(-reach, reach)
    strip.yaxis.set_major_locator(MaxNLocator(5, steps=[1, 2, 5, 10]))
    band = f" (band: known to {words.number(error, 1)} points)" if error > 0.0 else ""
    _name(strip, f"gradient over 100 m, %{band}")
    strip.annotate(
        "km",
        (0, 0),
        (-12, -6.5),
        xycoords="axes fraction",
        textcoords="offset points",
        ha="right",
        va="top",
    )


def _name(strip: Axes, text: str) -> None:
    strip.annotate(
        text,
        (0, 1),
        (0, 5),
        xycoords="axes fraction",
        textcoords="offset points",
        fontweight="bold",
        fontsize=9.5,
    )


def _listed(repairs: tuple[Repair, ...]) -> list[Repair]:
    """The repairs that are numbered in the picture: the longest, in the order of the road."""
    longest = sorted(repairs, key=lambda repair: repair.from_km - repair.to_km)[:MOST_LISTED]
    return sorted(longest, key=lambda repair: (repair.from_km, repair.to_km))


def _mark(heights: Axes, gradient: Axes, listed: list[Repair]) -> None:
    """Shade where each repair lies, its number above; what is strewn over the way gets none."""
    end = heights.get_xlim()[1]
    for number, repair in enumerate(listed, 1):
        if repair.what in STREWN:
            continue
        width = max(repair.to_km - repair.from_km, 0.0015 * end)
        for strip in (heights, gradient):
            strip.axvspan(
                repair.from_km, repair.from_km + width, color=style.RULE, alpha=0.6, linewidth=0
            )
        heights.annotate(
            str(number),
            (repair.from_km + width / 2, 1),
            (0, -9 - 9 * (number % 2)),
            xycoords=("data", "axes fraction"),
            textcoords="offset points",
            ha="center",
            fontsize=8,
        )


def _write_list(picture: Figure, high_in: float, listed: list[Repair], count: int) -> None:
    if not listed:
        return
    top_in = LINE_IN * (len(listed) + 1)
    more = f" (the {len(listed)} longest of {count})" if count > len(listed) else ""
    lines = [f"Repairs{more}"]
    for repair in listed:
        where = f"km {words.distance(1000 * repair.from_km)}"
        if repair.to_km - repair.from_km >= 0.05:
            where += f" to {words.distance(1000 * repair.to_km)}"
        lines.append(f"{where}: {style.drawable(f'{repair.what}, {repair.amount}')}")
    for row, line in enumerate(lines):
        at = (top_in - LINE_IN * row - 0.08) / high_in
        if row == 0:
            picture.text(LEFT_IN / WIDE_IN, at, line, fontsize=9.5, fontweight="bold", va="center")
            continue
        picture.text((LEFT_IN + 0.2) / WIDE_IN, at, str(row), fontsize=8.5, va="center", ha="right")
        picture.text((LEFT_IN + 0.3) / WIDE_IN, at, line, fontsize=8.5, va="center")
