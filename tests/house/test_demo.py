"""What is shown of the demo is what it prints and draws today.

Last digits may differ between machines: the solver's sums are rounded differently, and a cue may
fall to the neighbouring step of power. What is shown is out of date where words differ, or numbers
by more than that.
"""

from __future__ import annotations

import re
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest
from PIL import Image

MEND = "out of date: python demo/make.py"
CLOCK = re.compile(r"\b(\d+):(\d\d):(\d\d)\b")
NUMBER = re.compile(r"\d+(?:\.\d+)?")
CLOCK_S = 20.0
A_STEP = 5.0


def words(text: str) -> list[str]:
    """The lines with every number left out, spaces made one."""
    return [" ".join(NUMBER.sub("#", CLOCK.sub("@", line)).split()) for line in text.splitlines()]


def clocks_s(text: str) -> list[int]:
    """Every clock in seconds."""
    return [3600 * int(h) + 60 * int(m) + int(s) for h, m, s in CLOCK.findall(text)]


def numbers(text: str) -> list[float]:
    """Every number that is not part of a clock."""
    return [float(number) for number in NUMBER.findall(CLOCK.sub("", text))]


def test_the_printed_plan_is_the_one_that_is_shown(root: Path, demo_printed: str) -> None:
    shown = (root / "demo" / "shown" / "plan.txt").read_text(encoding="utf-8")
    assert words(shown) == words(demo_printed), MEND
    assert clocks_s(shown) == pytest.approx(clocks_s(demo_printed), abs=CLOCK_S), MEND
    assert numbers(shown) == pytest.approx(numbers(demo_printed), abs=A_STEP, rel=0.01), MEND


def test_the_comparison_sees_another_word_another_clock_and_another_power(root: Path) -> None:
    shown = (root / "demo" / "shown" / "plan.txt").read_text(encoding="utf-8")
    assert words(shown) != words(shown.replace("finish", "end"))
    assert words(shown) != words(shown + "one more line\n")
    assert len(clocks_s(shown)) > 10
    assert len(numbers(shown)) > 80
    assert numbers("275 W at km 6.5 by 0:10:30") == [275.0, 6.5]


@pytest.mark.parametrize("name", ["cue-sheet.png", "profile.png", "map.png"])
def test_the_pictures_are_the_ones_that_are_shown(
    root: Path, newcomer: Path, demo_printed: str, make_shown: ModuleType, name: str
) -> None:
    today = make_shown.smaller(newcomer / "demo" / "out" / name).convert("L")
    with Image.open(root / "demo" / "shown" / name) as picture:
        shown = picture.convert("L")
    assert today.size == shown.size, MEND
    coarse = (today.width // 16, today.height // 16)
    apart = np.subtract(
        *(np.asarray(image.resize(coarse, Image.Resampling.BOX), float) for image in (today, shown))
    )
    # Other figures on a card, or another line in a strip, change some tiles of 16 pixels by 40
    # and more of 255 grey levels.
    assert np.mean(np.abs(apart) > 40) < 0.02, MEND


def test_the_pictures_are_small(root: Path) -> None:
    for file in (root / "demo" / "shown").iterdir():
        assert file.stat().st_size < 200_000, file.name


def test_the_readme_shows_what_is_shown(root: Path, readme: str, make_shown: ModuleType) -> None:
    shown = (root / "demo" / "shown" / "plan.txt").read_text(encoding="utf-8")
    assert readme == make_shown.renewed(readme, shown), MEND
