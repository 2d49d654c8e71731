"""Pieces: cut where the load changes, as well as can be, and no oftener than is of use."""

from __future__ import annotations

from itertools import combinations, pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pacing.course.pieces import cut_pieces


def misfit(distance, load, cuts):
    """Sum over cells of length times squared distance from the mean of the piece."""
    total = 0.0
    for a, b in pairwise(cuts):
        length = np.diff(distance[a : b + 1])
        mean = np.average(load[a:b], weights=length)
        total += float(np.sum(length * (load[a:b] - mean) ** 2))
    return total


def rolling_load(seed, cells):
    """A load like a road's: gradients of some hundred metres, and what varies within them."""
    rng = np.random.default_rng(seed)
    steps = np.repeat(rng.normal(0.0, 30.0, cells // 40 + 1), 40)[:cells]
    window = np.hanning(31) / np.hanning(31).sum()
    waves = np.convolve(rng.normal(0.0, 40.0, cells + 30), window, mode="valid")
    return 40.0 + steps + waves


@settings(max_examples=60, deadline=None)
@given(
    st.lists(st.integers(-3, 3), min_size=2, max_size=11),
    st.integers(1, 5),
    st.sampled_from([0.0, 10.0, 25.0]),
    st.integers(0, 99),
)
def test_no_other_cuts_of_a_short_course_are_better(load, most, shortest, seed):
    # Against every possible set of cuts, tried one by one.
    load = np.array(load, dtype=float)
    cell = np.random.default_rng(seed).uniform(5.0, 15.0, load.size)
    distance = np.concatenate([[0.0], np.cumsum(cell)])
    found = cut_pieces(distance, load, most_pieces=most, shortest_m=shortest)
    best = misfit(distance, load, (0, load.size))
    for count in range(1, most):
        for inner in combinations(range(1, load.size), count):
            cuts = np.array([0, *inner, load.size])
            if np.min(np.diff(distance[cuts])) >= shortest:
                best = min(best, misfit(distance, load, cuts))
    assert misfit(distance, load, found) == pytest.approx(best, abs=1e-6 + 1e-6 * best)


@settings(max_examples=60, deadline=None)
@given(st.integers(0, 9999), st.integers(1, 900), st.integers(1, 60), st.floats(0.0, 800.0))
def test_pieces_cover_the_course_and_keep_their_number_and_length(seed, cells, most, shortest):
    distance = 10.0 * np.arange(cells + 1)
    cuts = cut_pieces(distance, rolling_load(seed, cells), most_pieces=most, shortest_m=shortest)
    assert cuts[0] == 0 and cuts[-1] == cells
    assert len(cuts) - 1 <= most
    length = np.diff(distance[cuts])
    assert np.all(length > 0.0)
    assert len(cuts) == 2 or np.min(length) >= shortest - 1e-6


def test_a_constant_load_is_one_piece():
    distance, load = 10.0 * np.arange(20_001), np.full(20_000, 31.7)
    assert list(cut_pieces(distance, load, most_pieces=80, shortest_m=100.0)) == [0, 20_000]


def test_cuts_fall_where_the_load_steps():
    load = np.repeat([12.0, 55.0, -20.0, 30.0], [140, 61, 333, 66])
    cuts = cut_pieces(10.0 * np.arange(601), load, most_pieces=20, shortest_m=100.0)
    assert list(cuts) == [0, 140, 201, 534, 600]


def test_cuts_are_not_found_one_after_the_other():
    # The best single cut of this load lies in the middle of what must not be cut with two.
    load = np.repeat([0.0, 10.0, 0.0], [100, 120, 100])
    distance = 10.0 * np.arange(321)
    assert list(cut_pieces(distance, load, most_pieces=3, shortest_m=50.0)) == [0, 100, 220, 320]


def test_long_courses_are_cut_all_but_as_well_as_by_trying_every_node():
    # Against the whole dynamic programme over every node, written out here.
    cells, most, shortest = 700, 16, 200.0
    distance, load = 10.0 * np.arange(cells + 1), rolling_load(5, cells)
    first, second = (np.concatenate([[0.0], np.cumsum(load**k)]) for k in (1, 2))
    cost = np.full((cells + 1, cells + 1), np.inf)
    for a in range(cells):
        b = np.arange(a + 20, cells + 1)
        cost[a, b] = 10.0 * (second[b] - second[a] - (first[b] - first[a]) ** 2 / (b - a))
    best = cost[0]
    for _ in range(most - 1):
        best = np.minimum(best, np.min(best[:, None] + cost, axis=0))
    found = cut_pieces(distance, load, most_pieces=most, shortest_m=shortest)
    assert misfit(distance, load, found) <= 1.005 * best[-1]


def test_two_hundred_kilometres_are_cut_like_their_first_tenth():
    # The load repeats, so the misfit of the whole is at most ten times that of a tenth.
    part = rolling_load(7, 2000)
    tenth = cut_pieces(10.0 * np.arange(2001), part, most_pieces=12, shortest_m=150.0)
    distance, load = 10.0 * np.arange(20_001), np.tile(part, 10)
    whole = cut_pieces(distance, load, most_pieces=120, shortest_m=150.0)
    assert misfit(distance, load, whole) <= 1.02 * 10 * misfit(distance[:2001], part, tenth)


@pytest.mark.parametrize(
    ("distance", "load", "words"),
    [
        ([0.0, 10.0], [], "one value more"),
        ([0.0, 10.0, 20.0], [1.0], "one value more"),
        ([0.0, 10.0, 10.0], [1.0, 2.0], "rise"),
        ([0.0, 10.0, 20.0], [1.0, float("nan")], "finite"),
    ],
)
def test_what_is_no_course_is_refused(distance, load, words):
    with pytest.raises(ValueError, match=words):
        cut_pieces(np.array(distance), np.array(load), most_pieces=4, shortest_m=10.0)
