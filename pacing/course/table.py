"""A course as a CSV table: lat_deg, lon_deg and, where known, elevation_m."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator
from math import nan
from pathlib import Path

import numpy as np

from pacing.course.gpx import MOST_POINTS
from pacing.course.track import Track
from pacing.errors import UnusableInputError

COLUMNS = ("lat_deg", "lon_deg", "elevation_m")
EXPECTED = "a header line with lat_deg, lon_deg and elevation_m"


def read_table(data: bytes, file: Path) -> Track:
    """The points of a CSV file; an empty elevation is a missing one, other columns are ignored.

    Raises UnusableInputError, with the line, where a column is absent or a value no number in
    range, and on more than ``MOST_POINTS`` rows.
    """
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = data.decode("latin-1")
    rows = csv.reader(io.StringIO(text, newline=""))
    try:
        header = [word.strip() for word in next(rows, [])]
        places = _columns(header, file)
        values = [
            _numbers(row, places, rows.line_num, file)
            for row in _limited(rows, file)
            if any(word.strip() for word in row)
        ]
    except csv.Error as problem:
        raise UnusableInputError(
            f"not a CSV table ({problem})", file=file, line=rows.line_num, expected=EXPECTED
        ) from None
    points = np.array(values, dtype=float).reshape(-1, 3)
    return Track(
        name="",
        lat_deg=points[:, 0],
        lon_deg=points[:, 1],
        elevation_m=points[:, 2],
        time_s=None,
        segment=np.zeros(len(points), dtype=np.int64),
    )


def _columns(header: list[str], file: Path) -> list[int | None]:
    missing = [name for name in COLUMNS[:2] if name not in header]
    if missing:
        found = ", ".join(header)[:80] or "nothing"
        raise UnusableInputError(
            f"no column {' and '.join(missing)} among: {found}",
            file=file,
            line=1,
            expected=EXPECTED,
            mend="name the columns so, separated by commas",
        )
    return [header.index(name) if name in header else None for name in COLUMNS]


def _limited(rows: Iterable[list[str]], file: Path) -> Iterator[list[str]]:
    for count, row in enumerate(rows):
        if count >= MOST_POINTS:
            raise UnusableInputError(
                f"more than {MOST_POINTS:,} points",
                file=file,
                expected="a course with fewer",
                mend="thin out the points or cut the course into parts",
            )
        yield row


def _numbers(
    row: list[str], places: list[int | None], line: int, file: Path
) -> tuple[float, float, float]:
    lat, lon, elevation = (
        row[place].strip() if place is not None and place < len(row) else "" for place in places
    )
    return (
        _number(lat, "lat_deg", 90.0, line, file),
        _number(lon, "lon_deg", 180.0, line, file),
        _number(elevation, "elevation_m", None, line, file) if elevation else nan,
    )


def _number(text: str, name: str, limit: float | None, line: int, file: Path) -> float:
    try:
        value = float(text)
        if limit is None or abs(value) <= limit:
            return value
    except ValueError:
        pass
    wanted = "a height in metres"
    if limit is not None:
        wanted = f"a number between -{limit:.0f} and {limit:.0f}"
    raise UnusableInputError(f"{name} is '{text[:40]}'", file=file, line=line, expected=wanted)
