"""Heights that are missing, or numbers that stand for a missing height."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Repair
from pacing.course.geodesy import along_m
from pacing.course.track import Track
from pacing.errors import UnusableInputError

Array = NDArray[np.float64]

INTERPOLATED = "missing heights interpolated"
LOWEST_M, HIGHEST_M = -450.0, 6000.0
"""No road is lower than the Dead Sea's shore or higher than the highest pass."""
ZERO_STEP_M = 15.0
ZERO_SLOPE = 0.10
MOST_MISSING = 0.25
LONGEST_MISSING_M = 3000.0


def without_false_heights(track: Track) -> tuple[Track, list[Repair]]:
    """The track with NaN for every height that cannot be one, and what is missing then."""
    along = 1000.0 * track.read_km()
    repairs = []
    elevation = track.elevation_m.copy()
    with np.errstate(invalid="ignore"):
        wild = (elevation < LOWEST_M) | (elevation > HIGHEST_M)
    for what, found in (
        (f"heights outside {LOWEST_M:.0f} to {HIGHEST_M:.0f} m taken as missing", wild),
        ("heights of 0 m taken as missing", _false_zeros(along, np.where(wild, np.nan, elevation))),
    ):
        if found.any():
            repairs.append(_repair(what, along, found, f"{int(found.sum())} points"))
            elevation[found] = np.nan
    gone = ~np.isfinite(elevation)
    if gone.any() and not gone.all():
        share, longest = missing_share(along, gone)
        amount = f"{100 * share:.0f} % of the way, {longest:.0f} m at a stretch"
        repairs.append(_repair(INTERPOLATED, along, gone, amount))
    return replace(track, elevation_m=elevation), repairs


def missing_share(along_m: Array, gone: NDArray[np.bool_]) -> tuple[float, float]:
    """Share of the way between known heights that are not neighbours, and the longest such [m].

    ``along_m`` (P,) is the distance of the points, ``gone`` (P,) which have no height. Points
    without a height that lie between neighbours at most 100 m apart count for nothing.
    """
    known = np.flatnonzero(~gone)
    if known.size == 0:
        return 1.0, float(along_m[-1] - along_m[0])
    ends = np.concatenate([[along_m[0]], along_m[known], [along_m[-1]]])
    skipped = np.diff(np.concatenate([[-1], known, [len(gone)]])) > 1
    bare = np.diff(ends) * skipped
    total = float(np.sum(bare[bare > 100.0]))
    return total / max(float(along_m[-1] - along_m[0]), 1e-9), float(np.max(bare))


def refuse_missing_heights(track: Track, file: object) -> UnusableInputError | None:
    """Why the heights do not carry a plan: the error to raise, or None."""
    gone = ~np.isfinite(track.elevation_m)
    mend = "add heights with a route planner, or set course.flat = true if the course is level"
    if gone.all():
        return UnusableInputError(
            "no heights at all", file=file, expected="a height (<ele>) at the points", mend=mend
        )
    along = along_m(track.lat_deg, track.lon_deg)
    share, longest = missing_share(along, gone)
    if share > MOST_MISSING or longest > LONGEST_MISSING_M:
        return UnusableInputError(
            f"no heights on {100 * share:.0f} % of the way, {longest / 1000:.1f} km at a stretch",
            file=file,
            expected=f"heights missing on at most {100 * MOST_MISSING:.0f} % and "
            f"{LONGEST_MISSING_M / 1000:.0f} km at a stretch",
            mend=mend,
        )
    return None


def _false_zeros(along: Array, elevation: Array) -> NDArray[np.bool_]:
    """Runs of heights of exactly 0 that the heights beside them cannot drop to or rise from."""
    found = np.zeros(len(elevation), dtype=bool)
    known = np.flatnonzero(np.isfinite(elevation))
    zero = elevation[known] == 0.0
    if not zero.any() or zero.all():
        return found
    edges = np.flatnonzero(np.diff(np.concatenate([[0], zero.astype(int), [0]])))
    for first, after in zip(edges[::2], edges[1::2], strict=True):
        beside = [
            (known[outer], known[inner])
            for outer, inner in ((first - 1, first), (after, after - 1))
            if 0 <= outer < len(known)
        ]
        jumps = [
            abs(elevation[outer]) > max(ZERO_STEP_M, ZERO_SLOPE * abs(along[outer] - along[inner]))
            for outer, inner in beside
        ]
        found[known[first:after]] = all(jumps)
    return found


def _repair(what: str, along: Array, found: NDArray[np.bool_], amount: str) -> Repair:
    at = np.flatnonzero(found)
    return Repair(what, float(along[at[0]]) / 1000.0, float(along[at[-1]]) / 1000.0, amount)
