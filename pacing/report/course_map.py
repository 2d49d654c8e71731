"""The course seen from above, coloured by share of critical power, with the wind.

Drawn from the course alone, in points on the paper: the line is moved a little to the right of
the direction of travel, so that a road ridden both ways, or lap after lap, shows each passage.
"""

from __future__ import annotations

from itertools import pairwise
from typing import TYPE_CHECKING, NamedTuple

import matplotlib as mpl
import numpy as np
from matplotlib.axes import Axes
from matplotlib.cm import ScalarMappable
from matplotlib.collections import LineCollection
from matplotlib.colors import Normalize
from matplotlib.figure import Figure
from numpy.typing import NDArray

from pacing.report import style, tables, words
from pacing.report.label_places import Taken
from pacing.report.lines_on_paper import lap_nodes, moved, on_paper
from pacing.report.words import Units

if TYPE_CHECKING:
    import pandas as pd

    from pacing.plan.plan import Plan

Array = NDArray[np.float64]

WIDE_PT, HIGH_PT = 720.0, 560.0
SIDE_PT = 170.0
EDGE_PT = 44.0
HEAD_PT = 40.0
LINE_PT, LAPS_PT = 4.2, 15.0
CASING_PT = 1.2
COLOURS = 64


class Wind(NamedTuple):
    """Wind at the rider: mean vector over the course, and its range along the road."""

    speed_m_s: float
    from_deg: float
    least_along_m_s: float
    most_along_m_s: float


def figure(plan: Plan) -> Figure:
    """The map as a ``Figure``; call inside ``style.applied()``."""
    units = words.units_named(plan.race.plan.units)
    picture = Figure(figsize=(WIDE_PT / 72, HIGH_PT / 72))
    paper = picture.add_axes((0, 0, 1, 1))
    paper.set(xlim=(0, WIDE_PT), ylim=(0, HIGH_PT))
    paper.axis("off")
    title_at = (20 / WIDE_PT, 1 - 26 / HIGH_PT)
    name, wide_mm = plan.race.course.name, 0.94 * WIDE_PT / 72 * style.MM_PER_INCH
    style.title(picture, name, tables.ridden(plan, units), title_at, wide_mm)
    course = plan.race.course
    room = (EDGE_PT, EDGE_PT, WIDE_PT - SIDE_PT - EDGE_PT, HIGH_PT - HEAD_PT - EDGE_PT)
    at, points_per_m = on_paper(course.lat_deg, course.lon_deg, room)
    laps = lap_nodes(course.distance_m, course.lap_length_m, course.laps)
    line_pt = min(LINE_PT, LAPS_PT / len(laps))
    apart_pt = line_pt + 0.5 * CASING_PT
    shown = moved(at, laps, apart_pt)
    trace = plan.trace
    asked = trace["critical_power_w"] * trace["power_share"]
    share = (trace["power_w"] / asked).to_numpy()
    scale = share_scale(trace["target_w"] / asked)
    _road(paper, shown, share, scale, laps, line_pt)
    taken = Taken(shown, (4.0, 24.0, WIDE_PT - SIDE_PT, HIGH_PT - HEAD_PT))
    _ends(paper, plan, shown, taken, apart_pt * len(laps))
    _kilometres(paper, plan, units, shown, taken, apart_pt * len(laps))
    _scale_bar(paper, points_per_m, units, len(laps))
    _wind(paper, mean_wind(trace))
    _colour_bar(picture, scale, below=bool(share.min() < (scale.vmin or 0.0)))
    return picture


def share_scale(target_share: pd.Series) -> Normalize:
    """The range of the colours: what the targets span, at least 20 points, in steps of 5."""
    low, high = float(target_share.min()), float(target_share.max())
    spare = max(0.0, 0.5 * (0.2 - (high - low)))
    return Normalize(np.floor(20 * (low - spare)) / 20, np.ceil(20 * (high + spare)) / 20)


