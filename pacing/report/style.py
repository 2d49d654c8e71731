"""One look for every picture: ink, grey and a single perceptually uniform map.

Identity comes from labels and line styles, never from a hue. Everything is drawn on ``Figure``
objects inside ``applied()``, so a user's own matplotlib settings change nothing, and is saved
without dates, so the same plan gives the same bytes.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from functools import lru_cache
from typing import Any

import matplotlib as mpl
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.font_manager import FontProperties, findfont, get_font
from matplotlib.textpath import text_to_path

INK = "#1a1a1a"
GREY = "#6e6e6e"
RULE = "#b4b4b4"
FILL = "#dedede"
PAPER = "#ffffff"
DESK = "#ececec"
COLOUR_MAP = "cividis"
TITLE_PT = 13.0

FONT = "DejaVu Sans"
CAPITAL_EM = 0.729
"""Height of capitals and figures over the font size (DejaVu Sans: 1493 of 2048 units)."""
SMALL_EM = 0.547
"""Height of a lower-case x over the font size (DejaVu Sans: 1120 of 2048 units)."""
MM_PER_INCH = 25.4
POINTS_PER_INCH = 72.0

_SETTINGS: Any = {
    "font.family": [FONT],
    "font.size": 9.0,
    "text.color": INK,
    "text.parse_math": False,
    "text.hinting": "none",
    "axes.unicode_minus": True,
    "axes.edgecolor": GREY,
    "axes.labelcolor": INK,
    "axes.linewidth": 0.6,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.facecolor": "none",
    "axes.axisbelow": True,
    "figure.facecolor": PAPER,
    "xtick.color": GREY,
    "ytick.color": GREY,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "xtick.major.size": 3.0,
    "ytick.major.size": 0.0,
    "xtick.major.width": 0.6,
    "xtick.labelsize": 9.0,
    "ytick.labelsize": 8.0,
    "grid.color": FILL,
    "grid.linewidth": 0.6,
    "lines.solid_capstyle": "butt",
    "legend.frameon": False,
    "legend.fontsize": 8.5,
    "pdf.fonttype": 42,
    "svg.fonttype": "none",
    "svg.hashsalt": "pacing",
    "savefig.bbox": None,
}

PNG_METADATA: dict[str, Any] = {"Software": None}
PDF_METADATA: dict[str, Any] = {"Creator": "pacing", "Producer": None, "CreationDate": None}


@contextmanager
def applied() -> Iterator[None]:
    """Draw and save inside this: our settings over matplotlib's defaults, the caller's put back."""
    with mpl.rc_context():
        mpl.rcdefaults()
        mpl.rcParams.update(_SETTINGS)
        yield


def inches(length_mm: float) -> float:
    """Millimetres to inches, which is what a ``Figure`` is sized in."""
    return length_mm / MM_PER_INCH


def capitals(size_pt: float) -> float:
    """Height (mm) of capitals and figures of a font size (pt)."""
    return size_pt * CAPITAL_EM / POINTS_PER_INCH * MM_PER_INCH


def points_for(capital_mm: float) -> float:
    """Font size (pt) whose capitals and figures are ``capital_mm`` high."""
    return capital_mm / CAPITAL_EM / MM_PER_INCH * POINTS_PER_INCH


def text_width_mm(text: str, capital_mm: float, *, bold: bool = False) -> float:
    """Width (mm) of one line of text whose capitals are ``capital_mm`` high."""
    width, _, _ = text_to_path.get_text_width_height_descent(
        text, _font(bold, points_for(capital_mm)), False
    )
    return float(width) / POINTS_PER_INCH * MM_PER_INCH


@lru_cache(maxsize=4096)
def fitted(text: str, width_mm: float, capital_mm: float, bold: bool = False) -> str:
    """``text`` cut with an ellipsis so that it is no wider than ``width_mm``."""
    if text_width_mm(text, capital_mm, bold=bold) <= width_mm:
        return text
    kept = text
    while kept and text_width_mm(f"{kept}…", capital_mm, bold=bold) > width_mm:
        kept = kept[:-1]
    return f"{kept.rstrip(' ,;-')}…"


@lru_cache(maxsize=64)
def _font(bold: bool, size_pt: float) -> FontProperties:
    return FontProperties(family=[FONT], weight="bold" if bold else "normal", size=size_pt)


@lru_cache(maxsize=1)
def _glyphs() -> frozenset[int]:
    normal, bold = (
        frozenset(get_font(findfont(_font(heavy, 10.0))).get_charmap()) for heavy in (False, True)
    )
    return normal & bold


def drawable(text: str) -> str:
    """``text`` on one line, with what the font cannot draw as a question mark.

    Names come from users' files; a missing glyph would otherwise warn and leave a box.
    """
    plain = " ".join(text.split())
    return "".join(letter if ord(letter) in _glyphs() else "?" for letter in plain)


def title(figure: Figure, name: str, after: str, at: tuple[float, float], width_mm: float) -> None:
    """The picture's title at a place in figure fractions; a long name is cut to ``width_mm``."""
    capital_mm = capitals(TITLE_PT)
    rest = f", {after}"
    left_mm = width_mm - text_width_mm(rest, capital_mm, bold=True)
    text = fitted(drawable(name) or "course", left_mm, capital_mm, True) + rest
    figure.text(*at, text, fontsize=TITLE_PT, fontweight="bold")


def quiet_axes(axes: Axes) -> None:
    """Leave of an axis frame only the line below."""
    axes.spines["left"].set_visible(False)
    axes.grid(axis="y")
