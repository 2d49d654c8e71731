"""A course that ends where it began, ridden on into the next lap."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from pacing.course.bends import find_bends
from pacing.course.course import Bend
from pacing.course.geodesy import distance_between_m
from pacing.course.line import Line, smooth_line
from pacing.course.track import Track

LOOP_WITHIN_M = 30.0
LOOP_TURN_DEG = 90.0
SEAM_M = 1000.0
AT_SEAM_M = 150.0


def ends_together(line: Line) -> bool:
    """Whether the line ends where it began, so that finish and start have one height."""
    gap = distance_between_m(line.lat_deg[-1], line.lon_deg[-1], line.lat_deg[0], line.lon_deg[0])
    return bool(gap <= LOOP_WITHIN_M)


def is_loop(line: Line) -> bool:
    """Whether the line ends where it began and passes on in the direction it set out."""
    turn = abs((line.heading_deg[0] - line.heading_deg[-1] + 180.0) % 360.0 - 180.0)
    return ends_together(line) and bool(turn <= LOOP_TURN_DEG)


def bends_of(track: Track, line: Line) -> tuple[Bend, ...]:
    """The bends of a line, with those that lie over the start of a loop.

    ``track`` holds the points the line was made from; distances are along the line.
    """
    found = find_bends(line)
    length = line.length_m
    if length < 3 * SEAM_M or not is_loop(line):
        return found
    at = line.point_distance_m
    order = np.concatenate([np.flatnonzero(at > length - SEAM_M), np.flatnonzero(at < SEAM_M)])
    seam = smooth_line(track.lat_deg[order], track.lon_deg[order])
    start = float(seam.point_distance_m[int(np.sum(at > length - SEAM_M))])
    over = [
        replace(bend, at_m=(bend.at_m - start) % length)
        for bend in find_bends(seam)
        if abs(bend.at_m - start) < AT_SEAM_M
    ]
    inside = [bend for bend in found if AT_SEAM_M <= bend.at_m <= length - AT_SEAM_M]
    return tuple(sorted((*inside, *over), key=lambda bend: bend.at_m))
