"""The profile picture: height, power, speed and W′ left over one distance axis."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator
from numpy.typing import NDArray

from pacing.report import style, tables, words
from pacing.report.label_places import lanes
from pacing.report.words import Units

if TYPE_CHECKING:
    from pacing.plan.plan import Plan

Array = NDArray[np.float64]

WIDE_IN, HIGH_IN = 12.0, 9.0
LEFT, RIGHT, TOP, BOTTOM = 0.055, 0.985, 0.925, 0.055
SHARES = (1.1, 1.6, 1.1, 0.9)
GAP = 0.05
LANE_PT = 11.0
STEEP_ENOUGH_PCT = 0.5


def figure(plan: Plan) -> Figure:
    """The four strips as a ``Figure``; call inside ``style.applied()``."""
    units = words.units_named(plan.race.plan.units)
    picture = Figure(figsize=(WIDE_IN, HIGH_IN))
    strips = _strips(picture, plan.race.course.length_m / units.m_per_distance)
    said = f"finish in {words.clock(plan.time_s)} at a mean of {tables.mean_power_w(plan):.0f} W"
    picture.text(RIGHT, 0.968, said, fontsize=11, ha="right")
    style.title(
        picture,
        plan.race.course.name,
        tables.ridden(plan, units),
        (LEFT, 0.968),
        0.66 * WIDE_IN * style.MM_PER_INCH,
    )
    _height(strips[0], plan, units)
    _power(strips[1], plan, units)
    _speed(strips[2], plan, units)
    _w_left(strips[3], plan, units)
    _cue_rules(strips, plan, units)
    strips[3].annotate(
        units.distance,
        (0, 0),
        (-12, -6.5),
        xycoords="axes fraction",
        textcoords="offset points",
        ha="right",
        va="top",
    )
    return picture


def _strips(picture: Figure, length: float) -> list[Axes]:
    """Four axes above each other, sharing the distance axis."""
    free = TOP - BOTTOM - GAP * (len(SHARES) - 1)
    axes: list[Axes] = []
    top = TOP
    for share in SHARES:
        high = free * share / sum(SHARES)
        strip = picture.add_axes(
            (LEFT, top - high, RIGHT - LEFT, high), sharex=axes[0] if axes else None
        )
        style.quiet_axes(strip)
        strip.tick_params(labelbottom=False)
        axes.append(strip)
        top -= high + GAP
    axes[0].set_xlim(0.0, length)
    marks = MaxNLocator(16, steps=[1, 2, 5, 10]).tick_values(0.0, length)
    axes[0].set_xticks([mark for mark in marks if 0.0 <= mark <= length])
    axes[-1].tick_params(labelbottom=True)
    return axes


def _title(strip: Axes, text: str) -> None:
    strip.annotate(
        text,
        (0, 1),
        (0, 4),
        xycoords="axes fraction",
        textcoords="offset points",
        fontweight="bold",
        fontsize=9.5,
    )


def _nodes(plan: Plan, units: Units) -> Array:
    trace = plan.trace
    at_m = np.append(trace["from_m"].to_numpy(), trace["to_m"].iloc[-1])
    return np.asarray(at_m / units.m_per_distance)


def _middles(plan: Plan, units: Units) -> Array:
    cues = plan.cues
    middle_km = 0.5 * (cues["from_km"].to_numpy() + cues["to_km"].to_numpy())
    return np.asarray(1000.0 * middle_km / units.m_per_distance)


def steps(edge: Array, value: Array) -> tuple[Array, Array]:
    """Corner points of a stepped line: ``value`` (N,) between ``edge`` (N+1,), runs joined."""
    change = np.flatnonzero(np.diff(value)) + 1
    inner = np.concatenate([[0], change, [value.size]])
    return np.repeat(edge[inner], 2)[1:-1], np.repeat(value[inner[:-1]], 2)


def _high_pt(strip: int) -> float:
    """Height of a strip in points."""
    return SHARES[strip] / sum(SHARES) * (TOP - BOTTOM - GAP * 3) * HIGH_IN * 72


def _ticks(strip: Axes, low: float, high: float, least: float) -> None:
    """Scale from ``low`` to ``high``, with a few round ticks from ``least`` up."""
    marks = MaxNLocator(4, steps=[1, 2, 5, 10]).tick_values(least, high)
    strip.set_yticks([mark for mark in marks if least <= mark <= high])
    strip.set_ylim(low, high)


def _labels(
    strip: Axes, at: Array, texts: list[str], size: float, *, above: bool, bold: bool = True
) -> int:
    """Write ``texts`` in lanes down from the strip's top, or up from its foot; lanes used."""
    if not texts:
        return 0
    low, high = strip.get_xlim()
    strip_pt = (RIGHT - LEFT) * WIDE_IN * 72
    middle = (at - low) / (high - low) * strip_pt
    wide = np.array(
        [style.text_width_mm(t, style.capitals(size), bold=bold) / 25.4 * 72 for t in texts]
    )
    wide = wide + 7.0
    middle = np.clip(middle, wide / 2, strip_pt - wide / 2)
    lane = lanes(middle, wide, 3)
    for x, row, text in zip(middle, lane, texts, strict=True):
        strip.annotate(
            text,
            (x / strip_pt, 1 if above else 0),
            (0, -LANE_PT - row * LANE_PT if above else 4.0 + row * LANE_PT),
            xycoords="axes fraction",
            textcoords="offset points",
            ha="center",
            fontsize=size,
            fontweight="bold" if bold else "normal",
        )
    return int(lane.max()) + 1


