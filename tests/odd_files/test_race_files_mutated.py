"""A race file changed at random is read or refused in a sentence, never a traceback."""

from __future__ import annotations

import random
import re
from importlib import resources
from pathlib import Path

import pytest

from pacing.errors import PacingError
from pacing.race import build as building
from pacing.race import load_race

STARTER = resources.files("pacing.race").joinpath("starter")
VALUES = (
    "inf", "nan", "-1", "0", "1e308", '""', '"x"', "[]", "{}", "true", "[1, 2]", '"-3 %"', '"+1"',
    "{ yaw_deg = [0, 5], m2 = [0.2, 0.2] }", "09:00:00", "2020-01-01", "9" * 30, "[[[]]]",
    "{ a = { b = { c = 1 } } }", '"\\u0000"', '"aero bars"', "0x10", '"09:30"',
)  # fmt: skip
LINES = (
    "[[options]]", "[air]", "[rider.positions]", "[[rider.positions]]", "[options.x]",
    "rider.mass_kg = 3", "[[air.hours]]", "[course.slow_points]", 'name = "q"',
    '[[options]]\nname = "q"\nbike.crr = "-3 %"', '[[options]]\nname = "q"\nair.hours = "x"',
    '[[options]]\nname = "q"\nrider.positions."aero bars".cda_m2.x.y = 1',
    '[[options]]\nname = "q"\nrider.positions = []', '[[options]]\nname = "q"\nair = "x"',
)  # fmt: skip


def _mutated(lines: list[str], chance: random.Random) -> None:
    at = chance.randrange(len(lines))
    match chance.randrange(6):
        case 0 | 1:
            at = chance.choice([n for n, line in enumerate(lines) if "=" in line])
            lines[at] = f"{lines[at].split('=', 1)[0]}= {chance.choice(VALUES)}"
        case 2:
            del lines[at]
        case 3:
            lines.insert(at, chance.choice(lines))
        case 4:
            line = lines[at]
            place = chance.randrange(len(line) + 1)
            lines[at] = line[:place] + chr(chance.randrange(1, 300)) + line[place + 1 :]
        case _:
            lines.insert(at, chance.choice(LINES))


def test_hundreds_of_mutated_race_files_are_read_or_refused(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    text = STARTER.joinpath("race.toml").read_text("utf-8")
    in_force = re.sub(r"^# ((?:\[|[a-z_\".0-9 ]+ = ).*)$", r"\1", text, flags=re.MULTILINE)
    (tmp_path / "course.gpx").write_bytes(STARTER.joinpath("course.gpx").read_bytes())
    file = tmp_path / "race.toml"
    file.write_text(text, encoding="utf-8")
    course = load_race(file).course
    monkeypatch.setattr(building, "load_course", lambda _: course)
    chance, read, refused = random.Random(11), 0, 0
    for _ in range(500):
        lines = chance.choice((text, in_force)).split("\n")
        for _ in range(chance.randint(1, 4)):
            _mutated(lines, chance)
        file.write_text("\n".join(lines), encoding="utf-8")
        try:
            load_race(file)
            read += 1
        except PacingError as problem:
            assert len(str(problem)) < 700
            refused += 1
    assert read > 50
    assert refused > 200
