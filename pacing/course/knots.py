"""Which points tell of the line of a road, and how much noise they can hold at most."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.intp]

# Points closer than this to the straight between their neighbours say nothing of the line.
_COLLINEAR_M = 0.02
_SAME_PLACE_M = 0.05
# No recorder that is of use for a race course strays further than this, one standard deviation.
_MOST_NOISE_M = 8.0


def _beside_chord(points: Array) -> tuple[Array, Array]:
    """How far each inner point (P-2,) lies aside of its neighbours' chord, and its share of it."""
    step = points[1:-1] - points[:-2]
    chord = points[2:] - points[:-2]
    share = np.sum(step * chord, axis=1) / np.maximum(np.sum(chord * chord, axis=1), 1e-12)
    return np.linalg.norm(step - share[:, None] * chord, axis=1), share


def most_noise_m(points: Array, kept: Index) -> float:
    """Noise that cannot be exceeded, judged before anything is smoothed.

    Where most points lie on straights there is none. Where the points lie closest, noise makes
    the turn change sides from point to point more often than not; a drawn route, which has points
    close together because the road bends there, does not do that.
    """
    apart = np.linalg.norm(np.diff(points, axis=0), axis=1) > _SAME_PLACE_M
    distinct = points[np.concatenate(([True], apart))]
    if distinct.shape[0] < 3 or kept.size < 5:
        return 0.0
    aside, _ = _beside_chord(distinct)
    straight = 6.0 * float(np.quantile(aside, 0.7))
    return min(straight, _noise_from_alternation_m(points[kept]), _MOST_NOISE_M)


def _noise_from_alternation_m(knots: Array) -> float:
    """Bound on the noise from the third of the knots that lie closest: neighbouring deviations.

    White noise alone changes sides in 0.73 of the cases (all but 1/2 + asin(2/3)/pi).
    """
    step = np.linalg.norm(np.diff(knots, axis=0), axis=1)
    up = knots[1:-1] / np.linalg.norm(knots[1:-1], axis=1)[:, None]
    chord = knots[2:] - knots[:-2]
    side = np.sum(np.cross(chord, knots[1:-1] - knots[:-2]) * up, axis=1)
    side /= np.maximum(np.linalg.norm(chord, axis=1), 1e-9)
    share = step[:-1] / (step[:-1] + step[1:])
    product = -side[:-1] * side[1:] / (1.0 + share[:-1] - share[1:])
    close = step[1:-1] <= np.quantile(step[1:-1], 1.0 if step.size < 90 else 1 / 3)
    product = product[close]
    edge = np.quantile(np.abs(product), 0.8)
    variance = max(float(np.mean(np.clip(product, -edge, edge))), 0.0)
    alternating = float(np.mean(product > 0.0))
    # Noise greater than the steps makes the points go back and forth, and the sides meaningless.
    back = np.sum(np.diff(knots, axis=0)[1:] * np.diff(knots, axis=0)[:-1], axis=1)[1:] < 0.0
    alternating += float(np.mean(back[close]))
    bound = 2.5 * np.sqrt(variance) + 0.02 * float(np.median(step[1:-1][close]))
    return float(bound + _MOST_NOISE_M * np.clip((alternating - 0.5) / 0.08, 0.0, 1.0))


def telling_points(points: Array) -> Index:
    """Indices of the points that are neither repeated nor on the straight between neighbours."""
    kept = np.arange(points.shape[0], dtype=np.intp)
    while kept.size > 2:
        aside, share = _beside_chord(points[kept])
        apart = np.linalg.norm(np.diff(points[kept], axis=0), axis=1)
        repeated = apart[:-1] < _SAME_PLACE_M
        idle = repeated | ((aside < _COLLINEAR_M) & (share >= 0.0) & (share <= 1.0))
        # Of a run of idle points every other one goes, then the rest are looked at again.
        first = np.flatnonzero(idle)
        if first.size == 0:
            break
        run = np.cumsum(np.concatenate(([True], np.diff(first) > 1)))
        start = first[np.searchsorted(run, run)]
        kept = np.delete(kept, first[(first - start) % 2 == 0] + 1)
    if kept.size == 2 and np.linalg.norm(points[kept[1]] - points[kept[0]]) < _SAME_PLACE_M:
        return kept[:1]
    return kept