def _height(strip: Axes, plan: Plan, units: Units) -> None:
    course = plan.race.course
    at = course.distance_m / units.m_per_distance
    height = course.elevation_m
    low, high = float(height.min()), float(height.max())
    rise = max(high - low, 20.0)
    grade = plan.cues["gradient_pct"].to_numpy()
    kept = np.abs(grade) >= STEEP_ENOUGH_PCT
    texts = [words.number(value, 1, signed=True) for value in grade[kept]]
    used = _labels(strip, _middles(plan, units)[kept], texts, 8.0, above=False)
    foot = (used * LANE_PT + 7.0) / _high_pt(0)
    floor = low - rise * foot / (0.96 - foot)
    strip.fill_between(at, height, floor, color=style.FILL, linewidth=0)
    strip.plot(at, height, color=style.INK, linewidth=1.0)
    _ticks(strip, floor, low + 1.04 * rise, low - 0.1 * rise)
    _title(strip, "height, m; figures: mean gradient of each cue, %")


def _power(strip: Axes, plan: Plan, units: Units) -> None:
    trace = plan.trace
    at = _nodes(plan, units)
    target = trace["target_w"].to_numpy()
    ridden = trace["power_w"].to_numpy()
    critical = trace["critical_power_w"].to_numpy()
    strip.plot(*steps(at, target), color=style.INK, linewidth=1.8, label="target")
    strip.plot(*steps(at, ridden), color=style.GREY, linewidth=0.9, zorder=1.9, label="delivered")
    strip.plot(
        *steps(at, critical),
        color=style.GREY,
        linewidth=1.0,
        linestyle=(0, (5, 3)),
        label=f"critical power, {words.number(critical.max())} W as planned",
    )
    low = float(min(target.min(), critical.min()))
    high = float(max(target.max(), critical.max()))
    spare = max(0.15 * (high - low), 0.5 * (60.0 - (high - low)))
    low, high = max(0.0, low - spare), high + 0.3 * spare
    texts = [words.number(value) for value in plan.cues["power_w"]]
    used = _labels(strip, _middles(plan, units), texts, 9.0, above=True)
    head = (used * LANE_PT + 6.0) / _high_pt(1)
    _ticks(strip, low, low + (high - low) / (1 - head), low)
    _title(strip, "power, W; figures: what to ride")
    _legend(strip)


def _speed(strip: Axes, plan: Plan, units: Units) -> None:
    trace = plan.trace
    at = _nodes(plan, units)
    factor = units.speed_per_m_s
    speed = np.append(trace["speed_from_m_s"].iloc[0], trace["speed_to_m_s"]) * factor
    limit = np.append(trace["speed_limit_from_m_s"].iloc[0], trace["speed_limit_to_m_s"])
    top = 1.1 * float(speed.max())
    shown = np.where(np.isfinite(limit) & (limit * factor <= top), limit * factor, np.nan)
    strip.plot(at, speed, color=style.INK, linewidth=1.3, label="speed")
    if np.isfinite(shown).any():
        strip.plot(at, shown, color=style.GREY, linewidth=1.6, linestyle=(0, (1, 1)), label="limit")
    _ticks(strip, 0.0, top, 0.0)
    _slow_notes(strip, plan, units)
    _title(strip, f"speed, {units.speed}")
    _legend(strip)


def _slow_notes(strip: Axes, plan: Plan, units: Units) -> None:
    """Name the slow points the race file names, above the foot of the speed strip."""
    named = [slow for slow in plan.race.course.slow_points if words.filled(slow.note)]
    at = np.array([slow.at_m / units.m_per_distance for slow in named])
    _labels(strip, at, [style.drawable(slow.note) for slow in named], 8.0, above=False, bold=False)


def _w_left(strip: Axes, plan: Plan, units: Units) -> None:
    trace = plan.trace
    at = _nodes(plan, units)
    start_kj = float(plan.cues["w_balance_kj"].iloc[0])
    left = np.append(start_kj, trace["w_balance_to_j"].to_numpy() / 1000)
    reserve = plan.race.plan.reserve_j / 1000
    strip.plot(at, left, color=style.INK, linewidth=1.5, label=words.W_LEFT)
    strip.axhline(
        reserve,
        color=style.GREY,
        linewidth=1.0,
        linestyle=(0, (5, 3)),
        label=f"reserve, {words.number(reserve, 1)} kJ",
    )
    _ticks(strip, 0.0, 1.08 * float(left.max()), 0.0)
    _title(strip, f"{words.W_LEFT}, kJ")
    _legend(strip)


def _legend(strip: Axes) -> None:
    """What each line is, on the title's line at the right."""
    handles, _ = strip.get_legend_handles_labels()
    strip.legend(
        loc="lower right",
        bbox_to_anchor=(1.0, 1.0),
        ncols=len(handles),
        borderaxespad=0.2,
        borderpad=0.0,
        handlelength=2.4,
        columnspacing=1.6,
    )


def _cue_rules(strips: list[Axes], plan: Plan, units: Units) -> None:
    inner = 1000.0 * plan.cues["from_km"].to_numpy()[1:] / units.m_per_distance
    for strip in strips:
        strip.vlines(
            inner,
            0,
            1,
            transform=strip.get_xaxis_transform(),
            colors=style.RULE,
            linewidth=0.5,
            zorder=0.5,
        )
