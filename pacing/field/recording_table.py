"""A ride as a CSV table, with the interface's column names or a map to them."""

from __future__ import annotations

import csv
import io
from collections.abc import Mapping
from datetime import UTC, datetime
from math import nan
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from pacing.errors import UnusableInputError
from pacing.field.recording import LIMITS, MOST_SAMPLES, Recording, recording_from
from pacing.field.recording_columns import Column

Array = NDArray[np.float64]

EXPECTED = "a header line with time_s or time, power_w, and lat_deg and lon_deg or distance_m"
MOST_UNREADABLE_SHARE = 0.1


def read_table(text: str, file: Path, columns: Mapping[str, Column] | None = None) -> Recording:
    """The recording in the text of a CSV file; an empty cell means nothing was recorded.

    Commas, semicolons (then with decimal commas) or tabs part the cells. A cell that should be a
    number and is none counts as empty, and is said; of too many an error is made.
    Raises `UnusableInputError`, with the line where it is known.
    """
    first = text.partition("\n")[0]
    parted_by = max(",;\t", key=first.count)
    rows = csv.reader(io.StringIO(text, newline=""), delimiter=parted_by)
    try:
        header = [word.strip() for word in next(rows, [])]
        lines, cells = [], []
        for row in rows:
            if any(row):
                lines.append(rows.line_num)
                cells.append(row)
                if len(cells) > MOST_SAMPLES:
                    raise UnusableInputError(
                        f"more than {MOST_SAMPLES:,} samples", file=file, expected="fewer"
                    )
    except csv.Error as problem:
        raise UnusableInputError(
            f"not a CSV table ({problem})", file=file, line=rows.line_num, expected=EXPECTED
        ) from None
    places = _places(header, columns or {}, file)
    if len(cells) < 2:
        raise UnusableInputError("fewer than two samples", file=file, expected=EXPECTED)
    table = _Table(file, lines, cells, decimal_comma=parted_by == ";")
    return _recording(table, places)


def _places(
    header: list[str], columns: Mapping[str, Column], file: Path
) -> dict[str, tuple[int, float]]:
    """Index and factor of each of our columns that the file has."""
    found = {}
    for ours in ("time_s", "time", *LIMITS, "position"):
        theirs = columns.get(ours, Column(ours))
        if theirs.name in header:
            found[ours] = (header.index(theirs.name), theirs.factor)
        elif ours in columns:
            raise _absent(f"no column '{theirs.name}' for {ours}", header, file)
    if "time_s" not in found and "time" not in found:
        raise _absent("no column time_s or time", header, file)
    if "power_w" not in found:
        raise _absent("no column power_w", header, file)
    if not ({"lat_deg", "lon_deg"} <= set(found) or "distance_m" in found):
        raise _absent("neither lat_deg and lon_deg nor distance_m", header, file)
    return found


def _absent(what: str, header: list[str], file: Path) -> UnusableInputError:
    there = ", ".join(header)[:120] or "nothing"
    return UnusableInputError(
        f"{what} among: {there}",
        file=file,
        line=1,
        expected=EXPECTED,
        mend="if it has another name, give it as --columns OURS=THEIRS",
    )


class _Table:
    """The cells of a file, read column by column."""

    def __init__(
        self, file: Path, lines: list[int], cells: list[list[str]], *, decimal_comma: bool
    ) -> None:
        self.file, self.lines, self.cells = file, lines, cells
        self.decimal_comma = decimal_comma
        self.notes: list[str] = []

    def words(self, at: int) -> list[str]:
        return [row[at].strip() if at < len(row) else "" for row in self.cells]

    def numbers(self, name: str, at: int) -> Array:
        words = self.words(at)
        if self.decimal_comma:
            words = [word.replace(",", ".") for word in words]
        values, wrong = [], []
        for line, word in zip(self.lines, words, strict=True):
            try:
                values.append(float(word) if word else nan)
            except ValueError:
                values.append(nan)
                wrong.append((line, word))
        self._judge(name, wrong, "a number, or nothing")
        return np.array(values)

    def clocks(self, at: int) -> tuple[Array, datetime | None]:
        """Seconds since the first clock, and that clock; plain numbers are seconds already."""
        values, wrong, first = [], [], None
        for line, word in zip(self.lines, self.words(at), strict=True):
            try:
                moment = datetime.fromisoformat(word)
                moment = moment if moment.tzinfo else moment.replace(tzinfo=UTC)
                first = first or moment
                values.append((moment - first).total_seconds())
            except (ValueError, OverflowError):
                values.append(nan)
                wrong.append((line, word))
        if len(wrong) == len(values):
            return self.numbers("time", at), None
        self._judge("time", wrong, "an ISO 8601 time")
        return np.array(values), first

    def _judge(self, name: str, wrong: list[tuple[int, str]], expected: str) -> None:
        if not wrong:
            return
        line, word = wrong[0]
        if len(wrong) > MOST_UNREADABLE_SHARE * len(self.lines):
            raise UnusableInputError(
                f"'{word[:40]}', and so in {len(wrong)} of {len(self.lines)} lines",
                file=self.file,
                line=line,
                key=name,
                expected=expected,
            )
        self.notes.append(
            f"{len(wrong)} cells of {name} are no numbers and count as empty, first line {line}"
        )


def _recording(table: _Table, places: Mapping[str, tuple[int, float]]) -> Recording:
    start = None
    if "time_s" in places:
        at, factor = places["time_s"]
        time = factor * table.numbers("time_s", at)
    else:
        time, start = table.clocks(places["time"][0])
    values: dict[str, Array] = {"time_s": time}
    for name in LIMITS:
        if name in places:
            at, factor = places[name]
            values[name] = factor * (_laps(table, at) if name == "lap" else table.numbers(name, at))
    position = None
    if "position" in places:
        position = np.array(table.words(places["position"][0]))
    return recording_from(
        values,
        name=table.file.stem,
        position=position,
        start=start,
        file=table.file,
        notes=tuple(table.notes),
    )


def _laps(table: _Table, at: int) -> Array:
    """Laps as numbers; words are numbered in the order they first stand in the file."""
    words = table.words(at)
    try:
        return np.array([float(word) if word else nan for word in words])
    except ValueError:
        order = {word: float(i) for i, word in enumerate(dict.fromkeys(w for w in words if w), 1)}
        return np.array([order.get(word, nan) for word in words])
