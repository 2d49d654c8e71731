"""Bends: the radius where the points tell it, "unknown" where they do not, and none invented."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from pacing.course.bends import find_bends
from pacing.course.line import smooth_line

sys.path.insert(0, str(Path(__file__).resolve().parent))

from drawn import STRAIGHT, draw, on_earth, recorded, winding

LEG = (600.0, STRAIGHT)


def bends_of(road, spacing_m, noise_m=0.0, seed=1):
    return find_bends(smooth_line(*recorded(road, spacing_m, noise_m, seed)))


def radii(bends):
    return [bend.radius_m for bend in bends if bend.radius_m is not None]


@pytest.mark.parametrize("radius_m", [10.0, 20.0, 40.0, 70.0, 100.0])
@pytest.mark.parametrize("turn_deg", [90.0, -180.0, 300.0])
@pytest.mark.parametrize("share", [0.1, 0.25])
def test_a_well_sampled_arc_has_its_radius(radius_m, turn_deg, share):
    spacing = max(share * radius_m, 2.0)
    road = draw(LEG, (turn_deg, radius_m), LEG)
    found = bends_of(road, spacing)
    assert len(found) == 1
    assert found[0].radius_m == pytest.approx(radius_m, rel=0.1)
    assert found[0].turn_deg == pytest.approx(turn_deg, abs=6.0)
    assert found[0].at_m == pytest.approx(road.length_m / 2, abs=spacing + 3.0)
    assert found[0].length_m == pytest.approx(road.length_m - 1200.0, rel=0.15)


def test_circles_are_within_a_quarter_of_their_radius_or_unknown():
    # Radii of 10 to 100 m, points 2 to 50 m apart, 0 to 3 m of noise; the radii are as drawn.
    right = wrong = 0
    for radius in (10.0, 17.0, 40.0, 100.0):
        for spacing in (2.0, 5.0, 10.0, 20.0, 50.0):
            for noise in (0.0, 1.0, 3.0):
                for turn in (75.0, -120.0, 180.0):
                    road = draw(LEG, (turn, radius), LEG)
                    seed = int(radius + 10 * spacing + 1000 * noise)
                    for found in radii(bends_of(road, spacing, noise, seed)):
                        close = abs(found / radius - 1.0) < 0.25
                        right, wrong = right + close, wrong + (not close)
    assert right > 100
    assert wrong <= 0.025 * (right + wrong)


@pytest.mark.parametrize(
    ("radius_m", "spacing_m", "noise_m"),
    [(20.0, 3.0, 1.0), (50.0, 8.0, 1.0), (50.0, 3.0, 3.0), (100.0, 12.0, 1.0), (100.0, 8.0, 3.0)],
)
def test_noise_that_leaves_an_arc_to_be_seen_does_not_hide_its_radius(radius_m, spacing_m, noise_m):
    known = 0
    for seed in range(6):
        found = radii(bends_of(draw(LEG, (120.0, radius_m), LEG), spacing_m, noise_m, seed))
        known += len(found) == 1 and abs(found[0] / radius_m - 1.0) < 0.25
    assert known >= 5


@pytest.mark.parametrize("spacing_m", [30.0, 50.0, 100.0])
def test_a_turn_between_points_far_apart_is_a_turn_of_unknown_radius(spacing_m):
    for radius in (10.0, 15.0):
        found = bends_of(draw(LEG, (90.0, radius), LEG), spacing_m)
        assert radii(found) == []
        assert sum(bend.turn_deg for bend in found) == pytest.approx(90.0, abs=25.0)
        for bend in found:
            assert bend.widest_m is None or bend.widest_m > radius
            assert bend.planning_radius_m is None or bend.planning_radius_m > 0.7 * radius


@settings(max_examples=30, deadline=None)
@given(st.integers(0, 9999), st.floats(120.0, 400.0))
def test_direction_changes_between_sparse_points_are_no_hairpins(seed, spacing_m):
    rng = np.random.default_rng(seed)
    heading = np.cumsum(rng.uniform(-1.5, 1.5, 40))
    steps = spacing_m * rng.uniform(0.7, 1.3, 40)[:, None]
    points = np.cumsum(steps * np.stack([np.sin(heading), np.cos(heading)], axis=1), axis=0)
    for bend in find_bends(smooth_line(*on_earth(points, 48.0, 10.0))):
        # Nothing slower than 37 km/h, the speed of a radius of 36 m at 0.3 g.
        assert bend.planning_radius_m is None or bend.planning_radius_m > 36.0


@pytest.mark.parametrize("spacing_m", [2.0, 5.0, 10.0, 20.0, 50.0])
@pytest.mark.parametrize("noise_m", [0.3, 1.0, 3.0])
def test_straight_noisy_roads_have_no_bends(spacing_m, noise_m):
    road = draw((max(3000.0, 150 * spacing_m), STRAIGHT), heading_deg=70.0)
    for seed in (1, 2):
        assert bends_of(road, spacing_m, noise_m, seed) == ()


@pytest.mark.parametrize("spacing_m", [3.0, 10.0, 20.0])
@pytest.mark.parametrize("noise_m", [0.0, 0.5])
def test_a_dead_turn_is_found_and_tight(spacing_m, noise_m):
    road = draw((900.0, STRAIGHT), (180.0, 3.5), (900.0, STRAIGHT))
    found = bends_of(road, spacing_m, noise_m)
    assert len(found) == 1
    assert found[0].radius_m is not None and found[0].radius_m < 6.0
    assert abs(found[0].turn_deg) == pytest.approx(180.0, abs=25.0)
    assert found[0].at_m == pytest.approx(905.0, abs=15.0)


def test_a_roundabout_is_a_bend_between_two_others():
    # Straight on over a roundabout of 18 m, entered and left by arcs of 20 m.
    parts = [LEG, (45.0, 20.0), (-90.0, 18.0), (45.0, 20.0), LEG]
    found = bends_of(draw(*parts), 3.0)
    assert [np.sign(bend.turn_deg) for bend in found] == [1, -1, 1]
    assert found[1].radius_m == pytest.approx(18.0, rel=0.2)


def test_a_bend_that_tightens_is_taken_apart():
    found = bends_of(draw(LEG, (60.0, 90.0), (80.0, 22.0), LEG), 4.0)
    assert min(radii(found)) == pytest.approx(22.0, rel=0.2)
    tight = min(found, key=lambda bend: bend.radius_m or np.inf)
    assert tight.length_m < 60.0


def test_a_slight_kink_is_no_bend():
    assert bends_of(draw(LEG, (12.0, 10.0), LEG), 5.0) == ()


def test_standing_still_beside_the_road_draws_no_hairpin():
    lat, lon = on_earth(np.array([[0.0, 10.0 * n] for n in range(120)]), 48.0, 10.0)
    hook = on_earth(np.array([[9.0, 603.0], [1.0, 606.0]]), 48.0, 10.0)
    lat, lon = (np.insert(a, 61, b) for a, b in zip((lat, lon), hook, strict=True))
    assert find_bends(smooth_line(lat, lon)) == ()


def test_ridden_the_other_way_the_bends_are_the_same_but_for_their_side():
    lat, lon = recorded(winding(3, 25, (15.0, 90.0)), 7.0, 0.4, 3)
    there, back = smooth_line(lat, lon), smooth_line(lat[::-1], lon[::-1])
    one, other = find_bends(there), find_bends(back)[::-1]
    assert len(one) == len(other) > 10
    for a, b in zip(one, other, strict=True):
        assert b.at_m == pytest.approx(there.length_m - a.at_m, abs=6.0)
        assert b.turn_deg == pytest.approx(-a.turn_deg, abs=4.0)
        if a.radius_m is not None and b.radius_m is not None:
            assert b.radius_m == pytest.approx(a.radius_m, rel=0.15)


def test_every_tight_bend_of_a_winding_road_is_found():
    # Bends as drawn: 40 of 15 to 60 m, each turning by 15 to 110 degrees; those below 25 may go.
    road = winding(8, 40, (15.0, 60.0))
    found = bends_of(road, 6.0, 0.3, 8)
    rng = np.random.default_rng(8)
    at, drawn = 0.0, []
    for _ in range(40):
        at += float(rng.uniform(60.0, 500.0))
        turn = float(rng.choice([-1, 1]) * rng.uniform(15.0, 110.0))
        radius = float(rng.uniform(15.0, 60.0))
        drawn.append((at + abs(np.radians(turn)) * radius / 2, turn, radius))
        at += abs(np.radians(turn)) * radius
    close = 0
    for at, turn, radius in drawn:
        near = [b for b in found if abs(b.at_m - at) < 15.0 and b.turn_deg * turn > 0]
        if abs(turn) < 25.0:
            continue
        assert near, (at, turn, radius)
        planned = near[0].planning_radius_m
        close += planned is not None and abs(planned / radius - 1.0) < 0.35
    sharp = sum(abs(turn) >= 25.0 for _, turn, _ in drawn)
    assert len(found) <= 42
    assert close >= 0.85 * sharp


def test_a_line_of_two_points_has_no_bends():
    assert find_bends(smooth_line(np.array([48.0, 48.01]), np.array([10.0, 10.0]))) == ()
