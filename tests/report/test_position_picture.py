"""The picture and the lines about several positions: complete, inside, and absent with one."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.text import Text

from pacing.report import position_picture, style, tables, words

GRADIENT = np.arange(-3.0, 12.1, 1.0)


def _found(lower="aero bars", upper="upright", **changes):
    equal = [None if g < 0 else 8.0 * (g + 0.3) ** 0.5 for g in GRADIENT.tolist()]
    found = {
        "lower": lower,
        "upper": upper,
        "crossover_kmh": 22.4,
        "crossover_gradient_pct": 4.7,
        "break_even_share": 0.874,
        "upper_power_share": 1.04,
        "power_share": 1.0,
        "effort_w": 303.0,
        "worth_s": 4.25,
        "best_single": lower,
        "changes": 3,
        "outside_s": 0.0,
        "pairs": [],
        "lines": {
            "gradient_pct": GRADIENT.tolist(),
            "lower_kmh": (44.0 - 4.0 * GRADIENT + 0.12 * GRADIENT**2).tolist(),
            "upper_kmh": (41.0 - 3.5 * GRADIENT + 0.1 * GRADIENT**2).tolist(),
            "equal_kmh": equal,
        },
    }
    return found | changes


def _sitting(plan, **changes):
    cues = plan.cues.copy()
    found = _found(**changes)
    cues["position"] = [found["lower"], found["upper"]] * (len(cues) // 2) + [found["lower"]] * (
        len(cues) % 2
    )
    cues["gradient_pct"] = np.linspace(-2.0, 9.0, len(cues))
    return replace(plan, cues=cues, positions=found)


CASES = [
    pytest.param({}, id="two positions"),
    pytest.param({"lower": "山道 " * 9, "upper": "sitting up with hands on top"}, id="long names"),
    pytest.param(
        {"crossover_kmh": None, "crossover_gradient_pct": None, "worth_s": None, "changes": 0},
        id="no crossover",
    ),
]


@pytest.mark.parametrize("changes", CASES)
def test_every_text_is_inside_the_picture_and_clear_of_the_others(make_plan, changes):
    with style.applied():
        picture = position_picture.figure(_sitting(make_plan(cues=9), **changes))
        renderer = FigureCanvasAgg(picture).get_renderer()
        picture.draw(renderer)
        shown = [
            (text.get_text(), text.get_window_extent(renderer))
            for text in picture.findobj(Text)
            if text.get_visible() and text.get_text().strip()
        ]
        wide, high = picture.get_size_inches() * picture.dpi
    for text, box in shown:
        assert box.x0 >= -1 and box.y0 >= -1, text
        assert box.x1 <= wide + 1 and box.y1 <= high + 1, text
    for (one, a), (other, b) in combinations(shown, 2):
        across = min(a.x1, b.x1) - max(a.x0, b.x0)
        up = min(a.y1, b.y1) - max(a.y0, b.y0)
        assert across <= 1.5 or up <= 3.5, (one, other)


def test_the_table_says_crossover_worth_and_break_even(make_plan):
    plan = _sitting(make_plan(cues=9))
    said = " ".join(tables.plan_text(plan).split())
    assert "upright is faster than aero bars below 22.4 km/h" in said
    assert "Changing position gains 4.3 s" in said or "gains 4.2 s" in said
    assert "less than 16.0 % of power" in said


def test_a_plan_with_one_position_says_nothing_of_positions(make_plan, tmp_path):
    plan = make_plan(cues=9)
    assert tables.positions(plan, words.METRIC) == ()
    assert "position" not in tables.plan_text(plan)


def test_the_picture_is_a_file_of_the_same_bytes_twice(make_plan, tmp_path):
    plan = _sitting(make_plan(cues=9))
    for name in ("one.png", "two.png"):
        position_picture.save_positions(plan, tmp_path / name)
    assert (tmp_path / "one.png").read_bytes() == (tmp_path / "two.png").read_bytes()
