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
from pacing.report.words import Units

if TYPE_CHECKING:
    import pandas as pd

    from pacing.plan.plan import Plan

Array = NDArray[np.float64]

WIDE_PT, HIGH_PT = 720.0, 560.0
SIDE_PT = 170.0
EDGE_PT = 44.0
HEAD_PT = 40.0
LINE_PT, LAPS_PT = 4.2, 20.0
CASING_PT = 1.4
COLOURS = 64
METRES_PER_DEGREE = 111_320.0


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
    title = style.drawable(tables.title(plan, units))
    paper.text(20, HIGH_PT - 26, title, fontsize=13, fontweight="bold")
    course = plan.race.course
    at, points_per_m = on_paper(course.lat_deg, course.lon_deg)
    laps = lap_nodes(course.distance_m, course.lap_length_m, course.laps)
    line_pt = min(LINE_PT, LAPS_PT / len(laps))
    shown = moved(at, laps, line_pt)
    trace = plan.trace
    asked = trace["critical_power_w"] * trace["power_share"]
    share = (trace["power_w"] / asked).to_numpy()
    scale = share_scale(trace["target_w"] / asked)
    _road(paper, shown, share, scale, laps, line_pt)
    taken = Taken(shown)
    _ends(paper, plan, shown, taken)
    _kilometres(paper, plan, units, shown, taken)
    _scale_bar(paper, points_per_m, units, len(laps))
    _wind(paper, mean_wind(trace))
    _colour_bar(picture, scale, below=bool(share.min() < (scale.vmin or 0.0)))
    return picture


def on_paper(lat_deg: Array, lon_deg: Array) -> tuple[Array, float]:
    """Points (N, 2) on the paper, north up, and points per metre."""
    middle = np.radians(0.5 * (lat_deg.min() + lat_deg.max()))
    turned = np.degrees(np.unwrap(np.radians(lon_deg)))
    east = (turned - turned[0]) * METRES_PER_DEGREE * np.cos(middle)
    north = (lat_deg - lat_deg[0]) * METRES_PER_DEGREE
    room_x = WIDE_PT - SIDE_PT - 2 * EDGE_PT
    room_y = HIGH_PT - HEAD_PT - 2 * EDGE_PT
    scale = min(room_x / max(np.ptp(east), 1.0), room_y / max(np.ptp(north), 1.0))
    x = (east - 0.5 * (east.min() + east.max())) * scale + EDGE_PT + room_x / 2
    y = (north - 0.5 * (north.min() + north.max())) * scale + EDGE_PT + room_y / 2
    return np.column_stack([x, y]), float(scale)


def lap_nodes(distance_m: Array, lap_length_m: float, laps: int) -> list[tuple[int, int]]:
    """First and last node of each lap."""
    ends = np.searchsorted(distance_m, lap_length_m * np.arange(1, laps) - 1e-6)
    edge = [0, *(int(end) for end in ends), distance_m.size - 1]
    return [(a, b) for a, b in pairwise(edge) if b > a]


def moved(at: Array, laps: list[tuple[int, int]], line_pt: float) -> Array:
    """The line moved to the right of the direction of travel, each lap one line further."""
    step = max(1, at.shape[0] // 2000)
    before = at[np.maximum(np.arange(at.shape[0]) - step, 0)]
    after = at[np.minimum(np.arange(at.shape[0]) + step, at.shape[0] - 1)]
    along = after - before
    long = np.hypot(along[:, 0], along[:, 1])
    right = np.column_stack([along[:, 1], -along[:, 0]]) / np.maximum(long, 1e-9)[:, None]
    apart = line_pt + 0.5 * CASING_PT
    lane = np.zeros(at.shape[0])
    for number, (first, last) in enumerate(laps):
        lane[first : last + 1] = number
    return np.asarray(at + right * (apart * (0.5 + lane))[:, None])


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


class Taken:
    """Where the course and the labels already are, so that the next label finds a free place."""

    def __init__(self, road: Array) -> None:
        self.road = road
        self.boxes: list[tuple[float, float, float, float]] = []

    def cost(self, box: tuple[float, float, float, float]) -> float:
        """How much of the road and of other labels a box would hide, or leave the paper."""
        left, low, right, high = box
        x, y = self.road[:, 0], self.road[:, 1]
        hidden = ((x > left - 3) & (x < right + 3) & (y > low - 3) & (y < high + 3)).sum()
        over = sum(left < b[2] and right > b[0] and low < b[3] and high > b[1] for b in self.boxes)
        outside = left < 4 or right > WIDE_PT - SIDE_PT or low < 24 or high > HIGH_PT - HEAD_PT
        return float(hidden) + 1e4 * over + 1e4 * outside

    def place(self, at: Array, text: str, size: float, side: Array) -> tuple[float, float, float]:
        """Left, baseline and cost of the best place around ``at``, best on ``side``; now taken."""
        wide = style.text_width_mm(text, size * 0.257) / 25.4 * 72
        high = 0.75 * size
        best: tuple[float, tuple[float, float, float, float]] | None = None
        for away in (9.0, 14.0, 20.0, 28.0):
            for turn in np.arange(12) * np.pi / 6:
                way = np.array([np.cos(turn), np.sin(turn)])
                x, y = at + way * (away + 0.5 * np.array([wide, high]))
                box = (x - wide / 2, y - high / 2, x + wide / 2, y + high / 2)
                cost = self.cost(box) + 0.05 * away - 2.0 * float(way @ side)
                if best is None or cost < best[0]:
                    best = (cost, box)
        assert best is not None
        cost, box = best
        if cost < 1e4:
            left, low, right, top = box
            self.boxes.append((left - 2, low - 2, right + 2, top + 2))
        return box[0], box[1], cost


def _mark(
    paper: Axes, at: Array, text: str, taken: Taken, side: Array, *, size: float, bold: bool
) -> None:
    """Write a label near ``at`` where it is free, or not at all."""
    x, y, cost = taken.place(at, text, size, side)
    if cost < 1e4:
        paper.text(x, y, text, fontsize=size, fontweight="bold" if bold else "normal", zorder=6)


def _ends(paper: Axes, plan: Plan, at: Array, taken: Taken) -> None:
    """Start, finish and the slow points with a name."""
    course = plan.race.course
    joined = bool(np.hypot(*(at[0] - at[-1])) < 12.0)
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


def _kilometres(paper: Axes, plan: Plan, units: Units, at: Array, taken: Taken) -> None:
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
        ends = np.array([here - side * LINE_PT * 0.9, here + side * LINE_PT * 0.9])
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
