"""The road between two points of a line: how long, and how far it bulges from the chord."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

_CORNER_SHARE = 0.25


def chord_arcs(place: Array, chord: Array, noise_m: float) -> tuple[Array, Array]:
    """Length (K-1,) of the road over each ``chord`` (K-1,), and its curvature vector (K-1, 3).

    ``place`` (K, 3) holds the knots, earth-centred; lengths in m, curvature in 1/m.

    The road bulges where both ends of a chord turn the same way. A turn belongs to the chord
    beyond which the road turns on: within an even bend half of it to either side, at the end of a
    bend none to the straight. Where two turns stand alone the road between may be an even arc
    or a corner that fell between the points: a quarter of the way to the corner's length was
    nearest the truth on invented roads.
    """
    if chord.size == 1:
        return chord, np.zeros((1, 3))
    direction = np.diff(place, axis=0) / chord[:, None]
    change = np.diff(direction, axis=0)
    side = np.cross(direction[:-1], direction[1:])
    side = np.sum(side * place[1:-1], axis=1)
    reach = (chord[1:] + chord[:-1]) / 2
    # What the noise left in the places may make of a straight is not road.
    squared = np.sum(change * change, axis=1) - 6.0 * (noise_m / reach) ** 2
    turn = np.sign(side) * np.sqrt(np.maximum(squared, 0.0))
    curve = turn / reach
    # Two more at either end: beyond the first and the last point the road is straight.
    turn, curve = np.pad(turn, 2), np.pad(curve, 2)
    length = np.pad(chord, 1, mode="edge")
    way = np.sign(turn[1:-2])
    same = turn[1:-2] * turn[2:-1] > 0.0
    at_start = length[1:-1] * np.abs(curve[2:-1])
    at_start /= at_start + length[:-2] * np.maximum(way * curve[:-3], 0.0) + 1e-12
    at_end = length[1:-1] * np.abs(curve[1:-2])
    at_end /= at_end + length[2:] * np.maximum(way * curve[3:], 0.0) + 1e-12
    first = np.where(same, at_start * np.abs(turn[1:-2]), 0.0)
    last = np.where(same, at_end * np.abs(turn[2:-1]), 0.0)
    # More than a radian or two within a chord is a corner; a chord far longer than the next is a
    # straight, whose points were left out because they lay on it.
    trust = np.clip((2.0 - first - last) / 0.8, 0.0, 1.0)
    trust *= np.clip(2.5 - chord / np.minimum(length[:-2], length[2:]), 0.0, 1.0)
    first, last = trust * first, trust * last
    alone = np.clip((at_start * at_end - 0.25) / 0.75, 0.0, 1.0) * _CORNER_SHARE
    # First and last over the chord: an even arc has a third of the triangle's excess.
    excess = first * last / 2 * ((1 - alone) / 3 + alone)
    inward = np.concatenate((change[:1], change)) + np.concatenate((change, change[-1:]))
    inward -= np.sum(inward * direction, axis=1)[:, None] * direction
    size = (first + last) / chord / np.maximum(np.linalg.norm(inward, axis=1), 1e-12)
    return chord * (1.0 + excess), size[:, None] * inward


def along_arcs(distance: Array, knot_distance: Array, place: Array, bend: Array) -> Array:
    """Places (N+1, 3) at ``distance`` (N+1,): on each chord, set out by its parabola.

    Knots lie at ``knot_distance`` (K,) and ``place`` (K, 3); ``bend`` (K-1, 3) is the curvature
    vector over each chord. Lengths in m, curvature in 1/m.
    """
    k = np.clip(np.searchsorted(knot_distance, distance, side="right") - 1, 0, bend.shape[0] - 1)
    length = knot_distance[k + 1] - knot_distance[k]
    share = ((distance - knot_distance[k]) / length)[:, None]
    chord = place[k + 1] - place[k]
    squared = np.sum(chord * chord, axis=1)[:, None]
    return np.asarray(place[k] + share * chord - share * (1 - share) * squared / 2 * bend[k])
