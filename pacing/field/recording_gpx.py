"""A ride as GPX: track points with time, and power in any extension element of that local name."""

from __future__ import annotations

from datetime import UTC, datetime
from math import nan
from pathlib import Path
from xml.parsers import expat

import numpy as np

from pacing.course.decode import as_utf8
from pacing.errors import UnusableInputError
from pacing.field.recording import MOST_SAMPLES, Recording, recording_from

DEEPEST_NESTING = 64
HEARD = {
    "ele": "elevation_m",
    "time": "time",
    "speed": "speed_m_s",
    "power": "power_w",
    "cadence": "cadence_rpm",
    "temperature": "temperature_c",
}
"""Local names of the elements of a track point that are read, and the columns they fill."""


def read_gpx_ride(data: bytes, file: Path) -> Recording:
    """The recording in the bytes of a GPX file: all track points, in order.

    Raises `UnusableInputError`, with the line, for anything that is no well-formed GPX with timed
    track points and power.
    """
    text, blank_lines = as_utf8(data, file)
    reader = _Reader(file, blank_lines)
    try:
        reader.parser.Parse(text, True)
    except expat.ExpatError as problem:
        raise UnusableInputError(
            f"not well-formed XML ({expat.ErrorString(problem.code)})",
            file=file,
            line=problem.lineno + blank_lines,
            expected="a complete GPX file",
            mend="export the ride again",
        ) from None
    return reader.recording()


class _Reader:
    """What expat calls: it keeps the open elements and one list a column."""

    def __init__(self, file: Path, blank_lines: int) -> None:
        self.file, self.blank_lines = file, blank_lines
        self.open: list[str] = []
        self.columns: dict[str, list[float]] = {
            name: [] for name in ("lat_deg", "lon_deg", *HEARD.values())
        }
        self.first: datetime | None = None
        self.words: list[str] | None = None
        self.unread = 0
        self.parser = expat.ParserCreate("utf-8")
        self.parser.buffer_text = True
        self.parser.StartDoctypeDeclHandler = self._refuse_doctype
        self.parser.StartElementHandler = self._start
        self.parser.EndElementHandler = self._end

    def _error(self, found: str, expected: str) -> UnusableInputError:
        line = self.parser.CurrentLineNumber + self.blank_lines
        return UnusableInputError(found, file=self.file, line=line, expected=expected)

    def _refuse_doctype(self, *_: object) -> None:
        raise self._error("a document type declaration", "GPX without <!DOCTYPE>")

    def _start(self, tag: str, attributes: dict[str, str]) -> None:
        name = tag.rpartition(":")[2]
        if not self.open and name != "gpx":
            raise self._error(f"XML that is not GPX: its outermost element is <{name}>", "<gpx>")
        self.open.append(name)
        if len(self.open) > DEEPEST_NESTING:
            raise self._error(f"elements nested deeper than {DEEPEST_NESTING}", "GPX")
        if name == "trkpt":
            self._point(attributes)
        elif name in HEARD and "trkpt" in self.open:
            self.words = []
            self.parser.CharacterDataHandler = self.words.append

    def _point(self, attributes: dict[str, str]) -> None:
        if len(self.columns["lat_deg"]) >= MOST_SAMPLES:
            raise self._error(f"more than {MOST_SAMPLES:,} points", "fewer")
        for name in self.columns:
            self.columns[name].append(nan)
        for key, column in (("lat", "lat_deg"), ("lon", "lon_deg")):
            self.columns[column][-1] = self._number(attributes.get(key, ""))

    def _end(self, tag: str) -> None:
        name = self.open.pop()
        if self.words is None or name not in HEARD:
            return
        self.parser.CharacterDataHandler = None
        text, self.words = "".join(self.words).strip(), None
        column = HEARD[name]
        value = self._seconds(text) if column == "time" else self._number(text)
        if np.isfinite(value):
            self.columns[column][-1] = value

    def _number(self, text: str) -> float:
        try:
            return float(text)
        except ValueError:
            self.unread += bool(text)
            return nan

    def _seconds(self, text: str) -> float:
        try:
            moment = datetime.fromisoformat(text)
            moment = moment if moment.tzinfo else moment.replace(tzinfo=UTC)
            self.first = self.first or moment
            return (moment - self.first).total_seconds()
        except (ValueError, OverflowError):
            self.unread += bool(text)
            return nan

    def recording(self) -> Recording:
        """The points as a recording."""
        columns = {name: np.array(values, dtype=float) for name, values in self.columns.items()}
        columns["time_s"] = columns.pop("time")
        if np.isfinite(columns["time_s"]).sum() < 2:
            raise UnusableInputError(
                "no track points with a time",
                file=self.file,
                expected="a recorded ride",
                mend="a planned route tells nothing of a ride; export the activity itself",
            )
        notes = (f"{self.unread} values could not be read",) if self.unread else ()
        return recording_from(
            columns, name=self.file.stem, start=self.first, file=self.file, notes=notes
        )
