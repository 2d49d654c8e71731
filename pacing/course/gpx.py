"""GPX 1.0 and 1.1, with or without namespace, read as a stream.

Read with expat rather than into a tree: it keeps the line of every point for the messages, its
memory grows only with the points, nothing outside the file is ever fetched, and a document type
declaration is refused before the first entity could expand.
"""

from __future__ import annotations

from array import array
from dataclasses import dataclass, field
from datetime import UTC, datetime
from math import nan
from pathlib import Path
from xml.parsers import expat

import numpy as np

from pacing.course.decode import as_utf8
from pacing.course.track import Track
from pacing.errors import UnusableInputError

MOST_POINTS = 500_000
DEEPEST_NESTING = 64
EXPORT_AGAIN = "export the course again as GPX"
GPX_EXPECTED = "a GPX file (XML whose outermost element is <gpx>)"
_POINTS = {"trkpt": "trkseg", "rtept": "rte"}
_CUT_OFF = {
    expat.errors.codes[message]
    for message in (
        expat.errors.XML_ERROR_NO_ELEMENTS,
        expat.errors.XML_ERROR_UNCLOSED_TOKEN,
        expat.errors.XML_ERROR_PARTIAL_CHAR,
        expat.errors.XML_ERROR_UNCLOSED_CDATA_SECTION,
    )
}


@dataclass
class _Line:
    """A track or route while it is being read."""

    kind: str
    name: str = ""
    lat: array[float] = field(default_factory=lambda: array("d"))
    lon: array[float] = field(default_factory=lambda: array("d"))
    ele: array[float] = field(default_factory=lambda: array("d"))
    time: array[float] = field(default_factory=lambda: array("d"))
    segment: array[int] = field(default_factory=lambda: array("q"))
    segments: int = 0


@dataclass(frozen=True)
class GpxFile:
    """The tracks and routes of a file, each with at least one point, and the file's own name."""

    name: str
    tracks: tuple[Track, ...]
    routes: tuple[Track, ...]


def read_gpx(data: bytes, file: Path) -> GpxFile:
    """The tracks and routes in the bytes of a GPX file.

    Raises UnusableInputError, with the line, on anything that is not well-formed GPX, on
    coordinates that are not numbers in range and on more than ``MOST_POINTS`` points.
    """
    text, blank_lines = as_utf8(data, file)
    reader = _Reader(file, blank_lines)
    try:
        reader.parser.Parse(text, True)
    except expat.ExpatError as problem:
        raise _not_well_formed(problem, reader, text) from None
    return reader.result()


