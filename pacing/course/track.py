"""The points of a course as the file gives them."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.course.geodesy import along_m

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Track:
    """One line of points (P,), in the order of the file, nothing repaired yet.

    ``lat_deg`` and ``lon_deg`` are WGS84 degrees; ``elevation_m`` is NaN where the file gives none;
    ``time_s`` is seconds since 1970, NaN where missing, or None where no point has a time.
    ``segment`` numbers the file's segments from 0. ``notes`` says what choosing the line involved:
    what was done, and how much. ``read_m`` is the distance of the points along the line as read,
    where a repair has set it.
    """

    name: str
    lat_deg: Array
    lon_deg: Array
    elevation_m: Array
    time_s: Array | None
    segment: NDArray[np.int64]
    notes: tuple[tuple[str, str], ...] = ()
    read_m: Array | None = None

    def __len__(self) -> int:
        """Number of points."""
        return len(self.lat_deg)

    def read_km(self) -> Array:
        """Kilometres (P,) of the points along the line as read."""
        if self.read_m is None:
            return along_m(self.lat_deg, self.lon_deg) / 1000.0
        return self.read_m / 1000.0

    def kept(self, keep: NDArray[np.bool_] | NDArray[np.int64]) -> Track:
        """The track with only some of its points (a mask or indices (P,))."""
        return replace(
            self,
            lat_deg=self.lat_deg[keep],
            lon_deg=self.lon_deg[keep],
            elevation_m=self.elevation_m[keep],
            time_s=None if self.time_s is None else self.time_s[keep],
            segment=self.segment[keep],
            read_m=None if self.read_m is None else self.read_m[keep],
        )


def joined(tracks: list[Track], name: str) -> Track:
    """Several tracks ridden one after the other, as one; their segments stay apart."""
    first_segment = np.cumsum([0, *(int(t.segment[-1]) + 1 for t in tracks[:-1])])
    times = None
    if any(t.time_s is not None for t in tracks):
        times = np.concatenate(
            [np.full(len(t), np.nan) if t.time_s is None else t.time_s for t in tracks]
        )
    return Track(
        name=name,
        lat_deg=np.concatenate([t.lat_deg for t in tracks]),
        lon_deg=np.concatenate([t.lon_deg for t in tracks]),
        elevation_m=np.concatenate([t.elevation_m for t in tracks]),
        time_s=times,
        segment=np.concatenate(
            [t.segment + first for t, first in zip(tracks, first_segment, strict=True)]
        ),
    )
