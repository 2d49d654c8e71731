"""The cue sheet, read back by an independent PDF reader (pypdf) with the font's own outlines.

Text places and sizes come from the file's text operators, widths and letter heights from the
DejaVu font file read with fontTools; neither passes through the code that laid the sheet out.
"""

from __future__ import annotations

import re
import warnings
from dataclasses import dataclass
from functools import cache
from itertools import combinations
from pathlib import Path

import matplotlib
import pypdf
import pytest
from fontTools.ttLib import TTFont
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from pypdf.generic import ContentStream

from pacing.report import sheet, style, words
from pacing.report.card import STEM_CARD, Card, folded
from pacing.report.style import fitted

MM = 25.4 / 72.0


@cache
def outlines(bold: bool) -> TTFont:
    name = "DejaVuSans-Bold.ttf" if bold else "DejaVuSans.ttf"
    return TTFont(Path(matplotlib.get_data_path()) / "fonts" / "ttf" / name)


def height_em(letter: str, bold: bool) -> float:
    """Height of a letter over the font size, from its outline."""
    shapes = outlines(bold)
    outline = shapes["glyf"][shapes.getBestCmap()[ord(letter)]]
    return getattr(outline, "yMax", 0) / shapes["head"].unitsPerEm


@dataclass(frozen=True)
class Word:
    """One run of text on a page, in millimetres from the lower left."""

    text: str
    size_mm: float
    bold: bool
    box: tuple[float, float, float, float]

    def height_mm(self, letter: str) -> float:
        return height_em(letter, self.bold) * self.size_mm


class Font:
    """Text and widths of a PDF font's codes, from its own tables."""

    def __init__(self, entry: pypdf.generic.DictionaryObject) -> None:
        self.bold = "Bold" in str(entry["/BaseFont"])
        self.text: dict[int, str] = {}
        pattern = r"<([0-9a-f]{4})> <[0-9a-f]{4}> \[([^]]*)\]"
        for first, texts in re.findall(pattern, entry["/ToUnicode"].get_data().decode()):
            for i, code in enumerate(re.findall("<([0-9a-f]+)>", texts)):
                self.text[int(first, 16) + i] = bytes.fromhex(code).decode("utf-16-be")
        self.width: dict[int, float] = {}
        table = entry["/DescendantFonts"][0].get_object()["/W"]
        for first, widths in zip(table[::2], table[1::2], strict=True):
            for i, width in enumerate(widths):
                self.width[int(first) + i] = float(width) / 1000


def words_on(page: pypdf.PageObject) -> list[Word]:
    """Every run of text between BT and ET, followed through the page's operators."""
    fonts = {name: Font(font.get_object()) for name, font in page["/Resources"]["/Font"].items()}
    found: list[Word] = []
    stack: list[tuple[float, float]] = []
    at, pen, start, text, top = (0.0, 0.0), 0.0, 0.0, "", 0.0
    font, size = None, 0.0
    for operands, operator in ContentStream(page.get_contents(), page.pdf).operations:
        match operator:
            case b"q":
                stack.append(at)
            case b"Q":
                at = stack.pop()
            case b"cm":
                assert [float(value) for value in operands[:4]] == [1, 0, 0, 1]
                at = (at[0] + float(operands[4]), at[1] + float(operands[5]))
            case b"BT":
                pen = start = 0.0
                text, top = "", 0.0
            case b"Tf":
                font, size = fonts[operands[0]], float(operands[1])
            case b"Td":
                start += float(operands[0])
                pen = start
            case b"Tj" | b"TJ":
                assert font is not None
                for part in operands[0] if operator == b"TJ" else operands:
                    if not isinstance(part, (str, bytes)):
                        pen -= float(part) / 1000 * size
                        continue
                    codes = getattr(part, "original_bytes", part)
                    for high, low in zip(codes[::2], codes[1::2], strict=True):
                        text += font.text[256 * high + low]
                        pen += font.width[256 * high + low] * size
                top = max([top, *(height_em(c, font.bold) * size for c in text)])
            case b"ET":
                box = (at[0] * MM, at[1] * MM, (at[0] + pen) * MM, (at[1] + top) * MM)
                found.append(Word(text, size * MM, font is not None and font.bold, box))
    return found


