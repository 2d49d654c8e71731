"""Course files damaged at random: each gives a course or a plain refusal, never a traceback.

The ordinary run breaks a few hundred files; the slow one thousands. Neither may take 10 s over a
file, nor more than 500 MB.
"""

from __future__ import annotations

import random
import resource
import time
from pathlib import Path

import numpy as np
import pytest

from pacing.course import CourseSpec
from pacing.course.load import survey_course
from pacing.errors import PacingError, UnusableInputError
from pacing.report.course_report import course_document, course_text
from pacing.report.strict_json import json_text

NUMBERS = (
    "nan", "inf", "-inf", "1e308", "-1e308", "1e-320", "0", "-0.0", "", " ", "9" * 400, "1_0", "٣",
    "90", "-90", "180", "-180", "89.99999", "0x10", "1,5", "--1", "1e5", "12345678", "\x00",
)  # fmt: skip
TAGS = ("gpx", "trk", "trkseg", "trkpt", "ele", "name", "time", "rte", "rtept", "extensions")
WORDS = (
    "&amp;",
    "&lt;",
    "&x;",
    "<!-- -->",
    "<![CDATA[",
    "]]>",
    "<?x?>",
    "<!DOCTYPE gpx>",
    "\ufffe",
)


def _base(seed: int) -> str:
    """A small sound course: a track or route, some with times, names, gaps in the heights."""
    chance = random.Random(seed)
    count = chance.choice((2, 5, 20, 60, 60))
    spacing = chance.choice((1e-4, 5e-4, 2e-3))
    way = np.arange(count)
    lat = chance.uniform(-89, 89) + spacing * way
    lon = chance.uniform(-180, 180) + spacing * 5 * np.sin(way / 7)
    rows = []
    for n, (a, o) in enumerate(zip(lat, (lon + 180) % 360 - 180, strict=True)):
        ele = "" if chance.random() < 0.1 else f"<ele>{100 + 3 * np.sin(n / 5):.1f}</ele>"
        clock = f"<time>2024-05-01T08:00:{n % 60:02d}Z</time>" if seed % 3 == 0 else ""
        rows.append(f'<trkpt lat="{a:.6f}" lon="{o:.6f}">{ele}{clock}</trkpt>')
    text = (
        '<?xml version="1.0" encoding="UTF-8"?>\n<gpx version="1.1" creator="t">\n'
        "<trk><name>Low Moor</name><trkseg>\n" + "\n".join(rows) + "\n</trkseg></trk>\n</gpx>\n"
    )
    if seed % 5 == 1:
        text = text.replace("trkpt", "rtept").replace("<trk>", "<rte>").replace("</trk>", "</rte>")
        text = text.replace("<trkseg>", "").replace("</trkseg>", "")
    return text


def _damaged(seed: int) -> bytes:
    """A base with one to four damages."""
    chance = random.Random(seed)
    data = bytearray(_base(seed).encode(chance.choice(("utf-8",) * 8 + ("utf-16", "utf-8-sig"))))
    for _ in range(chance.choice((1, 1, 2, 3))):
        at = chance.randrange(len(data) + 1)
        to = min(len(data), at + chance.randint(1, 80))
        kind = chance.randrange(20)
        if kind == 0 and at < len(data):
            data[at] = chance.randrange(256)
        elif kind == 1:
            del data[at:to]
        elif kind == 2:
            data[at:at] = data[at:to] * chance.choice((1, 2, 50))
        elif kind == 3:
            del data[at:]
        elif kind == 4:
            data[at:at] = chance.choice(WORDS).encode()
        elif kind == 5:
            _replace_some(data, chance, chance.choice(TAGS), chance.choice(TAGS))
        else:
            _spoil_number(data, chance)
        if not data:
            break
    return bytes(data)


def _replace_some(data: bytearray, chance: random.Random, old: str, new: str) -> None:
    data[:] = data.replace(old.encode(), new.encode(), chance.choice((1, 2, -1)))


