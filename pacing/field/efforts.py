"""Test efforts from a table: duration, power, and where given date and position."""

from __future__ import annotations

import csv
import io
from dataclasses import dataclass
from datetime import date
from pathlib import Path

from pacing.errors import UnusableInputError

EXPECTED = "a header line with duration_s and power_w, and if you like date and position"
MOST_EFFORTS = 200


@dataclass(frozen=True)
class Efforts:
    """Efforts as read, one entry each; ``date`` None and ``position`` "" where not given."""

    duration_s: tuple[float, ...]
    power_w: tuple[float, ...]
    date: tuple[date | None, ...]
    position: tuple[str, ...]


def read_efforts(file: Path) -> Efforts:
    """Efforts from a CSV file.

    Raises `UnusableInputError`, with the line, where a column is absent or a value is none.
    """
    rows = csv.reader(io.StringIO(read_text(file), newline=""))
    header = [word.strip() for word in next(rows, [])]
    missing = [name for name in ("duration_s", "power_w") if name not in header]
    if missing:
        raise UnusableInputError(
            f"no column {' and '.join(missing)}", file=file, line=1, expected=EXPECTED
        )
    found = []
    try:
        for row in rows:
            if any(word.strip() for word in row):
                words = dict(zip(header, (word.strip() for word in row), strict=False))
                found.append(_effort(words, rows.line_num, file))
    except csv.Error as problem:
        raise UnusableInputError(
            f"not a CSV table ({problem})", file=file, line=rows.line_num, expected=EXPECTED
        ) from None
    if len(found) > MOST_EFFORTS:
        raise UnusableInputError(
            f"{len(found)} efforts", file=file, expected=f"at most {MOST_EFFORTS}"
        )
    if not found:
        raise UnusableInputError("no efforts", file=file, expected="one line for each effort")
    duration, power, day, position = zip(*found, strict=True)
    if any(position) and not all(position):
        raise UnusableInputError(
            "a position for some efforts only", file=file, key="position", expected="one for each"
        )
    return Efforts(duration, power, day, position)


def read_text(file: Path) -> str:
    """A text file, with an error in the user's terms where it cannot be read."""
    try:
        data = file.read_bytes()
    except OSError as problem:
        raise UnusableInputError(f"cannot be read ({problem.strerror})", file=file) from None
    if not data.strip():
        raise UnusableInputError("the file is empty", file=file, expected=EXPECTED)
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError:
        return data.decode("latin-1")


def _effort(words: dict[str, str], line: int, file: Path) -> tuple[float, float, date | None, str]:
    day = words.get("date", "")
    try:
        when = date.fromisoformat(day) if day else None
    except ValueError:
        raise UnusableInputError(
            f"'{day}'", file=file, line=line, key="date", expected="a date such as 2031-05-20"
        ) from None
    return (
        _number(words, "duration_s", line, file),
        _number(words, "power_w", line, file),
        when,
        words.get("position", ""),
    )


def _number(words: dict[str, str], name: str, line: int, file: Path) -> float:
    from pacing.field.power_fit import LEAST_S, LEAST_W, MOST_S, MOST_W

    low, high, unit = (LEAST_S, MOST_S, "s") if name == "duration_s" else (LEAST_W, MOST_W, "W")
    text = words.get(name, "")
    try:
        value = float(text)
    except ValueError:
        value = float("nan")
    if not low <= value <= high:
        raise UnusableInputError(
            f"'{text}'",
            file=file,
            line=line,
            key=name,
            expected=f"a number from {low:g} to {high:g} {unit}",
        )
    return value
