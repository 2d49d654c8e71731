"""Heights that were rounded to whole steps, or held until the next was read."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

HAND_HELD_STEP_M = 0.480469
"""The step of older hand-held receivers, as found in recorded files."""
STEPS_M = (20.0, 10.0, 5.0, 2.0, 1.0, 0.5, HAND_HELD_STEP_M, 0.2, 0.1)
COARSE_M = 0.9
SURE_SHARE = 0.05
HELD_SHARE = 0.2
FLICKER_POINTS = 5
FLICKER_SHARE = 0.01


class Points(NamedTuple):
    """Heights along the road: distance, height and weight (M,) each.

    The weight multiplies the reciprocal of the variance of a point.
    """

    at_m: Array
    height_m: Array
    weight: Array

    def chosen(self, keep: NDArray[np.bool_]) -> Points:
        """The points for which ``keep`` (M,) holds."""
        return Points(self.at_m[keep], self.height_m[keep], self.weight[keep])


def plain(at_m: Array, height_m: Array) -> Points:
    """Every point counts the same."""
    return Points(at_m, height_m, np.ones(len(at_m)))


def step_of(height_m: Array) -> float | None:
    """The largest step [m] of which all differences of heights are multiples; None if none is.

    Noise of a hundredth of a step, or of the second decimal, is let pass.
    """
    rises = np.abs(np.diff(height_m))
    repeated = float(np.mean(rises == 0)) if len(rises) else 0.0
    rises = rises[rises > 0]
    if len(rises) == 0 or (len(rises) < 3 and repeated < 0.8):
        return None
    for step in STEPS_M:
        count = np.round(rises / step)
        off = np.abs(rises - step * count)
        near = off <= (0.006 if step == HAND_HELD_STEP_M else 0.01 * step)
        if np.mean(near & (count >= 1)) >= 0.995:
            return step
    return None


def without_held(points: Points, step_m: float | None) -> Points:
    """One point, in the middle, for each run of equal heights, where planners held a height.

    A planner that reads a terrain grid every so often repeats a height until the next one. Heights
    rounded to a step repeat too, but there each repetition says something: they are left.
    """
    same = np.diff(points.height_m) == 0
    if len(same) == 0 or np.mean(same) < HELD_SHARE or step_m is not None:
        return points
    run = np.concatenate([[0], np.cumsum(~same)])
    first = np.searchsorted(run, np.arange(run[-1] + 1))
    last = np.searchsorted(run, np.arange(run[-1] + 1), side="right") - 1
    return plain((points.at_m[first] + points.at_m[last]) / 2, points.height_m[first])


def flickers(points: Points) -> bool:
    """Whether rounded heights go to, fro and to again, as noise before rounding makes.

    To and fro once may be a summit.
    """
    change = np.flatnonzero(np.diff(points.height_m) != 0)
    rise = np.diff(points.height_m)[change]
    back = (rise[1:] * rise[:-1] < 0) & (np.diff(change) <= FLICKER_POINTS)
    twice = back[1:] & back[:-1]
    return bool(len(twice) > 0 and np.mean(twice) > FLICKER_SHARE)


def at_changes(points: Points, step_m: float) -> Points:
    """Points of rounded heights with the knowledge where it is: at the changes between steps.

    Half way between two points of different height the road is half way between them, within a
    twentieth of a step. In between it may be anywhere on the step, so each run of equal heights
    counts as one point with the spread of an even chance. Weights are for a noise of one step.
    """
    change = np.flatnonzero(np.diff(points.height_m) != 0)
    ends = np.concatenate([[0], change + 1, [len(points.at_m)]])
    size = np.diff(ends)
    middle_m = (points.at_m[change] + points.at_m[change + 1]) / 2
    middle_height = (points.height_m[change] + points.height_m[change + 1]) / 2
    at = np.concatenate([points.at_m, middle_m])
    order = np.argsort(at, kind="stable")
    height = np.concatenate([points.height_m, middle_height])
    weight = np.concatenate([12.0 / np.repeat(size, size), np.full(len(change), SURE_SHARE**-2)])
    return Points(at[order], height[order], weight[order])


def binned(at_m: Array, height_m: Array, within_m: float = 2.0) -> Points:
    """Points closer than ``within_m`` to each other made one, so that none is counted twice."""
    bins = np.floor((at_m - at_m[0]) / within_m).astype(int)
    _, index, count = np.unique(bins, return_inverse=True, return_counts=True)
    if len(count) == len(at_m):
        return plain(at_m, height_m)
    return plain(np.bincount(index, at_m) / count, np.asarray(np.bincount(index, height_m) / count))
