"""Where everything stands on one card of the cue sheet, in millimetres from its top left corner.

Layout and drawing are apart: what is here is plain boxes of text and lines, whatever the format,
so a card can be drawn on a page of its own, beside others, or checked without drawing at all.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from typing import Literal

from pacing.report.style import drawable, fitted, text_width_mm

_WHERE_TO_BREAK = re.compile(
    r"(?<!\d)\s+|\s+(?!(?:%|W|kJ|km/h|mph|km|mile|mm|m|s|hPa)(?:[\s,.;:)]|$))"
)
"""Between words, but not between a figure and its unit."""


@dataclass(frozen=True)
class Format:
    """One size of card. ``margin_mm`` stays free for scissors and laminate.

    Letter heights are of capitals and figures: powers and distances from the smallest allowed to
    the largest used where there is room, everything else ``small_mm`` with a line each
    ``line_mm``. A row that tells W′ left is ``checkpoint_mm`` higher than the others.
    """

    name: str
    width_mm: float
    height_mm: float
    margin_mm: float = 3.0
    most_rows: int = 12
    power_mm: tuple[float, float] = (5.2, 6.0)
    distance_mm: tuple[float, float] = (2.6, 3.2)
    small_mm: float = 2.2
    line_mm: float = 3.1
    header_mm: float = 10.0
    footer_mm: float = 4.4
    tallest_row_mm: float = 15.0
    checkpoint_mm: float = 2.4


STEM_CARD = Format("stem card", 60.0, 110.0)


@dataclass(frozen=True)
class Text:
    """One line of text: ``y_mm`` is its baseline, ``capital_mm`` the height of its capitals."""

    x_mm: float
    y_mm: float
    text: str
    capital_mm: float
    bold: bool = False
    align: Literal["left", "center", "right"] = "left"
    grey: bool = False

    @property
    def box_mm(self) -> tuple[float, float, float, float]:
        """Left, top, right and bottom, descenders included."""
        width = text_width_mm(self.text, self.capital_mm, bold=self.bold)
        left = self.x_mm - width * {"left": 0.0, "center": 0.5, "right": 1.0}[self.align]
        return left, self.y_mm - self.capital_mm, left + width, self.y_mm + 0.3 * self.capital_mm


@dataclass(frozen=True)
class Line:
    """A straight line of ``thick_mm``."""

    x_mm: tuple[float, float]
    y_mm: tuple[float, float]
    thick_mm: float = 0.15
    grey: bool = False


@dataclass(frozen=True)
class Row:
    """One cue as printed. ``w_kj`` is given at a checkpoint only."""

    distance: str
    clock: str
    power: str
    seen: str
    position: str = ""
    w_kj: float | None = None


@dataclass(frozen=True)
class Scale:
    """What W′ left is shown against (kJ)."""

    full_kj: float
    reserve_kj: float


@dataclass(frozen=True)
class Card:
    """All that is drawn on one card."""

    shape: Format
    texts: tuple[Text, ...] = ()
    lines: tuple[Line, ...] = field(default=())


def folded(text: str, width_mm: float, capital_mm: float, most_lines: int) -> list[str]:
    """``text`` on at most ``most_lines`` lines, the last one cut where it does not fit."""
    lines: list[str] = []
    left = _WHERE_TO_BREAK.split(text.strip()) if text.strip() else []
    while left and len(lines) < most_lines:
        if len(lines) == most_lines - 1:
            lines.append(fitted(" ".join(left), width_mm, capital_mm))
            break
        count = 1
        while (
            count < len(left) and text_width_mm(" ".join(left[: count + 1]), capital_mm) <= width_mm
        ):
            count += 1
        lines.append(fitted(" ".join(left[:count]), width_mm, capital_mm))
        left = left[count:]
    return lines


def row_height_mm(shape: Format, rows: list[Row]) -> float:
    """Height of a row without W′ on a card that holds ``rows``."""
    room = shape.height_mm - 2 * shape.margin_mm - shape.header_mm - shape.footer_mm
    marked = sum(row.w_kj is not None for row in rows)
    return min(shape.tallest_row_mm, (room - shape.checkpoint_mm * marked) / len(rows))


@dataclass(frozen=True)
class Columns:
    """The three columns of a card: when (distance, clock), how much, what one sees there."""

    when_mm: float
    power_right_mm: float
    seen_mm: float
    seen_width_mm: float
    power_mm: float
    distance_mm: float


def columns(shape: Format, rows: list[Row], row_mm: float) -> Columns:
    """Column places and letter heights that let every row of the sheet fit."""
    low, high = shape.power_mm
    power_mm = min(high, max(low, 0.6 * row_mm))
    near, far = shape.distance_mm
    distance_mm = min(far, max(near, row_mm - shape.small_mm - 2.6))
    when = max(text_width_mm(row.clock, shape.small_mm) for row in rows)
    far_mm = max(text_width_mm(row.distance, distance_mm, bold=True) for row in rows)
    if far_mm > 1.08 * when:  # distances beyond 100 with two decimals
        distance_mm = max(near, distance_mm * 1.08 * when / far_mm)
        far_mm = max(text_width_mm(row.distance, distance_mm, bold=True) for row in rows)
    when = max(when, far_mm)
    power = max(text_width_mm(row.power, power_mm, bold=True) for row in rows)
    power_right = shape.margin_mm + when + 1.9 + power
    seen = power_right + 2.0
    wide = shape.width_mm - shape.margin_mm - seen
    return Columns(shape.margin_mm + when, power_right, seen, wide, power_mm, distance_mm)


def row_parts(
    shape: Format, at: Columns, row: Row, top_mm: float, row_mm: float, scale: Scale
) -> tuple[list[Text], list[Line]]:
    """One cue between ``top_mm`` and ``top_mm + row_mm``."""
    middle = top_mm + row_mm / 2
    small, gap = shape.small_mm, min(1.0, 0.11 * row_mm)
    block = at.distance_mm + gap + small
    first = middle - block / 2 + at.distance_mm
    texts = [
        Text(at.when_mm, first, row.distance, at.distance_mm, bold=True, align="right"),
        Text(at.when_mm, first + gap + small, row.clock, small, align="right"),
        Text(
            at.power_right_mm,
            middle + at.power_mm / 2,
            row.power,
            at.power_mm,
            bold=True,
            align="right",
        ),
    ]
    marked = row.w_kj is not None
    room = 1 + int((row_mm - 0.9 - 1.3 * small - 1.3 * marked) / shape.line_mm)
    position = [fitted(row.position, at.seen_width_mm, small, True)] if row.position else []
    seen = folded(row.seen, at.seen_width_mm, small, max(room - len(position) - marked, 0))
    count = len(seen) + len(position) + marked
    high = small + (count - 1) * shape.line_mm + 1.6 * marked
    y = middle - high / 2 + small
    for text, bold in [*((line, False) for line in seen), *((name, True) for name in position)]:
        texts.append(Text(at.seen_mm, y, text, small, bold=bold))
        y += shape.line_mm
    if row.w_kj is None:
        return texts, []
    figure, lines = w_left(at.seen_mm, y, min(at.seen_width_mm, 19.0), row.w_kj, scale, small)
    return [*texts, figure], lines


def w_left(
    x_mm: float, y_mm: float, width_mm: float, left_kj: float, scale: Scale, capital_mm: float
) -> tuple[Text, list[Line]]:
    """W′ left: a figure in kJ over a short straight scale, its reserve marked by a tick."""
    figure = Text(x_mm, y_mm, f"W′ {left_kj:.1f} kJ", capital_mm)
    full = max(scale.full_kj, left_kj, 1e-9)
    filled = x_mm + width_mm * min(1.0, max(0.0, left_kj / full))
    reserve = x_mm + width_mm * min(1.0, max(0.0, scale.reserve_kj / full))
    bar = y_mm + 1.25
    return figure, [
        Line((x_mm, x_mm + width_mm), (bar, bar), 0.12, grey=True),
        Line((x_mm, filled), (bar, bar), 0.7),
        Line((reserve, reserve), (bar - 0.35, bar + 0.9), 0.25),
    ]


def crop_marks(shape: Format, length_mm: float = 3.0) -> list[Line]:
    """Angles in the four corners, on the cutting line."""
    lines = []
    for x, inward in ((0.0, 1), (shape.width_mm, -1)):
        for y, down in ((0.0, 1), (shape.height_mm, -1)):
            lines.append(Line((x, x + inward * length_mm), (y, y), 0.25))
            lines.append(Line((x, x), (y, y + down * length_mm), 0.25))
    return lines


def heading(shape: Format, left: str, right: str, y_mm: float, *, bold: bool = False) -> list[Text]:
    """One line across the card: ``left`` is cut where it would meet ``right``."""
    small = shape.small_mm
    wide = shape.width_mm - 2 * shape.margin_mm
    used = text_width_mm(right, small, bold=bold) + 2.0 if right else 0.0
    texts = [
        Text(shape.margin_mm, y_mm, fitted(drawable(left), wide - used, small, bold), small, bold)
    ]
    if right:
        edge = shape.width_mm - shape.margin_mm
        texts.append(Text(edge, y_mm, right, small, bold, align="right"))
    return texts
