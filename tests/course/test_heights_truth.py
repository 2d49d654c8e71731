"""Smoothed heights against known roads, spoiled in every way that files are.

The roads and the errors are invented (``courses/`` and ``height_noise.py``), so the truth is known
exactly and nothing of it was made by the code under test. No seed here was used to choose a
constant: tuning used the seeds below ``FIRST_TEST_SEED``. Limits: the project's own, from a study
of some twenty smoothing methods. ``python tests/course/height_truth.py`` prints the table.
"""

from __future__ import annotations

import sys
from functools import cache
from pathlib import Path

import numpy as np
import pytest

sys.path.insert(0, str(Path(__file__).resolve().parent))

import height_truth as truth
from height_noise import FIRST_TEST_SEED, KINDS, PROFILES, profile, spoiled

LAP = "quillport_lap"
MOST_TIME_OFF_PCT = {kind: 1.0 if kind[:2] in ("10", "90") else 0.5 for kind in KINDS}
MOST_TIME_OFF_LAP_PCT = {kind: 2.5 for kind in KINDS if "grid" in kind}
MOST_TIME_OFF_LAP_PCT |= {"drift": 1.0, "10 m steps": 2.5}
"""On a lap of 4.4 km with one hill, a metre or two of it is a whole percent of the time."""
MOST_CLIMBING_OFF = dict.fromkeys(KINDS, 0.05) | {
    "10 m steps": 0.13,
    "90 m grid": 0.08,
    "90 m grid, tunnels": 0.10,
}
"""Share of the climbing, from 8 m a kilometre on: steps of 10 m swallow hills lower than that."""
LATE = ("lagging", "drift")
"""What no height shows: a clock behind the road, and a slow drift. The stated error allows for
half the usual lag, so it is too small where there is one and too large where there is none."""


@cache
def scores(kind: str) -> list[truth.Score]:
    return [truth.score(kind, name, seed) for name in PROFILES for seed in truth.TEST_SEEDS]


def test_no_test_seed_was_tuned_on():
    assert max(truth.TUNING_SEEDS) < FIRST_TEST_SEED <= min(truth.TEST_SEEDS)


@pytest.mark.parametrize("kind", KINDS)
def test_the_gradient_over_100_m_is_within_its_limit_on_every_road_and_seed(kind):
    worst = max(scores(kind), key=lambda one: one.rmse_pct)
    assert worst.rmse_pct <= truth.MOST_RMSE_PCT[kind], worst


@pytest.mark.parametrize("kind", KINDS)
def test_the_source_of_heights_is_recognised_in_nine_of_ten(kind):
    assert np.mean([one.right_source for one in scores(kind)]) >= 0.9


@pytest.mark.parametrize("kind", [kind for kind in KINDS if kind not in LATE])
def test_the_stated_gradient_error_is_within_30_percent_of_the_true_one(kind):
    ratio = np.array([one.stated_pct / one.rmse_pct for one in scores(kind)])
    assert np.exp(np.mean(np.log(ratio))) == pytest.approx(1.0, abs=0.2)
    assert np.mean(np.abs(ratio - 1) <= 0.3) >= 0.85
    assert np.all((ratio > 0.5) & (ratio < 1.8))


@pytest.mark.parametrize("kind", LATE)
def test_the_stated_error_of_a_barometer_is_within_a_factor_of_two(kind):
    ratio = np.array([one.stated_pct / one.rmse_pct for one in scores(kind)])
    assert np.all((ratio > 0.45) & (ratio < 2.0))


@pytest.mark.parametrize("kind", KINDS)
def test_climbing_is_within_5_percent_or_2_m_a_kilometre_on_flat_courses(kind):
    for one in scores(kind):
        share = MOST_CLIMBING_OFF[kind]
        most = share * one.climbing_m_per_km if one.climbing_m_per_km >= 8 else 2.0
        if one.name == LAP and kind == "90 m grid, tunnels":
            most = 3.5
        assert abs(one.climbing_off_m_per_km) <= most, one


@pytest.mark.parametrize("kind", KINDS)
def test_a_fixed_ride_with_inertia_takes_the_time_it_takes_on_the_true_road(kind):
    # The rise from start to finish is the file's own: where that is off, as after a drift on a hill
    # climb, so is the time, whatever is done in between.
    for one in scores(kind):
        most = MOST_TIME_OFF_PCT[kind]
        if one.name == LAP:
            most = MOST_TIME_OFF_LAP_PCT.get(kind, most)
        assert abs(one.time_off_pct) <= most + one.net_off_pct, one


@pytest.mark.slow
def test_a_fixed_window_and_a_plain_spline_do_far_worse_on_grids_and_artefacts():
    totals = [truth.beside(kind, truth.TEST_SEEDS[0]) for kind in KINDS if "grid" in kind]
    ours, window, spline = np.sum(totals, axis=0)
    print(f"sum of gradient errors: ours {ours:.1f}, window {window:.1f}, spline {spline:.1f} %")
    assert ours < window / 3
    assert ours < spline / 3


def test_true_ramps_survive_white_noise():
    road = profile("scarnhead_climb", 0)
    ramp = int(np.argmax(road.slope))
    for kind in ("white 0.5 m", "1 m steps", "lagging"):
        result = truth.smoothed(spoiled(kind, "scarnhead_climb", truth.TEST_SEEDS[0]), road)
        slope = np.diff(result.elevation_m) / np.diff(result.distance_m)
        here = int(road.distance_m[ramp] / 10)
        assert slope[here - 5 : here + 5].max() > 0.85 * road.slope[ramp]