def _spoil_number(data: bytearray, chance: random.Random) -> None:
    """Another number in place of a latitude, longitude or height."""
    mark = chance.choice((b'lat="', b'lon="', b"<ele>"))
    places = [n for n in range(len(data)) if data.startswith(mark, n)]
    if places:
        start = chance.choice(places) + len(mark)
        end = start
        while end < len(data) and data[end : end + 1] not in (b'"', b"<"):
            end += 1
        near = f"{data[start:end].decode('latin-1')[:-3]}{chance.randrange(1000)}"
        far = f"{chance.uniform(-200, 200):.4f}"
        value = chance.choice((chance.choice(NUMBERS), near, near, far))
        data[start:end] = value.encode()


def _try(file: Path, data: bytes) -> str:
    """What became of the file: the verdict, or the kind of refusal."""
    file.write_bytes(data)
    try:
        survey = survey_course(CourseSpec(file=file))
        json_text(course_document(survey.course))
        course_text(survey.course)
    except UnusableInputError as refused:
        assert str(refused).startswith(str(file))
        return "refused"
    except PacingError as wrong:
        raise AssertionError(f"no user's fault: {wrong}") from wrong
    return survey.course.report.verdict


def _run(tmp_path: Path, seeds: range) -> dict[str, int]:
    outcomes: dict[str, int] = {}
    for seed in seeds:
        begun = time.perf_counter()
        try:
            outcome = _try(tmp_path / "course.gpx", _damaged(seed))
        except Exception as problem:
            raise AssertionError(f"seed {seed}: {type(problem).__name__}: {problem}") from problem
        assert time.perf_counter() - begun < 10.0, f"seed {seed} took too long"
        outcomes[outcome] = outcomes.get(outcome, 0) + 1
    return outcomes


def _peak_mb() -> float:
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0


def test_hundreds_of_damaged_course_files_give_a_course_or_a_refusal(tmp_path):
    outcomes = _run(tmp_path, range(300))
    # Both ways must be met, or the damage is too strong or too weak to test anything.
    assert min(outcomes.get("refused", 0), outcomes.get("usable", 0)) >= 10


@pytest.mark.slow
def test_thousands_of_damaged_course_files_give_a_course_or_a_refusal(tmp_path, capsys):
    before = _peak_mb()
    begun = time.perf_counter()
    outcomes = _run(tmp_path, range(1_000, 6_000))
    took = time.perf_counter() - begun
    with capsys.disabled():
        print(
            f"\n5,000 damaged course files: {outcomes}, {took:.0f} s in all, "
            f"peak {_peak_mb():.0f} MB (before {before:.0f} MB)"
        )
    assert _peak_mb() - before < 500.0


ROWS = ["lat_deg,lon_deg,elevation_m"] + [f"{50 + n / 2000},{7 + n / 3000},{n}" for n in range(30)]


def test_hundreds_of_damaged_tables_give_a_course_or_a_refusal(tmp_path):
    outcomes: dict[str, int] = {}
    for seed in range(200):
        chance = random.Random(seed)
        rows = [row.split(",") for row in ROWS]
        for _ in range(chance.randint(1, 4)):
            row = chance.randrange(len(rows))
            if not rows[row]:
                continue
            kind = chance.randrange(4)
            if kind == 0:
                rows[row][chance.randrange(len(rows[row]))] = chance.choice(NUMBERS)
            elif kind == 1:
                rows[row] = rows[row][: chance.randrange(len(rows[row]) + 1)]
            elif kind == 2:
                rows.insert(row, chance.choice([[], ['"'], ["a"] * 9, rows[row]]))
            else:
                del rows[row:]
                rows.append(["50"])
        outcome = _try(tmp_path / "course.csv", "\n".join(map(",".join, rows)).encode())
        outcomes[outcome] = outcomes.get(outcome, 0) + 1
    assert min(outcomes["refused"], outcomes["good"]) >= 10