def saved(plan, folder: Path) -> pypdf.PdfReader:
    file = folder / "cue-sheet.pdf"
    sheet.save_pdf(plan, file)
    return pypdf.PdfReader(file)


SHAPES = [
    pytest.param({"cues": 6, "long_names": True, "positions": 2}, id="6 cues, long names"),
    pytest.param({"cues": 12, "shape": "climb", "length_m": 9000.0}, id="12 cues on a climb"),
    pytest.param({"cues": 13, "long_names": True}, id="13 cues, long names"),
    pytest.param({"cues": 16}, id="16 cues"),
    pytest.param({"cues": 24, "positions": 2}, id="24 cues, two positions"),
    pytest.param(
        {
            "cues": 40,
            "long_names": True,
            "positions": 2,
            "length_m": 175_350.0,
            "name": "Round of the seven reservoirs and the windy plateau, clockwise",
            "cautions": ("The road is closed to nobody; look before you cross.",) * 9,
        },
        id="40 cues over hours, long names",
    ),
]


@pytest.fixture(params=SHAPES, scope="module")
def read_back(request, make_plan, tmp_path_factory):
    plan = make_plan(**request.param)
    return plan, saved(plan, tmp_path_factory.mktemp("sheet"))


def test_every_page_is_the_card_at_true_size(read_back):
    _, reader = read_back
    for page in reader.pages:
        assert float(page.mediabox.width) * MM == pytest.approx(60.0, abs=0.01)
        assert float(page.mediabox.height) * MM == pytest.approx(110.0, abs=0.01)


def test_powers_are_at_least_5_mm_high_and_no_letter_is_smaller_than_the_sheet_says(read_back):
    plan, reader = read_back
    powers = [f"{power:.0f}" for power in plan.cues["power_w"]]
    large = [w for page in reader.pages for w in words_on(page) if w.bold and w.size_mm > 6.0]
    assert [w.text for w in large] == powers
    assert all(w.height_mm("0") >= 5.0 for w in large)
    smallest = min(w.height_mm("H") for page in reader.pages for w in words_on(page))
    assert smallest == pytest.approx(STEM_CARD.small_mm, abs=0.01)
    assert f"letters {STEM_CARD.small_mm:.1f} mm" in reader.pages[-1].extract_text()


def test_no_text_leaves_the_safe_margin(read_back):
    _, reader = read_back
    for page in reader.pages:
        for word in words_on(page):
            left, low, right, top = word.box
            assert left >= STEM_CARD.margin_mm - 0.1, word
            assert right <= STEM_CARD.width_mm - STEM_CARD.margin_mm + 0.1, word
            assert low >= STEM_CARD.margin_mm - 0.1, word
            assert top <= STEM_CARD.height_mm - STEM_CARD.margin_mm + 0.1, word


def test_no_text_overlaps_another(read_back):
    _, reader = read_back
    for page in reader.pages:
        for one, other in combinations(words_on(page), 2):
            a, b = one.box, other.box
            apart = a[2] <= b[0] or b[2] <= a[0] or a[3] <= b[1] + 0.02 or b[3] <= a[1] + 0.02
            assert apart, (one, other)


def test_every_cue_stands_on_the_fronts_with_its_kilometre_and_clock_in_order(read_back):
    plan, reader = read_back
    printed = [w.text for page in reader.pages[:-1] for w in words_on(page)]
    clocks = [text for text in printed if text.count(":") == 2]
    assert clocks == [*plan.cues["clock"], words.clock(plan.time_s)]
    kilometres = [f"{km:.2f}" for km in plan.cues["from_km"]]
    assert [text for text in printed if text in set(kilometres)] == kilometres


def test_w_left_stands_at_three_to_five_checkpoints(read_back):
    plan, reader = read_back
    printed = [w.text for page in reader.pages[:-1] for w in words_on(page)]
    told = [text for text in printed if text.startswith("W′ ") and text[3].isdigit()]
    assert 3 <= len(told) <= 5
    known = {f"W′ {kj:.1f} kJ" for kj in plan.cues["w_balance_kj"]}
    assert set(told) <= known


def test_the_back_tells_every_caution(make_plan, tmp_path):
    back = saved(make_plan(), tmp_path).pages[-1].extract_text()
    said = " ".join(back.split())
    for caution in words.CAUTIONS:
        assert caution in said


