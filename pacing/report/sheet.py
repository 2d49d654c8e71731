"""The cue sheet for the bars: cards at true size, as PDF and as a preview picture.

The default is a stem card of 60 x 110 mm: up to twelve cues on a card, as many cards as needed,
and a back with the cautions and a bar of 50 mm to check the print.
"""

from __future__ import annotations

import math
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_pdf import PdfPages
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure
from matplotlib.patches import Rectangle

from pacing.report import style, tables, words
from pacing.report.card import (
    STEM_CARD,
    Card,
    Columns,
    Format,
    Line,
    Row,
    Scale,
    Text,
    columns,
    crop_marks,
    folded,
    heading,
    row_height_mm,
    row_parts,
)
from pacing.report.words import Units

if TYPE_CHECKING:
    from pacing.plan.plan import Plan

CHECK_BAR_MM = 50.0
PREVIEW_DPI = 200


def cards(plan: Plan, shape: Format = STEM_CARD) -> list[Card]:
    """Front cards in the order ridden, then the back."""
    units = words.units_named(plan.race.plan.units)
    rows = cue_rows(plan, units)
    count = math.ceil(len(rows) / shape.most_rows)
    parts = np.array_split(np.arange(len(rows)), count)
    row_mm = min(row_height_mm(shape, [rows[i] for i in part]) for part in parts)
    at = columns(shape, rows, row_mm)
    fronts = [
        _front(plan, shape, units, at, row_mm, rows, part, (i + 1, count))
        for i, part in enumerate(parts)
    ]
    return [*fronts, _back(plan, shape, units, at)]


def cue_rows(plan: Plan, units: Units) -> list[Row]:
    """The cues as they are printed on a card; a position is named where it changes."""
    digits = words.cue_digits(plan.cues, units)
    several = plan.cues["position"].nunique() > 1
    checks = checkpoints(plan)
    rows, last = [], ""
    for i, (_, cue) in enumerate(tables.cues_as_said(plan).iterrows()):
        name = words.filled(cue["position"])
        rows.append(
            Row(
                distance=words.distance(1000 * float(cue["from_km"]), units, digits),
                clock=str(cue["clock"]),
                power=words.number(cue["power_w"]),
                seen=style.drawable(words.seen_beside(cue, units)),
                position=style.drawable(name) if several and name != last else "",
                w_kj=float(cue["w_balance_kj"]) if i in checks else None,
            )
        )
        last = name
    return rows


def checkpoints(plan: Plan) -> set[int]:
    """The three to five cues, spread over the time, at which W′ left is printed.

    Cues that also change the position are avoided: they have enough to say.
    """
    starts = np.concatenate([[0.0], np.cumsum(plan.cues["time_s"].to_numpy())[:-1]])
    count = len(starts)
    wanted = 3 if count < 13 else 4 if count < 20 else 5
    position = plan.cues["position"].to_numpy()
    busy = np.concatenate([[False], position[1:] != position[:-1]]) * 0.1 * plan.time_s
    chosen: set[int] = set()
    for share in np.arange(1, wanted + 1) / (wanted + 1):
        free = [i for i in range(1, count) if i not in chosen]
        if free:
            chosen.add(min(free, key=lambda i: abs(starts[i] - share * plan.time_s) + busy[i]))
    return chosen


def _front(
    plan: Plan,
    shape: Format,
    units: Units,
    at: Columns,
    row_mm: float,
    rows: list[Row],
    part: np.ndarray,
    number: tuple[int, int],
) -> Card:
    page, pages = number
    texts = _header(plan, shape, units, at, page, pages)
    left, right = shape.margin_mm, shape.width_mm - shape.margin_mm
    scale = Scale(plan.race.rider.w_prime_j / 1000, plan.race.plan.reserve_j / 1000)
    top = shape.margin_mm + shape.header_mm
    lines = [*crop_marks(shape), Line((left, right), (top, top), 0.3)]
    for i in part:
        high = row_mm + shape.checkpoint_mm * (rows[i].w_kj is not None)
        more, drawn = row_parts(shape, at, rows[i], top, high, scale)
        top += high
        texts += more
        lines += [*drawn, Line((left, right), (top, top), 0.12, grey=True)]
    lines[-1] = Line((left, right), (top, top), 0.3)
    y = top + 1.4 + shape.small_mm
    if page < pages:
        next_at = f"{units.distance} {rows[part[-1] + 1].distance}"
        texts += heading(shape, f"then card {page + 1}, from {next_at}", "", y)
    else:
        length = words.distance(plan.race.course.length_m, units, 2)
        finish = f"finish {length} {units.distance}"
        texts += heading(shape, finish, words.clock(plan.time_s), y, bold=True)
    return Card(shape, tuple(texts), tuple(lines))