def _road(
    paper: Axes,
    at: Array,
    share: Array,
    scale: Normalize,
    laps: list[tuple[int, int]],
    line_pt: float,
) -> None:
    """Each lap as runs of one colour over a dark casing that keeps the light end visible."""
    step = np.clip(np.floor(COLOURS * scale(share)), 0, COLOURS - 1).astype(int)
    colours = mpl.colormaps[style.COLOUR_MAP]((np.arange(COLOURS) + 0.5) / COLOURS)
    for layer, (first, last) in enumerate(laps):
        order = 2 + 0.1 * min(layer, 20)
        lap, shade = at[first : last + 1], step[first:last]
        cut = np.concatenate([[0], np.flatnonzero(np.diff(shade)) + 1, [shade.size]])
        runs = [lap[a : b + 1] for a, b in pairwise(cut)]
        paper.plot(
            lap[:, 0], lap[:, 1], color=style.INK, linewidth=line_pt + CASING_PT, zorder=order
        )
        paper.add_collection(
            LineCollection(
                runs, colors=colours[shade[cut[:-1]]], linewidths=line_pt, zorder=order + 0.05
            ),
            autolim=False,
        )


def _mark(
    paper: Axes, at: Array, text: str, taken: Taken, side: Array, *, size: float, bold: bool
) -> None:
    """Write a label near ``at`` where it is free, or not at all."""
    x, y, cost = taken.place(at, text, size, side)
    if cost < 1e4:
        paper.text(x, y, text, fontsize=size, fontweight="bold" if bold else "normal", zorder=6)


def _ends(paper: Axes, plan: Plan, at: Array, taken: Taken, wide_pt: float) -> None:
    """Start, finish and the slow points with a name."""
    course = plan.race.course
    joined = bool(np.hypot(*(at[0] - at[-1])) < 10.0 + wide_pt)
    dots = (
        [(0.5 * (at[0] + at[-1]), "start and finish", "o")] if joined else [(at[0], "start", "o")]
    )
    if not joined:
        dots.append((at[-1], "finish", "s"))
    for slow in course.slow_points:
        note = style.drawable(words.filled(slow.note)) or "slow point"
        if slow.at_m <= course.lap_length_m:
            dots.append((_point(course.distance_m, at, slow.at_m), note, "D"))
    for point, text, marker in dots:
        paper.plot(
            *point, marker=marker, markersize=7, mfc=style.PAPER, mec=style.INK, mew=1.5, zorder=5
        )
        _mark(paper, point, text, taken, np.zeros(2), size=9.5, bold=True)


def _point(distance_m: Array, at: Array, where_m: float) -> Array:
    return np.array([np.interp(where_m, distance_m, at[:, axis]) for axis in (0, 1)])


def _kilometres(
    paper: Axes, plan: Plan, units: Units, at: Array, taken: Taken, wide_pt: float
) -> None:
    """A tick at each kilometre of the first lap, or each few, with figures where there is room."""
    course = plan.race.course
    length = course.length_m if course.laps == 1 else course.lap_length_m
    drawn_pt = float(np.hypot(*np.diff(at, axis=0).T).sum()) * length / course.length_m
    count = length / units.m_per_distance
    every = next(n for n in (1, 2, 5, 10, 20, 50, 100) if drawn_pt / count * n >= 26 or n == 100)
    for mark in np.arange(every, count + 1e-9, every):
        where = mark * units.m_per_distance
        here = _point(course.distance_m, at, where)
        ahead = _point(course.distance_m, at, min(where + 40.0, course.length_m))
        behind = _point(course.distance_m, at, where - 40.0)
        along = ahead - behind
        side = np.array([along[1], -along[0]]) / max(float(np.hypot(*along)), 1e-9)
        ends = np.array([here - 0.9 * LINE_PT * side, here + (wide_pt - 0.3 * LINE_PT) * side])
        paper.plot(ends[:, 0], ends[:, 1], color=style.INK, linewidth=1.1, zorder=4)
        _mark(paper, here, f"{mark:.0f}", taken, side, size=8.0, bold=False)