class _Reader:
    """What expat calls; it keeps the open elements and the line being read."""

    def __init__(self, file: Path, blank_lines: int) -> None:
        self.file = file
        self.blank_lines = blank_lines
        self.lines: list[_Line] = []
        self.open: list[str] = []
        self.name = ""
        self.points = 0
        self.point_depth = -1
        self.words: list[str] = []
        self.heard_depth = -1
        self.parser = expat.ParserCreate("utf-8")
        self.parser.buffer_text = True
        self.parser.StartDoctypeDeclHandler = self._refuse_doctype
        self.parser.StartElementHandler = self._start
        self.parser.EndElementHandler = self._end

    @property
    def line(self) -> int:
        return self.parser.CurrentLineNumber + self.blank_lines

    def _error(self, found: str, expected: str, mend: str = EXPORT_AGAIN) -> UnusableInputError:
        return UnusableInputError(
            found, file=self.file, line=self.line, expected=expected, mend=mend
        )

    def _refuse_doctype(self, *_: object) -> None:
        raise self._error(
            "a document type declaration, which can define entities that expand without end",
            "GPX without <!DOCTYPE>",
            "remove the declaration, or export the course again from a source you trust",
        )

    def _start(self, tag: str, attributes: dict[str, str]) -> None:
        name = tag.rpartition(":")[2]
        parent = self.open[-1] if self.open else ""
        if not self.open and name != "gpx":
            raise self._error(f"XML that is not GPX: its outermost element is <{name}>", "<gpx>")
        self.open.append(name)
        if len(self.open) > DEEPEST_NESTING:
            raise self._error(f"elements nested deeper than {DEEPEST_NESTING}", "GPX")
        if _POINTS.get(name) == parent and self.lines:
            self._point(name, attributes)
        elif self._is_told_of(name, parent):
            self.words, self.heard_depth = [], len(self.open)
            self.parser.CharacterDataHandler = self.words.append
        elif name in ("trk", "rte") and parent == "gpx":
            self.lines.append(_Line("track" if name == "trk" else "route"))

    def _is_told_of(self, name: str, parent: str) -> bool:
        """Whether the text of the element just opened says something of a point or a line."""
        if name in ("ele", "time"):
            return len(self.open) == self.point_depth + 1
        if name == "name" and parent in ("trk", "rte"):
            return bool(self.lines)
        return name == "name" and parent in ("metadata", "gpx")

    def _point(self, name: str, attributes: dict[str, str]) -> None:
        self.points += 1
        self.point_depth = len(self.open)
        if self.points > MOST_POINTS:
            raise self._error(
                f"more than {MOST_POINTS:,} points",
                "a course with fewer",
                "thin out the points or cut the course into parts",
            )
        line = self.lines[-1]
        line.lat.append(self._coordinate(name, attributes, "lat", 90.0))
        line.lon.append(self._coordinate(name, attributes, "lon", 180.0))
        line.ele.append(nan)
        line.time.append(nan)
        line.segment.append(line.segments)

    def _coordinate(self, name: str, attributes: dict[str, str], key: str, limit: float) -> float:
        found = attributes.get(key)
        expected = f"{key} as a number between -{limit:.0f} and {limit:.0f}"
        if found is None:
            raise self._error(f"<{name}> has no {key}", expected)
        try:
            value = float(found)
        except ValueError:
            value = nan
        if not -limit <= value <= limit:
            raise self._error(f"{key} is '{found[:40]}'", expected)
        return value

    def _end(self, tag: str) -> None:
        depth = len(self.open)
        name = self.open.pop()
        if depth == self.heard_depth:
            self._heard(name)
        elif depth == self.point_depth:
            self.point_depth = -1
        elif name == "trkseg" and self.lines:
            self.lines[-1].segments += 1

    def _heard(self, name: str) -> None:
        """The text of an element that was listened to goes where it belongs."""
        self.parser.CharacterDataHandler = None
        self.heard_depth = -1
        text = "".join(self.words).strip()
        if name == "ele":
            self.lines[-1].ele[-1] = self._elevation(text)
        elif name == "time":
            self.lines[-1].time[-1] = _seconds(text)
        elif self.open[-1] in ("trk", "rte"):
            self.lines[-1].name = text
        else:
            self.name = text

    def _elevation(self, text: str) -> float:
        if not text:
            return nan
        try:
            return float(text)
        except ValueError:
            raise self._error(f"<ele> is '{text[:40]}'", "a height in metres") from None

    def result(self) -> GpxFile:
        """The lines that have points, as tracks."""
        found: dict[str, list[Track]] = {"track": [], "route": []}
        for line in self.lines:
            if line.lat:
                found[line.kind].append(_finished(line))
        return GpxFile(self.name, tuple(found["track"]), tuple(found["route"]))


def _finished(line: _Line) -> Track:
    times = np.array(line.time, dtype=float)
    # Numbered without holes, since empty segments hold no point.
    _, segment = np.unique(np.array(line.segment, dtype=np.int64), return_inverse=True)
    return Track(
        name=line.name,
        lat_deg=np.array(line.lat, dtype=float),
        lon_deg=np.array(line.lon, dtype=float),
        elevation_m=np.array(line.ele, dtype=float),
        time_s=None if np.isnan(times).all() else times,
        segment=segment.astype(np.int64),
    )


def _seconds(text: str) -> float:
    """An ISO 8601 time as seconds since 1970, NaN where it cannot be read."""
    try:
        moment = datetime.fromisoformat(text)
        return (moment if moment.tzinfo else moment.replace(tzinfo=UTC)).timestamp()
    except (ValueError, OverflowError, OSError):
        return nan


def _not_well_formed(problem: expat.ExpatError, reader: _Reader, text: bytes) -> UnusableInputError:
    line = problem.lineno + reader.blank_lines
    if not reader.open and not reader.lines and not text.startswith(b"<"):
        return UnusableInputError(
            "not XML", file=reader.file, line=line, expected=GPX_EXPECTED, mend=EXPORT_AGAIN
        )
    if problem.code in _CUT_OFF:
        within = f" inside <{reader.open[-1]}>" if reader.open else ""
        return UnusableInputError(
            f"the file is cut off{within}",
            file=reader.file,
            line=line,
            expected="a complete file that ends with </gpx>",
            mend="download or copy it again",
        )
    return UnusableInputError(
        f"not well-formed XML ({expat.ErrorString(problem.code)})",
        file=reader.file,
        line=line,
        expected=GPX_EXPECTED,
        mend=EXPORT_AGAIN,
    )
