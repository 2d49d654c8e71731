"""Gaps: long steps between points, over which the road is not known."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import median_filter

from pacing.course.course import Repair
from pacing.course.geodesy import distances_m
from pacing.course.track import Track
from pacing.errors import UnusableInputError

Array = NDArray[np.float64]

BRIDGED = "gap bridged by a straight line"
SEGMENTS = "segments joined"
NEIGHBOURS = 51
GAP_M = 400.0
GAP_RATIO = 8.0
LARGEST_GAP_M = 2000.0
MOST_IN_GAPS = 0.25
FURTHEST_APART_M = 10_000.0


def find_gaps(track: Track) -> list[Repair]:
    """The gaps of a track: steps over ``GAP_M`` and ``GAP_RATIO`` times those around, or no road.

    Where segments meet counts as any other step. One repair for each gap.
    """
    step = distances_m(track.lat_deg, track.lon_deg)
    if step.size == 0:
        return []
    km = track.read_km()
    usual = median_filter(step, size=min(NEIGHBOURS, len(step)), mode="reflect")
    unlike = (step > GAP_M) & (step > GAP_RATIO * usual)
    gaps = np.flatnonzero(unlike | (step > FURTHEST_APART_M))
    return [Repair(BRIDGED, float(km[i]), float(km[i + 1]), _length(float(step[i]))) for i in gaps]


def joined_segments(track: Track) -> list[Repair]:
    """One repair for all places where one segment of the file ends and the next begins."""
    joints = np.flatnonzero(np.diff(track.segment))
    if joints.size == 0:
        return []
    widest = float(np.max(distances_m(track.lat_deg, track.lon_deg)[joints]))
    km = track.read_km()
    return [
        Repair(
            SEGMENTS,
            float(km[joints[0]]),
            float(km[joints[-1] + 1]),
            f"{joints.size + 1} segments, up to {_length(widest)} apart",
        )
    ]


def gap_lengths_m(repairs: tuple[Repair, ...]) -> list[float]:
    """Lengths [m] of the gaps among the repairs."""
    return [1000.0 * (r.to_km - r.from_km) for r in repairs if r.what == BRIDGED]


def refuse_wide_gaps(
    repairs: tuple[Repair, ...], length_m: float, file: object
) -> UnusableInputError | None:
    """Why the gaps are too wide for a plan: the error to raise, or None."""
    gaps = [repair for repair in repairs if repair.what == BRIDGED]
    lengths = gap_lengths_m(repairs)
    if not gaps:
        return None
    widest = gaps[int(np.argmax(lengths))]
    mend = (
        "record or plan the course without the gap, or ride a part of it (course.from_km, "
        "course.to_km)"
    )
    if max(lengths) > LARGEST_GAP_M:
        return UnusableInputError(
            f"a gap of {widest.amount} at km {widest.from_km:.1f}",
            file=file,
            expected=f"points along the whole road, no gap over {LARGEST_GAP_M / 1000:.0f} km",
            mend=mend,
        )
    if sum(lengths) > MOST_IN_GAPS * length_m:
        return UnusableInputError(
            f"{len(gaps)} gaps, {sum(lengths) / 1000:.1f} km in all, the widest {widest.amount} "
            f"at km {widest.from_km:.1f}",
            file=file,
            expected=f"at most {100 * MOST_IN_GAPS:.0f} % of the course in gaps",
            mend=mend,
        )
    return None


def _length(metres: float) -> str:
    return f"{metres:.0f} m" if metres < 1000.0 else f"{metres / 1000:.1f} km"
