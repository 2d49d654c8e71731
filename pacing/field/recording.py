"""A ride as recorded, sample by sample, before anything is made of it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from pacing.errors import UnusableInputError

if TYPE_CHECKING:
    import pandas as pd

Array = NDArray[np.float64]

MOST_SAMPLES = 500_000
MOST_SECONDS = 400_000.0
MOST_LOST_SHARE = 0.2
"""Of more samples than this share out of order the clock cannot be believed at all."""

LIMITS: dict[str, tuple[float, float]] = {
    "lat_deg": (-90.0, 90.0),
    "lon_deg": (-180.0, 180.0),
    "elevation_m": (-500.0, 9000.0),
    "distance_m": (0.0, 5.0e6),
    "speed_m_s": (0.0, 40.0),
    "power_w": (0.0, 3000.0),
    "cadence_rpm": (0.0, 255.0),
    "temperature_c": (-60.0, 70.0),
    "lap": (-1.0e9, 1.0e9),
}
"""What a sensor on a bicycle can show; anything else is taken as not recorded, and said."""


@dataclass(frozen=True)
class Masked:
    """A stretch of a recording that is not used, in seconds from its start, and why."""

    from_s: float
    to_s: float
    why: str


@dataclass(frozen=True)
class Recording:
    """One ride of n samples at rising ``time_s`` (n,) from 0.

    Every column is (n,) with NaN where nothing was recorded: ``lat_deg``, ``lon_deg`` (WGS84),
    ``elevation_m``, ``distance_m``, ``speed_m_s``, ``power_w``, ``cadence_rpm``,
    ``temperature_c``, ``lap``. ``position`` (n,) holds names, "" where none. ``start`` is the
    clock of the first sample where the file tells it. ``masked`` and ``notes`` say what reading
    had to leave out.
    """

    name: str
    time_s: Array
    power_w: Array
    lat_deg: Array
    lon_deg: Array
    elevation_m: Array
    distance_m: Array
    speed_m_s: Array
    cadence_rpm: Array
    temperature_c: Array
    lap: Array
    position: NDArray[np.str_]
    start: datetime | None = None
    masked: tuple[Masked, ...] = ()
    notes: tuple[str, ...] = ()

    @property
    def placed(self) -> bool:
        """Whether positions were recorded."""
        return bool(np.isfinite(self.lat_deg).sum() >= 2)


def recording_from(
    columns: Mapping[str, Array],
    *,
    name: str,
    position: NDArray[np.str_] | None = None,
    start: datetime | None = None,
    file: Path | None = None,
    notes: tuple[str, ...] = (),
) -> Recording:
    """A recording from columns (n,) as read, one of them ``time_s`` [s] on any clock.

    Samples without a time are left out, and those whose time does not rise; values no sensor can
    show become NaN. Raises `UnusableInputError` where no ride is left: no time, no power, neither
    position nor distance, a clock that runs back.
    """
    time = np.asarray(columns["time_s"], dtype=float)
    keep, masked, said = _in_order(time, file)
    count = int(keep.sum())
    kept: dict[str, Array] = {}
    for column, (low, high) in LIMITS.items():
        values = np.asarray(columns.get(column, np.full(time.size, np.nan)), dtype=float)[keep]
        with np.errstate(invalid="ignore"):
            wrong = np.isfinite(values) & ~((values >= low) & (values <= high))
        if wrong.any():
            at = time[keep][wrong] - time[keep][0]
            said.append(f"{int(wrong.sum())} values of {column} out of range, from {at[0]:.0f} s")
        kept[column] = np.where(wrong | ~np.isfinite(values), np.nan, values)
    half = np.isfinite(kept["lat_deg"]) & np.isfinite(kept["lon_deg"])
    for column in ("lat_deg", "lon_deg"):
        kept[column] = np.where(half, kept[column], np.nan)
    _refuse_too_little(kept, file)
    names = np.full(count, "") if position is None else np.asarray(position, dtype=str)[keep]
    return Recording(
        name=name,
        time_s=time[keep] - time[keep][0],
        position=names,
        start=start,
        masked=tuple(masked),
        notes=(*notes, *said),
        **kept,
    )


def recording_of_frame(frame: pd.DataFrame, *, name: str = "ride") -> Recording:
    """A recording from a DataFrame with the columns of a ride file (see `Recording`).

    ``time_s``, or ``time`` as timestamps. Raises `UnusableInputError` as `recording_from` does.
    """
    import pandas as pd

    start = None
    if "time_s" in frame.columns:
        time = pd.to_numeric(frame["time_s"], errors="coerce").to_numpy(dtype=float)
    elif "time" in frame.columns:
        stamps = pd.to_datetime(frame["time"], errors="coerce", utc=True)
        since = stamps - stamps.min()
        time = since.dt.total_seconds().to_numpy(dtype=float)
        start = stamps.min().to_pydatetime() if stamps.notna().any() else None
    else:
        raise UnusableInputError("no column time_s or time", expected="a clock for each sample")
    columns = {
        column: pd.to_numeric(frame[column], errors="coerce").to_numpy(dtype=float)
        for column in LIMITS
        if column in frame.columns
    }
    position = None
    if "position" in frame.columns:
        position = np.asarray(frame["position"].fillna("").astype(str), dtype=np.str_)
    return recording_from({**columns, "time_s": time}, name=name, position=position, start=start)


def _in_order(time: Array, file: Path | None) -> tuple[NDArray[np.bool_], list[Masked], list[str]]:
    """Which samples stand in time, each later than all before."""
    known = np.isfinite(time)
    if time.size > MOST_SAMPLES:
        raise UnusableInputError(
            f"{time.size:,} samples", file=file, expected=f"at most {MOST_SAMPLES:,}"
        )
    if known.sum() < 2:
        raise UnusableInputError("fewer than two samples with a time", file=file)
    so_far = np.maximum.accumulate(np.where(known, time, -np.inf))
    before = np.concatenate([[-np.inf], so_far[:-1]])
    keep = known & (np.where(known, time, -np.inf) > before)
    same, back = known & ~keep & (time == before), known & ~keep & (time != before)
    if (time.size - keep.sum()) > MOST_LOST_SHARE * time.size:
        raise UnusableInputError(
            f"a clock that does not rise at {int(time.size - keep.sum())} of {time.size} samples",
            file=file,
            expected="seconds that rise from sample to sample",
        )
    if time[keep][-1] - time[keep][0] > MOST_SECONDS:
        raise UnusableInputError(
            f"{time[keep][-1] - time[keep][0]:.0f} s in one recording",
            file=file,
            expected=f"at most {MOST_SECONDS:.0f} s",
        )
    zero = float(time[keep][0])
    masked, said = [], []
    for which, why in ((same, "second recorded twice"), (back, "clock went back")):
        at = time[which] - zero
        masked += [Masked(float(t), float(t), why) for t in at[:50]]
        if at.size:
            said.append(f"{at.size} samples left out: {why}")
    if not known.all():
        said.append(f"{int((~known).sum())} samples left out: no time")
    return keep, masked, said


def _refuse_too_little(kept: Mapping[str, Array], file: Path | None) -> None:
    if np.isfinite(kept["power_w"]).sum() < 2:
        raise UnusableInputError(
            "no power was recorded",
            file=file,
            key="power_w",
            expected="a ride with a power meter",
            mend="if the column has another name, give it with --columns power_w=NAME",
        )
    if min(np.isfinite(kept["lat_deg"]).sum(), np.isfinite(kept["lon_deg"]).sum()) >= 2:
        return
    if np.isfinite(kept["distance_m"]).sum() < 2:
        raise UnusableInputError(
            "neither position nor distance was recorded",
            file=file,
            expected="lat_deg and lon_deg, or distance_m",
            mend="if the columns have other names, give them with --columns distance_m=NAME",
        )
