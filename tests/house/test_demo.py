"""What is shown of the demo is what it prints and draws today.

Near-ties are decided by the last digits of the solver's sums, which are not the same on every
machine: a cue may begin a little earlier at a few watts less and the finish move by a second. What
is shown is out of date where the words or the layout differ, or the plan by more than that.
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
ROW = re.compile(r"^ *(\d+\.\d+)  .*?(?: +(\d+) +\d+\.\d)? +(\d+:\d\d:\d\d) +\d+\.\d$")
FINISH_S, ON_THE_WAY_S, POWER_W = 4.0, 15.0, 8.0


@pytest.fixture(scope="module")
def shown(root: Path) -> str:
    """What was printed when ``demo/make.py`` ran last."""
    return (root / "demo" / "shown" / "plan.txt").read_text(encoding="utf-8")


def blocks(text: str) -> list[str]:
    """What stands between empty lines."""
    return text.strip("\n").split("\n\n")


def words(text: str) -> str:
    """The text with every number left out, spaces and line ends made one space."""
    return " ".join(NUMBER.sub("#", CLOCK.sub("@", text)).split())


def clocks_s(text: str) -> list[int]:
    """Every clock in seconds."""
    return [3600 * int(h) + 60 * int(m) + int(s) for h, m, s in CLOCK.findall(text)]


def powers_w(cues: str) -> np.ndarray:
    """Power in every tenth of a kilometre, from the table of cues."""
    rows = [found.groups() for line in cues.splitlines() if (found := ROW.match(line))]
    *starts, finish = (float(km) for km, _, _ in rows)
    tenths = np.arange(0.05, finish, 0.1)
    power = np.array([float(watts) for _, watts, _ in rows[:-1]])
    return power[np.searchsorted(starts, tenths, side="right") - 1]


def test_the_words_and_the_layout_are_those_that_are_shown(shown: str, demo_printed: str) -> None:
    then, now = blocks(shown), blocks(demo_printed)
    assert [block.split("\n")[0] for block in then[2:5]] == [
        block.split("\n")[0] for block in now[2:5]
    ], MEND
    assert (then[0], words(then[1])) == (now[0], words(now[1])), MEND
    assert then[-1] == now[-1], MEND
    assert len(then) == len(now), MEND


def test_the_finish_is_the_one_that_is_shown(shown: str, demo_printed: str) -> None:
    (then,), (now,) = (clocks_s(blocks(text)[1].split("\n")[0]) for text in (shown, demo_printed))
    assert then == pytest.approx(now, abs=FINISH_S), MEND


def test_the_powers_are_those_that_are_shown(shown: str, demo_printed: str) -> None:
    then, now = (powers_w(blocks(text)[2]) for text in (shown, demo_printed))
    assert len(then) == len(now), MEND
    assert np.mean(np.abs(then - now)) < POWER_W, MEND


def test_the_splits_are_those_that_are_shown(shown: str, demo_printed: str) -> None:
    then, now = (clocks_s(blocks(text)[3]) for text in (shown, demo_printed))
    assert then == pytest.approx(now, abs=ON_THE_WAY_S), MEND


def test_the_table_of_cues_is_read_as_it_is_printed() -> None:
    table = """\
  from  what you see there                    power   speed     clock  W′ left
    km                                            W    km/h   h:mm:ss       kJ
  0.00  start                                   275    39.7   0:00:00     17.5
  0.40  climb 1 %, at most 65 km/h              335    21.6   0:00:40     16.7
  0.60                                          180    45.8   0:01:00      3.1
  0.82  finish                                                0:01:27      3.6"""
    assert powers_w(table).tolist() == [275.0] * 4 + [335.0] * 2 + [180.0] * 2


@pytest.mark.parametrize("name", ["cue-sheet.png", "profile.png", "map.png"])
def test_the_pictures_look_as_those_that_are_shown(
    root: Path, newcomer: Path, demo_printed: str, make_shown: ModuleType, name: str
) -> None:
    assert demo_printed
    today = make_shown.smaller(newcomer / "demo" / "out" / name).convert("L")
    with Image.open(root / "demo" / "shown" / name) as picture:
        shown = picture.convert("L")
    assert today.size == shown.size, MEND
    coarse = (today.width // 16, today.height // 16)
    tiles = (
        np.asarray(image.resize(coarse, Image.Resampling.BOX), float) for image in (today, shown)
    )
    # Other figures in the same places change few tiles of 16 pixels, another layout many.
    assert np.mean(np.abs(np.subtract(*tiles)) > 40) < 0.03, MEND


def test_the_pictures_are_small(root: Path) -> None:
    for file in (root / "demo" / "shown").iterdir():
        assert file.stat().st_size < 200_000, file.name


def test_the_readme_shows_what_is_shown(shown: str, readme: str, make_shown: ModuleType) -> None:
    assert readme == make_shown.renewed(readme, shown), MEND
