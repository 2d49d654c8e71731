"""From a course file to its points."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from pacing.course.choose import choose_track, refuse_no_line
from pacing.course.gpx import read_gpx
from pacing.course.table import read_table
from pacing.course.track import Track
from pacing.errors import UnusableInputError

MOST_BYTES = 64_000_000


def read_track(file: Path | str, track: str | int | None = None) -> Track:
    """The points of a GPX file, or of a CSV table if its name ends so.

    ``track`` chooses among several tracks and routes by name or number (see ``choose_track``).
    Raises UnusableInputError: no such file, empty, larger than ``MOST_BYTES``, not GPX, cut off,
    bad coordinates, no points, one point.
    """
    file = Path(file)
    data = _bytes_of(file)
    if file.suffix.lower() == ".csv":
        found = read_table(data, file)
    else:
        found = choose_track(read_gpx(data, file), file, track)
    if len(found) < 2:
        raise refuse_no_line(len(found), file)
    return replace(found, name=found.name or file.stem)


def _bytes_of(file: Path) -> bytes:
    try:
        if file.is_dir():
            raise UnusableInputError("a folder", file=file, expected="a GPX or CSV file")
        size = file.stat().st_size
        if size > MOST_BYTES:
            raise UnusableInputError(
                f"{size / 1e6:.0f} MB",
                file=file,
                expected=f"a course file of at most {MOST_BYTES / 1e6:.0f} MB",
                mend="thin out the points or cut the course into parts",
            )
        data = file.read_bytes()
    except FileNotFoundError:
        raise UnusableInputError(
            "no such file", file=file, expected="a GPX or CSV course file"
        ) from None
    except OSError as problem:
        raise UnusableInputError(
            f"cannot be read ({problem.strerror})", file=file, expected="a readable file"
        ) from None
    if not data.strip():
        raise UnusableInputError(
            "the file is empty", file=file, expected="a GPX or CSV course file"
        )
    return data
