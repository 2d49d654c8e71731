"""From a ride file of either kind to a recording."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from pacing.errors import UnusableInputError
from pacing.field.recording import Recording
from pacing.field.recording_columns import Column
from pacing.field.recording_gpx import read_gpx_ride
from pacing.field.recording_table import read_table

MOST_BYTES = 200_000_000


def read_recording(file: Path | str, columns: Mapping[str, Column] | None = None) -> Recording:
    """The ride in a CSV table or a GPX file (told by its first character, not its name).

    ``columns`` maps our column names to those of a CSV file. Raises `UnusableInputError` for a
    file that cannot be read or holds no ride with power.
    """
    file = Path(file)
    data = _bytes_of(file)
    head = data[:200].lstrip(b"\xef\xbb\xbf\xff\xfe\x00 \t\r\n")
    if head.startswith(b"<") or file.suffix.lower() == ".gpx":
        return read_gpx_ride(data, file)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = data.decode("latin-1")
    return read_table(text, file, columns)


def _bytes_of(file: Path) -> bytes:
    try:
        if file.is_dir():
            raise UnusableInputError("a folder", file=file, expected="a ride as CSV or GPX")
        if file.stat().st_size > MOST_BYTES:
            raise UnusableInputError(
                f"{file.stat().st_size / 1e6:.0f} MB",
                file=file,
                expected=f"a ride of at most {MOST_BYTES / 1e6:.0f} MB",
            )
        data = file.read_bytes()
    except FileNotFoundError:
        raise UnusableInputError(
            "no such file", file=file, expected="a ride as CSV or GPX"
        ) from None
    except (OSError, ValueError) as problem:
        reason = getattr(problem, "strerror", None) or str(problem)
        raise UnusableInputError(f"cannot be read ({reason})", file=file) from None
    if not data.strip():
        raise UnusableInputError("the file is empty", file=file, expected="a ride as CSV or GPX")
    return data
