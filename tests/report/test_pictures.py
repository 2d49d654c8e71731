"""Profile and map: drawn without a warning, every text inside and clear of the others."""

from __future__ import annotations

from itertools import combinations, pairwise

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.text import Text

from pacing.report import course_map, figures, profile, style
from pacing.report.label_places import lanes
from pacing.report.lines_on_paper import lap_nodes, moved

SHAPES = [
    pytest.param({}, id="rolling, 16 cues"),
    pytest.param({"cues": 40}, id="rolling, 40 cues"),
    pytest.param({"cues": 40, "length_m": 175_350.0, "wind": (0.0, 0.0)}, id="175 km, calm"),
    pytest.param({"shape": "climb", "length_m": 9_000.0, "cues": 8}, id="climb"),
    pytest.param({"shape": "out and back", "length_m": 16_100.0}, id="out and back"),
    pytest.param({"shape": "laps", "length_m": 25_000.0, "cues": 24}, id="laps"),
    pytest.param({"length_m": 900.0, "cues": 2}, id="900 m"),
    pytest.param({"name": "$x^2$ 山道\n" + "long name " * 30}, id="hostile name"),
]


def texts_of(picture):
    """Every visible text with its box in pixels, as the renderer sets it."""
    renderer = FigureCanvasAgg(picture).get_renderer()
    picture.draw(renderer)
    return [
        (text.get_text(), text.get_window_extent(renderer))
        for text in picture.findobj(Text)
        if text.get_visible() and text.get_text().strip()
    ]


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("drawn", [profile, course_map], ids=["profile", "map"])
def test_every_text_is_inside_the_picture_and_clear_of_the_others(make_plan, drawn, shape):
    with style.applied():
        picture = drawn.figure(make_plan(**shape))
        shown = texts_of(picture)
        wide, high = picture.get_size_inches() * picture.dpi
    for text, box in shown:
        assert box.x0 >= -1 and box.y0 >= -1, text
        assert box.x1 <= wide + 1 and box.y1 <= high + 1, text
    for (one, a), (other, b) in combinations(shown, 2):
        across = min(a.x1, b.x1) - max(a.x0, b.x0)
        up = min(a.y1, b.y1) - max(a.y0, b.y0)
        assert across <= 1.5 or up <= 3.5, (one, other)


def test_every_cue_power_is_written_on_the_profile(make_plan):
    plan = make_plan(cues=40)
    with style.applied():
        shown = [text for text, _ in texts_of(profile.figure(plan))]
    for power in plan.cues["power_w"]:
        assert str(power) in shown


def test_the_same_plan_gives_the_same_pictures(make_plan, tmp_path):
    for name in ("one", "two"):
        figures.save_profile(make_plan(), tmp_path / f"{name}-profile.png")
        figures.save_map(make_plan(), tmp_path / f"{name}-map.png")
    for kind in ("profile", "map"):
        first, second = (tmp_path / f"{name}-{kind}.png" for name in ("one", "two"))
        assert first.read_bytes() == second.read_bytes()


def test_a_users_own_plotting_settings_change_nothing_and_stay_as_they_were(make_plan, tmp_path):
    figures.save_profile(make_plan(), tmp_path / "plain.png")
    with mpl.rc_context({"font.size": 30, "axes.facecolor": "red", "lines.linewidth": 9}):
        figures.save_profile(make_plan(), tmp_path / "garish.png")
        assert mpl.rcParams["font.size"] == 30
    assert (tmp_path / "plain.png").read_bytes() == (tmp_path / "garish.png").read_bytes()


def test_the_colours_keep_their_order_in_grey():
    # Relative luminance of sRGB (IEC 61966-2-1; coefficients of ITU-R BT.709).
    colour = mpl.colormaps[style.COLOUR_MAP](np.linspace(0, 1, 64))[:, :3]
    linear = np.where(colour <= 0.04045, colour / 12.92, ((colour + 0.055) / 1.055) ** 2.4)
    assert (np.diff(linear @ [0.2126, 0.7152, 0.0722]) > 0).all()


def test_wind_on_the_map_is_the_wind_that_was_met(make_plan):
    wind = course_map.mean_wind(make_plan(wind=(2.3, 310.0)).trace)
    assert wind.speed_m_s == pytest.approx(2.3)
    assert wind.from_deg == pytest.approx(310.0)
    assert -2.3 <= wind.least_along_m_s < wind.most_along_m_s <= 2.3


def test_labels_in_one_lane_keep_apart_while_there_are_lanes():
    middle = np.array([10.0, 20.0, 30.0, 100.0])
    wide = np.full(4, 22.0)
    chosen = lanes(middle, wide, 3)
    for lane in range(3):
        at = middle[chosen == lane]
        assert all(b - a >= 22.0 for a, b in pairwise(at))


def test_out_and_back_are_drawn_apart_and_each_on_its_own_right():
    out = np.column_stack([np.linspace(0, 100, 101), np.zeros(101)])
    there_and_back = np.concatenate([out, out[-2::-1]])
    shown = moved(there_and_back, [(0, 200)], 4.0)
    assert shown[50] == pytest.approx([50.0, -2.0])
    assert shown[150] == pytest.approx([50.0, 2.0])


def test_laps_are_told_apart_at_their_lengths():
    assert lap_nodes(np.linspace(0.0, 30.0, 31), 10.0, 3) == [(0, 10), (10, 20), (20, 30)]
    assert lap_nodes(np.linspace(0.0, 30.0, 31), 30.0, 1) == [(0, 30)]