def _scale_bar(paper: Axes, points_per_m: float, units: Units, laps: int) -> None:
    best = 0.1
    for length in (0.1, 0.2, 0.5, 1, 2, 5, 10, 20, 50, 100):
        if length * units.m_per_distance * points_per_m <= 110:
            best = length
    wide = best * units.m_per_distance * points_per_m
    paper.plot([20, 20 + wide], [18, 18], color=style.INK, linewidth=1.4)
    paper.plot([20, 20], [15, 21], color=style.INK, linewidth=1.0)
    paper.plot([20 + wide, 20 + wide], [15, 21], color=style.INK, linewidth=1.0)
    side = (
        "laps side by side, the first on the left"
        if laps > 1
        else ("the line lies on the right of the direction of travel")
    )
    paper.text(26 + wide, 15, f"{best:g} {units.distance}; north is up; {side}", fontsize=8.5)


def mean_wind(trace: pd.DataFrame) -> Wind:
    """Mean wind at the rider from what each cell met, and the range along the road."""
    heading = np.radians(trace["heading_deg"].to_numpy())
    along, across = trace["wind_along_m_s"].to_numpy(), trace["wind_across_m_s"].to_numpy()
    north = np.mean(along * np.cos(heading) - across * np.sin(heading))
    east = np.mean(along * np.sin(heading) + across * np.cos(heading))
    return Wind(
        float(np.hypot(north, east)),
        float(np.degrees(np.arctan2(east, north)) % 360),
        float(along.min()),
        float(along.max()),
    )


def _wind(paper: Axes, wind: Wind) -> None:
    """A plain arrow that flies with the wind, and what it is in figures."""
    x, y = WIDE_PT - SIDE_PT + 74, HIGH_PT - 118
    if wind.speed_m_s >= 0.05:
        to = np.radians(wind.from_deg + 180)
        half = 34 * np.array([np.sin(to), np.cos(to)])
        paper.annotate(
            "",
            (x + half[0], y + half[1]),
            (x - half[0], y - half[1]),
            arrowprops={"arrowstyle": "-|>,head_width=0.32,head_length=0.8", "lw": 2.2,
                        "color": style.INK, "shrinkA": 0, "shrinkB": 0},
        )  # fmt: skip
    left = WIDE_PT - SIDE_PT + 14
    lines = [f"wind at the rider {words.number(wind.speed_m_s, 1)} m/s"]
    if wind.speed_m_s >= 0.05:
        lines.append(f"from {words.number(wind.from_deg)}°")
        least = words.number(wind.least_along_m_s, 1, signed=True)
        most = words.number(wind.most_along_m_s, 1, signed=True)
        lines += [f"along the road {least} to {most}", "(+ head wind, − tail wind)"]
    for i, text in enumerate(lines):
        paper.text(left, HIGH_PT - 182 - 13 * i, text, fontsize=8.5)


def _colour_bar(picture: Figure, scale: Normalize, *, below: bool) -> None:
    left = (WIDE_PT - SIDE_PT + 14) / WIDE_PT
    axes = picture.add_axes((left, 0.09, 16 / WIDE_PT, 0.40))
    bar = picture.colorbar(
        ScalarMappable(scale, mpl.colormaps[style.COLOUR_MAP]),
        cax=axes,
        extend="min" if below else "neither",
    )
    bar.outline.set_linewidth(0.6)
    low, high = scale.vmin or 0.0, scale.vmax or 0.0
    every = 0.05 if high - low < 0.45 else 0.1 if high - low < 0.9 else 0.2
    marks = every * np.arange(np.ceil(low / every - 1e-6), np.floor(high / every + 1e-6) + 1)
    bar.set_ticks(list(marks), labels=[f"{100 * mark:.0f} %" for mark in marks])
    bar.ax.tick_params(length=3, labelsize=8.5)
    picture.text(left, 0.505, "power as share of\ncritical power", fontsize=8.5, va="bottom")
