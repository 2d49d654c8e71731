"""Pieces cut where they cost least, by what the fine solve pays for power along the course."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Cuts = NDArray[np.intp]

MOST_PLACES = 360
LEVEL_W = 10.0


class Priced(NamedTuple):
    """A ride with power free in every cell, and what a departure from it costs (N,).

    Riding a cell at P instead of ``power_w`` costs ``more_s_per_w`` for every watt above it,
    ``less_s_per_w`` for every watt below, and half ``bend_s_per_w2`` times the square, in
    seconds. ``time_s`` is the time in each cell.
    """

    power_w: Array
    more_s_per_w: Array
    less_s_per_w: Array
    bend_s_per_w2: Array
    time_s: Array


class Cut(NamedTuple):
    """Pieces: their first cells and the powers they are best ridden at (n,)."""

    starts: Cuts
    power_w: Array


def cheapest_cuts(priced: Priced, *, most_pieces: int, shortest_s: float, levels_w: Array) -> Cut:
    """At most ``most_pieces`` pieces of one power each, none shorter than ``shortest_s``.

    Least total price by dynamic programming over places where a cut may fall: where the free
    power jumps, and evenly in time between. ``levels_w`` are the powers tried.
    """
    elapsed = np.concatenate([[0.0], np.cumsum(priced.time_s)])
    places = _places(priced.power_w, elapsed)
    price = _price_at(priced, levels_w, places)
    cost, level = _cost_between(price, elapsed[places], shortest_s)
    edges = _cheapest_path(cost, most_pieces)
    picked = level[edges[:-1], edges[1:]]
    return Cut(places[edges[:-1]], levels_w[picked])


def _places(power_w: Array, elapsed: Array) -> Cuts:
    """Nodes at which a cut may fall, ends included."""
    jump = np.abs(np.diff(power_w))
    count = min(MOST_PLACES // 2, jump.size)
    jumps = np.argpartition(-jump, count - 1)[:count] + 1 if count else np.empty(0, dtype=np.intp)
    even = np.searchsorted(elapsed, np.linspace(0.0, elapsed[-1], MOST_PLACES // 2))
    return np.unique(
        np.concatenate([[0, power_w.size], jumps, np.minimum(even, power_w.size)])
    ).astype(np.intp)


def _price_at(priced: Priced, levels_w: Array, places: Cuts) -> Array:
    """Price of riding from the start to each place at each level (levels, places)."""
    rows = np.empty((levels_w.size, places.size))
    for row, level in zip(rows, levels_w.tolist(), strict=True):
        step = level - priced.power_w
        slope = np.where(step > 0.0, priced.more_s_per_w, -priced.less_s_per_w)
        price = step * slope + 0.5 * priced.bend_s_per_w2 * step**2
        row[:] = np.concatenate([[0.0], np.cumsum(price)])[places]
    return rows


def _cost_between(
    price: Array, elapsed: Array, shortest_s: float
) -> tuple[Array, NDArray[np.intp]]:
    """Least price of one piece between any two places (m, m), and its level."""
    count = elapsed.size
    cost = np.full((count, count), np.inf)
    level = np.zeros((count, count), dtype=np.intp)
    whole = (0, count - 1)
    for i in range(count - 1):
        first = int(np.searchsorted(elapsed, elapsed[i] + shortest_s))
        if first >= count:
            if i == 0:
                first = count - 1
            else:
                break
        between = price[:, first:] - price[:, i : i + 1]
        level[i, first:] = np.argmin(between, axis=0)
        cost[i, first:] = np.min(between, axis=0)
    assert np.isfinite(cost[whole])
    return cost, level


def _cheapest_path(cost: Array, most_pieces: int) -> NDArray[np.intp]:
    """Places (n + 1,) that bound the pieces of least total cost, at most ``most_pieces``."""
    count = cost.shape[0]
    best = cost[0].copy()
    before = [np.zeros(count, dtype=np.intp)]
    totals = [best[-1]]
    for _ in range(1, most_pieces):
        through = best[:, None] + cost
        step = np.argmin(through, axis=0)
        best = through[step, np.arange(count)]
        before.append(step)
        totals.append(best[-1])
    pieces = int(np.argmin(totals))
    edges = [count - 1]
    for k in range(pieces, -1, -1):
        edges.append(int(before[k][edges[-1]]))
    return np.array(edges[::-1], dtype=np.intp)