def _header(
    plan: Plan, shape: Format, units: Units, at: Columns, page: int, pages: int
) -> list[Text]:
    small, margin = shape.small_mm, shape.margin_mm
    name = words.filled(plan.race.course.name) or "course"
    y = margin + small
    texts = heading(shape, name, f"{page} of {pages}" if pages > 1 else "", y, bold=True)
    start = plan.race.plan.start_clock_s
    left = "" if start is None else f"start {words.day_clock(start)}"
    reserve = words.number(plan.race.plan.reserve_j / 1000, 1)
    texts += heading(shape, left, f"W′ reserve {reserve} kJ", y + 3.4)
    y += 6.8
    texts.append(Text(at.when_mm, y, units.distance, small, align="right", grey=True))
    texts.append(Text(at.power_right_mm, y, "W", small, align="right", grey=True))
    texts.append(Text(at.seen_mm, y, "you see", small, grey=True))
    return texts


def _back(plan: Plan, shape: Format, units: Units, at: Columns) -> Card:
    """Cautions first, cut if need be; then what to expect, as far as whole sentences fit."""
    small, margin = shape.small_mm, shape.margin_mm
    wide = shape.width_mm - 2 * margin
    texts = heading(
        shape, words.filled(plan.race.course.name) or "course", "back", margin + small, bold=True
    )
    y = margin + small + 5.0
    bottom = shape.height_mm - margin - 12.5
    told = [(text, True) for text in tables.cautions(plan)]
    told += [(text, False) for text in tables.summary(plan, units)]
    for sentence, must in told:
        room = int((bottom - y) / shape.line_mm) + 1
        lines_of = folded(style.drawable(sentence), wide, small, 99)
        if len(lines_of) > room:
            lines_of = folded(style.drawable(sentence), wide, small, room) if must else []
        for line in lines_of:
            texts.append(Text(margin, y, line, small))
            y += shape.line_mm
        y += 1.3 if lines_of else 0.0
    bar = shape.height_mm - margin - 8.6
    left = (shape.width_mm - CHECK_BAR_MM) / 2
    right = shape.width_mm - margin
    ends = (left, left + CHECK_BAR_MM)
    lines = [*crop_marks(shape), Line(ends, (bar, bar), 0.3)]
    lines += [Line((x, x), (bar - 1.2, bar + 1.2), 0.3) for x in ends]
    y = bar + 2.0 + small
    texts.append(Text(left, y, f"{CHECK_BAR_MM:.0f} mm: print at 100 %", small))
    said = f"letters {small:.1f} mm, powers {at.power_mm:.1f} mm"
    texts.append(Text(left, y + shape.line_mm, style.fitted(said, right - left, small), small))
    return Card(shape, tuple(texts), tuple(lines))


def draw(figure: Figure, card: Card, left_mm: float, top_mm: float) -> Axes:
    """Draw a card on a figure with its top left corner at (``left_mm``, ``top_mm``)."""
    wide, high = (length * style.MM_PER_INCH for length in figure.get_size_inches())
    shape = card.shape
    axes = figure.add_axes(
        (
            left_mm / wide,
            1 - (top_mm + shape.height_mm) / high,
            shape.width_mm / wide,
            shape.height_mm / high,
        )
    )
    axes.set(xlim=(0, shape.width_mm), ylim=(shape.height_mm, 0))
    axes.axis("off")
    axes.add_collection(
        LineCollection(
            [list(zip(line.x_mm, line.y_mm, strict=True)) for line in card.lines],
            colors=[style.GREY if line.grey else style.INK for line in card.lines],
            linewidths=[line.thick_mm / style.MM_PER_INCH * 72 for line in card.lines],
            capstyle="butt",
        ),
        autolim=False,
    )
    for text in card.texts:
        axes.text(
            text.x_mm,
            text.y_mm,
            text.text,
            fontsize=style.points_for(text.capital_mm),
            fontweight="bold" if text.bold else "normal",
            color=style.GREY if text.grey else style.INK,
            ha=text.align,
            va="baseline",
        )
    return axes


def save_pdf(plan: Plan, file: Path, shape: Format = STEM_CARD) -> None:
    """Write the sheet, one page of exactly the card's size for each card."""
    size = (style.inches(shape.width_mm), style.inches(shape.height_mm))
    with style.applied(), PdfPages(file, metadata=style.PDF_METADATA) as pages:
        for card in cards(plan, shape):
            figure = Figure(figsize=size)
            draw(figure, card, 0.0, 0.0)
            pages.savefig(figure)


def save_preview(plan: Plan, file: Path, shape: Format = STEM_CARD, gap_mm: float = 4.0) -> None:
    """Write the same cards side by side as a picture."""
    drawn = cards(plan, shape)
    wide = len(drawn) * (shape.width_mm + gap_mm) + gap_mm
    high = shape.height_mm + 2 * gap_mm
    with style.applied():
        figure = Figure(figsize=(style.inches(wide), style.inches(high)), facecolor=style.DESK)
        for i, card in enumerate(drawn):
            axes = draw(figure, card, gap_mm + i * (shape.width_mm + gap_mm), gap_mm)
            axes.add_patch(Rectangle((0, 0), shape.width_mm, shape.height_mm, fc=style.PAPER))
        figure.savefig(file, format="png", dpi=PREVIEW_DPI, metadata=style.PNG_METADATA)