def test_start_clock_and_finish_are_printed(make_plan, tmp_path):
    reader = saved(make_plan(cues=8), tmp_path)
    front = reader.pages[0].extract_text()
    assert "start 09:30" in front
    assert "finish 40.00 km" in front


def test_the_back_has_a_bar_of_50_mm_to_check_the_print(make_plan, tmp_path):
    reader = saved(make_plan(cues=8), tmp_path)
    stream = ContentStream(reader.pages[-1].get_contents(), reader)
    lengths, last = [], (0.0, 0.0)
    for operands, operator in stream.operations:
        if operator == b"m":
            last = (float(operands[0]), float(operands[1]))
        elif operator == b"l" and abs(float(operands[1]) - last[1]) < 1e-6:
            lengths.append(abs(float(operands[0]) - last[0]) * MM)
    assert any(length == pytest.approx(50.0, abs=0.01) for length in lengths)


def test_more_cues_than_one_card_holds_are_shared_evenly_over_cards(make_plan):
    for cues, cards in ((6, 1), (12, 1), (13, 2), (24, 2), (25, 3), (40, 4)):
        drawn = sheet.cards(make_plan(cues=cues))
        assert len(drawn) == cards + 1


def test_names_a_font_cannot_draw_neither_warn_nor_break_the_sheet(make_plan, tmp_path):
    plan = make_plan(name="$x^2$ 山道 \U0001f6b4 <b>\n\tloop", cues=6)
    plan.cues["landmark"] = ["$\\frac", "山", "\U0001f6b4", "a\x00b", "&lt;", "ﬀ"]
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        reader = saved(plan, tmp_path)
        sheet.save_preview(plan, tmp_path / "cue-sheet.png")
    assert "$x^2$ ?? ? <b> loop" in reader.pages[0].extract_text()


def test_the_same_plan_gives_the_same_bytes(make_plan, tmp_path):
    for name in ("one", "two"):
        sheet.save_pdf(make_plan(), tmp_path / f"{name}.pdf")
        sheet.save_preview(make_plan(), tmp_path / f"{name}.png")
    for kind in ("pdf", "png"):
        assert (tmp_path / f"one.{kind}").read_bytes() == (tmp_path / f"two.{kind}").read_bytes()


def boxes_are_apart(card: Card) -> bool:
    boxes = [text.box_mm for text in card.texts]
    return all(
        a[2] <= b[0] + 0.05 or b[2] <= a[0] + 0.05 or a[3] - 0.3 <= b[1] or b[3] - 0.3 <= a[1]
        for a, b in combinations(boxes, 2)
    )


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(
    cues=st.integers(1, 40),
    names=st.lists(st.text(max_size=60), min_size=1, max_size=5),
    power=st.integers(0, 999),
    hours=st.integers(0, 9),
)
def test_whatever_is_to_be_printed_the_layout_stays_inside_and_apart(
    make_plan, cues, names, power, hours
):
    plan = make_plan(cues=cues, positions=2, length_m=10_000.0)
    plan.cues["landmark"] = [names[i % len(names)] for i in range(cues)]
    plan.cues["power_w"] = power
    plan.cues["clock"] = [f"{hours}:{i:02d}:59" for i in range(cues)]
    for card in sheet.cards(plan):
        assert boxes_are_apart(card)
        for text in card.texts:
            left, top, right, _ = text.box_mm
            assert left >= STEM_CARD.margin_mm - 0.1
            assert right <= STEM_CARD.width_mm - STEM_CARD.margin_mm + 0.1
            assert top >= STEM_CARD.margin_mm - 0.1
            assert text.y_mm <= STEM_CARD.height_mm - STEM_CARD.margin_mm


def test_text_is_cut_with_an_ellipsis_only_where_it_does_not_fit():
    assert fitted("over the top", 40.0, 2.2) == "over the top"
    short = fitted("over the top of the moor", 20.0, 2.2)
    assert short.endswith("…")
    assert style.text_width_mm(short, 2.2) <= 20.0
    lines = folded("second left after the old creamery", 20.0, 2.2, 2)
    assert len(lines) == 2
    assert folded("", 20.0, 2.2, 2) == []
    assert folded("descent 6.3 %, at most 70 km/h", 16.0, 2.2, 4) == [
        "descent",
        "6.3 %, at",
        "most",
        "70 km/h",
    ]
