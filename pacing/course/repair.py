"""Mend a recorded line of points, and say what was mended and where."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from pacing.course.course import Repair
from pacing.course.geodesy import distances_m
from pacing.course.track import Track

SAME_POINT_M = 0.05


def repair(track: Track) -> tuple[Track, tuple[Repair, ...]]:
    """The track without duplicate points, and the repairs made."""
    track, repairs = _without_duplicates(track)
    return track, tuple(repairs)


def _without_duplicates(track: Track) -> tuple[Track, list[Repair]]:
    """One point for each run of points at the same place, with the mean of their heights."""
    step = distances_m(track.lat_deg, track.lon_deg)
    new = np.concatenate([[True], step > SAME_POINT_M])
    if new.all():
        return track, []
    run = np.cumsum(new) - 1
    known = np.isfinite(track.elevation_m)
    count = np.bincount(run, known)
    total = np.bincount(run, np.where(known, track.elevation_m, 0.0))
    mean = np.where(count > 0, total / np.maximum(count, 1), np.nan)
    doubles = np.flatnonzero(~new)
    along = np.concatenate([[0.0], np.cumsum(step)]) / 1000.0
    kept = replace(track.kept(new), elevation_m=mean)
    return kept, [
        Repair(
            "duplicate points removed",
            float(along[doubles[0]]),
            float(along[doubles[-1]]),
            f"{len(doubles)} points",
        )
    ]
