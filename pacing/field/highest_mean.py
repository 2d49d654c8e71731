"""Highest mean power for each duration, from a recording."""

from __future__ import annotations

import csv
import io
import math
from datetime import datetime
from pathlib import Path
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.errors import UnusableInputError
from pacing.field.efforts import read_text

Array = NDArray[np.float64]

DURATIONS_S: tuple[float, ...] = (
    5, 10, 15, 30, 60, 120, 180, 240, 300, 480, 600, 720, 900, 1200, 1800, 2700, 3600, 5400, 7200,
)  # fmt: skip
LONGEST_GAP_S = 5.0
"""A sample stands until the next, but no longer than this; then nothing was recorded."""
MOST_SECONDS = 400_000


class HighestMean(NamedTuple):
    """Highest mean power (W) over each duration (s), and where its window starts (s)."""

    duration_s: Array
    power_w: Array
    from_s: Array


def highest_mean_power(
    time_s: Array, power_w: Array, durations_s: tuple[float, ...] = DURATIONS_S
) -> HighestMean:
    """Highest mean power for each duration that fits into an unbroken part of a recording.

    ``time_s`` (n,) rises; ``power_w`` (n,) holds NaN where nothing was recorded. The recording
    is laid out in whole seconds; a window never reaches over a gap.
    """
    power = _every_second(np.asarray(time_s, dtype=float), np.asarray(power_w, dtype=float))
    known = np.isfinite(power)
    work = np.concatenate([[0.0], np.cumsum(np.where(known, power, 0.0))])
    gaps = np.concatenate([[0], np.cumsum(~known)])
    found = []
    for duration in durations_s:
        n = round(duration)
        if not 1 <= n <= power.size:
            continue
        mean = np.where(gaps[n:] == gaps[:-n], (work[n:] - work[:-n]) / n, -np.inf)
        best = int(np.argmax(mean))
        if np.isfinite(mean[best]):
            found.append((float(n), float(mean[best]), float(best) + float(time_s[0])))
    table = np.array(found, dtype=float).reshape(-1, 3)
    return HighestMean(table[:, 0], table[:, 1], table[:, 2])


def read_power(file: Path) -> tuple[Array, Array]:
    """Time (s, from the first sample) and power (W, NaN where empty) from a ride as CSV."""
    rows = csv.reader(io.StringIO(read_text(file), newline=""))
    header = [word.strip() for word in next(rows, [])]
    clock = "time_s" if "time_s" in header else "time"
    if clock not in header or "power_w" not in header:
        raise UnusableInputError(
            "no time or no power column",
            file=file,
            line=1,
            expected="a header line with power_w and time_s or time",
        )
    at, of = header.index(clock), header.index("power_w")
    times, powers = [], []
    for row in rows:
        if len(row) > max(at, of):
            times.append(_seconds(row[at].strip(), rows.line_num, file))
            powers.append(_power(row[of].strip(), rows.line_num, file))
    if len(times) < 2:
        raise UnusableInputError("fewer than two samples", file=file)
    time = np.array(times)
    backwards = np.flatnonzero(np.diff(time) <= 0.0)
    if backwards.size:
        raise UnusableInputError(
            "time that does not rise", file=file, line=int(backwards[0]) + 3, key=clock
        )
    if time[-1] - time[0] > MOST_SECONDS:
        raise UnusableInputError(f"{time[-1] - time[0]:.0f} s in one recording", file=file)
    return time - time[0], np.array(powers)


def is_recording(file: Path) -> bool:
    """Whether a CSV file is a ride, sample by sample, rather than a table of efforts."""
    header = {word.strip() for word in read_text(file).partition("\n")[0].split(",")}
    return "duration_s" not in header and "power_w" in header and bool({"time", "time_s"} & header)


def _every_second(time_s: Array, power_w: Array) -> Array:
    """Mean power in each whole second from the first sample; NaN where nothing was recorded."""
    second = np.arange(math.floor(time_s[-1] - time_s[0]) + 1, dtype=float)
    place = np.searchsorted(time_s - time_s[0], second, side="right") - 1
    stale = second - (time_s[place] - time_s[0]) > LONGEST_GAP_S
    return np.where(stale, np.nan, power_w[place])


def _seconds(text: str, line: int, file: Path) -> float:
    try:
        value = float(text)
    except ValueError:
        try:
            value = datetime.fromisoformat(text).timestamp()
        except ValueError:
            value = math.nan
    if not math.isfinite(value):
        raise UnusableInputError(
            f"'{text}'", file=file, line=line, key="time", expected="seconds or an ISO 8601 time"
        )
    return value


def _power(text: str, line: int, file: Path) -> float:
    if not text:
        return math.nan
    try:
        value = float(text)
    except ValueError:
        value = math.inf
    if not (math.isnan(value) or -100.0 <= value <= 5000.0):
        raise UnusableInputError(
            f"'{text}'", file=file, line=line, key="power_w", expected="watts, or nothing"
        )
    return value
