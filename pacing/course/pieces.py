"""Pieces: runs of the course over which one power target is sensible."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Index = NDArray[np.intp]

# Places where a cut may fall in the dynamic programme. Its time grows with the square of this
# number and not with the length of the course; the cuts are then settled on the full grid.
_MOST_PLACES = 500
_MOST_ROUNDS = 3


class _Sums(NamedTuple):
    """Running sums of length, load and load squared from the start, at the nodes (N+1,)."""

    length: Array
    load: Array
    square: Array

    def misfit(self, start: Index, end: Index) -> Array:
        """Squared distance of the load from its mean, times length, over start..end."""
        length = self.length[end] - self.length[start]
        load = self.load[end] - self.load[start]
        square = self.square[end] - self.square[start]
        return np.maximum(square - load * load / length, 0.0)

    def total(self, cuts: Index) -> float:
        """Misfit of all pieces."""
        return float(np.sum(self.misfit(cuts[:-1], cuts[1:])))


def cut_pieces(
    distance_m: Array, load: Array, *, most_pieces: int, shortest_m: float
) -> NDArray[np.intp]:
    """Cut a course into pieces within which the load changes as little as possible.

    The cuts minimise the sum over all cells of cell length times the squared difference between
    the load and its mean over the piece (least squares, by dynamic programming). No more pieces
    are made than the load asks for: a constant load gives one.

    Parameters
    ----------
    distance_m : (N+1,) distance at the nodes of the grid, rising, metres.
    load : (N,) what the rider must overcome in each cell, in any unit.
    most_pieces : the greatest number of pieces, at least 1.
    shortest_m : no piece is shorter, metres (the whole course excepted).

    Returns
    -------
    Indices of the nodes that bound the pieces, 0 and N included.

    Raises
    ------
    ValueError
        Shapes that do not match, distances that do not rise, numbers that are not finite.
    """
    distance_m = np.asarray(distance_m, dtype=float)
    load = np.asarray(load, dtype=float)
    _check(distance_m, load, most_pieces, shortest_m)
    length = np.diff(distance_m)
    centred = load - np.average(load, weights=length)
    sums = _Sums(
        distance_m - distance_m[0],
        np.concatenate(([0.0], np.cumsum(centred * length))),
        np.concatenate(([0.0], np.cumsum(centred * centred * length))),
    )
    if most_pieces == 1 or sums.length[-1] < 2.0 * shortest_m:
        return np.array([0, load.size], dtype=np.intp)
    places = _places(sums, _MOST_PLACES)
    cuts = _settle(sums, _best_cuts(sums, places, most_pieces, shortest_m), shortest_m)
    for _ in range(_MOST_ROUNDS):
        around = _around(cuts, load.size, places)
        again = _settle(sums, _best_cuts(sums, around, most_pieces, shortest_m), shortest_m)
        if not sums.total(again) < sums.total(cuts) * (1.0 - 1e-6):
            break
        cuts = again
    return cuts


def _check(distance_m: Array, load: Array, most_pieces: int, shortest_m: float) -> None:
    if load.ndim != 1 or load.size == 0 or distance_m.shape != (load.size + 1,):
        raise ValueError("distance_m must hold one value more than load, and load at least one")
    if not (np.all(np.isfinite(distance_m)) and np.all(np.isfinite(load))):
        raise ValueError("distance_m and load must be finite")
    if np.any(np.diff(distance_m) <= 0.0):
        raise ValueError("distance_m must rise from node to node")
    if most_pieces < 1 or not shortest_m >= 0.0:
        raise ValueError("most_pieces must be at least 1 and shortest_m not negative")


def _places(sums: _Sums, most: int) -> Index:
    """Nodes where a cut may be worth it: neighbours that differ least are joined first.

    Every round joins those pairs that differ less than both neighbouring pairs do, the cheapest
    of them first, so the number of rounds grows with the logarithm of the number of cells.
    """
    nodes = np.arange(sums.length.size, dtype=np.intp)
    while nodes.size - 1 > most:
        apart = sums.misfit(nodes[:-1], nodes[1:])
        together = sums.misfit(nodes[:-2], nodes[2:])
        price = together - apart[:-1] - apart[1:]
        # Of equals every other one goes, so that a constant load is thinned evenly and at once.
        price = price + 1e-12 * (price.max() + 1e-30) * (np.arange(price.size) % 2)
        walled = np.concatenate(([np.inf], price, [np.inf]))
        lowest = np.flatnonzero((price < walled[:-2]) & (price <= walled[2:]))
        surplus = nodes.size - 1 - most
        if lowest.size > surplus:
            lowest = lowest[np.argsort(price[lowest], kind="stable")[:surplus]]
        else:
            # The dearer half may yet be cheaper once its neighbours have been joined.
            lowest = lowest[price[lowest] <= np.median(price[lowest])]
        nodes = np.delete(nodes, lowest + 1)
    return nodes


def _around(cuts: Index, last: int, places: Index) -> Index:
    """Nodes near the cuts found, so that all cuts can be moved together, and every other place."""
    reach = max(_MOST_PLACES // (2 * cuts.size), 1)
    near = (cuts[:, None] + np.arange(-reach, reach + 1)).ravel()
    near = np.concatenate((near, places[::2], [0, last]))
    return np.unique(np.clip(near, 0, last))


def _best_cuts(sums: _Sums, places: Index, most_pieces: int, shortest_m: float) -> Index:
    """The best cuts among the given nodes, by dynamic programming."""
    n = places.size - 1
    start, end = np.meshgrid(places, places, indexing="xy")
    long_enough = sums.length[end] - sums.length[start] >= max(shortest_m * (1 - 1e-9), 1e-12)
    # misfit[j, i]: one piece from place i to place j.
    misfit = np.full((n + 1, n + 1), np.inf)
    misfit[long_enough] = sums.misfit(start[long_enough], end[long_enough])
    best = misfit[:, 0].copy()
    totals = [best[-1]]
    before: list[Index] = []
    blocks = np.array_split(np.arange(n + 1), min(8, n + 1))
    for _ in range(2, min(most_pieces, n) + 1):
        origin = np.zeros(n + 1, dtype=np.intp)
        following = np.full(n + 1, np.inf)
        for block in blocks:
            through = misfit[block[0] : block[-1] + 1, : block[-1] + 1] + best[: block[-1] + 1]
            origin[block] = np.argmin(through, axis=1)
            following[block] = through[block - block[0], origin[block]]
        before.append(origin)
        best = following
        totals.append(best[-1])
        if not np.isfinite(best[-1]):
            break
    return places[_trace(np.array(totals), before, n, sums.square[-1])]


def _trace(totals: Array, before: list[Index], last: int, scale: float) -> Index:
    """Walk back from the finish with the fewest pieces that are as good as the best."""
    enough = np.flatnonzero(totals <= np.min(totals) + 1e-9 * scale)[0]
    cuts = [last]
    for origin in before[:enough][::-1]:
        cuts.append(int(origin[cuts[-1]]))
    return np.array([*([0] if cuts[-1] != 0 else []), *cuts[::-1]], dtype=np.intp)


def _settle(sums: _Sums, cuts: Index, shortest_m: float) -> Index:
    """Move each cut to its best node of the full grid, its neighbours held, until none moves."""
    cuts = cuts.copy()
    for _ in range(20):
        moved = False
        for k in range(1, cuts.size - 1):
            left, right = cuts[k - 1], cuts[k + 1]
            first = np.searchsorted(sums.length, sums.length[left] + shortest_m * (1 - 1e-9))
            final = np.searchsorted(
                sums.length, sums.length[right] - shortest_m * (1 - 1e-9), side="right"
            )
            free = np.arange(max(first, left + 1), min(final, right), dtype=np.intp)
            if free.size == 0:
                continue
            total = sums.misfit(np.full_like(free, left), free)
            total = total + sums.misfit(free, np.full_like(free, right))
            better = free[np.argmin(total)]
            now = total[np.searchsorted(free, cuts[k])]
            if total.min() < now - 1e-12 * (sums.square[-1] + 1e-300):
                cuts[k] = better
                moved = True
        if not moved:
            break
    return cuts
