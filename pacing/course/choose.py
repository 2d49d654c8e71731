"""Which of a file's tracks and routes is the course."""

from __future__ import annotations

from dataclasses import replace
from difflib import get_close_matches
from itertools import pairwise
from pathlib import Path

import numpy as np

from pacing.course.extent import NoCourseError
from pacing.course.geodesy import distance_between_m, distances_m
from pacing.course.gpx import GpxFile
from pacing.course.track import Track, joined
from pacing.errors import UnusableInputError

JOINED_WITHIN_M = 100.0
"""Tracks that end and begin this near each other are one ride."""


def choose_track(gpx: GpxFile, file: Path, track: str | int | None) -> Track:
    """The course among the tracks and routes of a file.

    ``track`` is a name, or a number that counts tracks, then routes, from 1. Without it the only
    track is taken, or tracks that join end to end, or else the only route; anything else is an
    UnusableInputError that lists what there is.
    """
    lines = [*gpx.tracks, *gpx.routes]
    if track is not None:
        return _named(gpx, lines, file, track)
    for kind, found in (("track", gpx.tracks), ("route", gpx.routes)):
        ridable = [line for line in found if len(line) > 1] or list(found)
        if not ridable:
            continue
        if len(ridable) == 1:
            left = len(lines) - 1
            notes = ((f"the only {kind} taken", f"{left} other left out"),) if left else ()
            return replace(ridable[0], name=ridable[0].name or gpx.name, notes=notes)
        if _join_end_to_end(ridable):
            whole = joined(ridable, gpx.name or ridable[0].name)
            return replace(
                whole,
                notes=((f"{kind}s that join end to end read as one", f"{len(ridable)} {kind}s"),),
            )
        raise NoCourseError(
            f"{len(ridable)} {kind}s that do not join: {_listing(gpx)}",
            file=file,
            expected="one course",
            mend="choose one with course.track in the race file, or with --track",
        )
    raise refuse_no_line(0, file)


def refuse_no_line(count: int, file: Path) -> UnusableInputError:
    """The error for a course without points, or with one."""
    return NoCourseError(
        "no points" if count == 0 else "only one point",
        file=file,
        expected="a track or a route with at least two points",
        mend="export the course again as a track",
    )


def _named(gpx: GpxFile, lines: list[Track], file: Path, track: str | int) -> Track:
    wanted = str(track).strip()
    by_name = [line for line in lines if line.name == wanted]
    if len(by_name) == 1:
        return by_name[0]
    if wanted.isdigit() and 1 <= int(wanted) <= len(lines):
        chosen = lines[int(wanted) - 1]
        return replace(chosen, name=chosen.name or gpx.name)
    near = get_close_matches(wanted, [line.name for line in lines if line.name], 1)
    found = "several tracks are" if by_name else "no track is"
    raise NoCourseError(
        f"{found} called '{wanted}': {_listing(gpx)}",
        file=file,
        key="course.track",
        expected="a name or a number of these" if lines else "a file with points",
        mend=f"did you mean '{near[0]}'?" if near else None,
    )


def _join_end_to_end(lines: list[Track]) -> bool:
    return all(
        distance_between_m(
            before.lat_deg[-1], before.lon_deg[-1], after.lat_deg[0], after.lon_deg[0]
        )
        <= JOINED_WITHIN_M
        for before, after in pairwise(lines)
    )


def _listing(gpx: GpxFile) -> str:
    """What the file holds, numbered as ``course.track`` counts, at most eight of them."""
    lines = [("track", line) for line in gpx.tracks] + [("route", line) for line in gpx.routes]
    words = []
    for number, (kind, line) in enumerate(lines, 1):
        km = float(np.sum(distances_m(line.lat_deg, line.lon_deg))) / 1000.0
        name = f" '{line.name}'" if line.name else ""
        words.append(f"{number} {kind}{name} {km:.1f} km")
    if len(words) > 8:
        words = [*words[:8], f"{len(words) - 8} more"]
    return ", ".join(words)
