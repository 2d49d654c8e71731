"""Mend a recorded line of points, and say what was mended and where."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Repair
from pacing.course.gaps import find_gaps, joined_segments
from pacing.course.geodesy import along_m, distances_m
from pacing.course.missing import without_false_heights
from pacing.course.outliers import outliers, standstills
from pacing.course.track import Track

Array = NDArray[np.float64]

OFF_THE_LINE = "points far off the line left out"
STOOD = "wandering at a standstill made one point"
MERGED = "repeated points merged"
SAME_POINT_M = 0.02


def repair(track: Track) -> tuple[Track, tuple[Repair, ...]]:
    """The track with its points in order, heights that mean nothing made NaN, and the repairs.

    In this order: points thrown far off the line go, repeated points become one, what a recorder
    draws at a standstill becomes one point, gaps are found (a straight line will bridge them),
    heights that are missing or stand for missing are found. Kilometres are along the track as
    read, points thrown off left out; ``read_m`` of the track returned says where those are.
    """
    off = outliers(track)
    repairs = [Repair(what, 0.0, 0.0, amount) for what, amount in track.notes]
    if off.any():
        repairs += _off_the_line(track, off)
        track = track.kept(~off)
    track = replace(track, read_m=along_m(track.lat_deg, track.lon_deg))
    repairs += joined_segments(track)
    track, merged = _without_duplicates(track)
    track, stood = _without_standstills(track)
    track, heights = without_false_heights(track)
    return track, (*repairs, *merged, *stood, *find_gaps(track), *heights)


def _off_the_line(track: Track, off: NDArray[np.bool_]) -> list[Repair]:
    """One repair for each run of points thrown off, with how far the furthest of them lies."""
    kept, thrown = np.flatnonzero(~off), np.flatnonzero(off)
    # Of the kept points beside each run the nearer tells how far off it is.
    after = np.searchsorted(kept, thrown)
    far = np.minimum(
        *(
            _apart_m(track, thrown, kept[np.clip(beside, 0, len(kept) - 1)])
            for beside in (after - 1, after)
        )
    )
    km = np.interp(thrown, kept, along_m(track.lat_deg[kept], track.lon_deg[kept])) / 1000.0
    runs = np.split(np.arange(len(thrown)), np.flatnonzero(np.diff(thrown) > 1) + 1)
    return [
        Repair(
            OFF_THE_LINE,
            float(km[run[0]]),
            float(km[run[-1]]),
            f"{_points(len(run))}, up to {np.max(far[run]) / 1000:.1f} km off",
        )
        for run in runs
    ]


def _apart_m(track: Track, one: NDArray[np.intp], other: NDArray[np.intp]) -> Array:
    pairs = np.stack([one, other], axis=1).ravel()
    return distances_m(track.lat_deg[pairs], track.lon_deg[pairs])[::2]


def _without_duplicates(track: Track) -> tuple[Track, list[Repair]]:
    """One point for each run of points at the same place, with the mean of their heights."""
    new = np.concatenate([[True], distances_m(track.lat_deg, track.lon_deg) > SAME_POINT_M])
    if new.all():
        return track, []
    doubles = np.flatnonzero(~new)
    km = track.read_km()
    return _merged(track, np.cumsum(new) - 1), [
        Repair(
            MERGED,
            float(km[doubles[0]]),
            float(km[doubles[-1]]),
            _points(len(doubles)),
        )
    ]


def _without_standstills(track: Track) -> tuple[Track, list[Repair]]:
    """One point for each place where the line wanders on the spot."""
    runs = standstills(track)
    if not runs:
        return track, []
    new = np.ones(len(track), dtype=bool)
    for first, last in runs:
        new[first + 1 : last + 1] = False
    km = track.read_km()
    return _merged(track, np.cumsum(new) - 1), [
        Repair(
            STOOD,
            float(km[first]),
            float(km[last]),
            f"{_points(last - first + 1)}, {1000 * (km[last] - km[first]):.0f} m of line",
        )
        for first, last in runs
    ]


def _merged(track: Track, run: NDArray[np.int64]) -> Track:
    """One point at the mean place and height of each run; ``run`` (P,) numbers them in order."""
    size = np.bincount(run)
    first = np.concatenate([[0], np.cumsum(size)[:-1]])
    known = np.isfinite(track.elevation_m)
    count = np.bincount(run, known)
    total = np.bincount(run, np.where(known, track.elevation_m, 0.0))
    # Relative to each run's first point, so that the mean is exact across the 180th meridian.
    east = (track.lon_deg - track.lon_deg[first][run] + 180.0) % 360.0 - 180.0
    north = track.lat_deg - track.lat_deg[first][run]
    return replace(
        track.kept(first),
        elevation_m=np.where(count > 0, total / np.maximum(count, 1), np.nan),
        lat_deg=track.lat_deg[first] + np.bincount(run, north) / size,
        lon_deg=track.lon_deg[first] + np.bincount(run, east) / size,
    )


def _points(count: int) -> str:
    return f"{count} point{'' if count == 1 else 's'}"
