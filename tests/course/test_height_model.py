"""The banded model of heights against the same model written out with dense matrices."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import multivariate_normal

from pacing.course.height_model import (
    WINDOW_NODES,
    HeightModel,
    Prior,
    _cost,
    _sampled,
    fit_model,
    road_heights,
    second_difference_bands,
    sums_of,
)

GRID = np.linspace(0.0, 300.0, 31)
MODEL = HeightModel(bend_pct=0.4, error_m=1.2, error_length_m=25.0, white_m=0.5)


def points(count=60):
    rng = np.random.default_rng(3)
    at = np.sort(rng.uniform(0, 300, count))
    return at, rng.normal(0, 1, count)


def dense(at, model, loose=3000.0):
    """Mean response and covariances: heights of points from a road, an error and white noise."""
    step = GRID[1] - GRID[0]
    nodes = len(GRID)
    change = np.diff(np.eye(nodes), 2, axis=0) / (model.bend_pct / 100 * step)
    plane = np.column_stack([np.ones(nodes), np.linspace(-1, 1, nodes)])
    road = np.linalg.inv(change.T @ change + plane @ plane.T / loose**2)
    keep = np.exp(-step / model.error_length_m)
    away = np.abs(np.subtract.outer(np.arange(nodes), np.arange(nodes)))
    # Stationary AR(2) with a double root: r^k (1 + k (1 - r²)/(1 + r²)), a textbook result.
    error = model.error_m**2 * keep**away * (1 + away * (1 - keep**2) / (1 + keep**2))
    place = at / step
    cell = np.minimum(place.astype(int), nodes - 2)
    read = np.zeros((len(at), nodes))
    read[np.arange(len(at)), cell] = 1 - (place - cell)
    read[np.arange(len(at)), cell + 1] = place - cell
    return read, road, error


def test_the_likeliest_road_is_that_of_the_dense_normal_equations():
    at, height = points()
    read, road, error = dense(at, MODEL)
    noise = read @ error @ read.T + MODEL.white_m**2 * np.eye(len(at))
    gain = road @ read.T @ np.linalg.inv(read @ road @ read.T + noise)
    expected = gain @ height
    found, _ = road_heights(sums_of(at, height, np.ones(len(at)), GRID), MODEL, 0)
    assert found == pytest.approx(expected, abs=2e-3)


def test_the_departures_have_the_spread_of_the_dense_posterior():
    at, height = points()
    read, road, error = dense(at, MODEL)
    noise = read @ error @ read.T + MODEL.white_m**2 * np.eye(len(at))
    gain = road @ read.T @ np.linalg.inv(read @ road @ read.T + noise)
    expected = np.sqrt(np.diag(road - gain @ read @ road))
    _, departures = road_heights(sums_of(at, height, np.ones(len(at)), GRID), MODEL, 4000)
    assert departures.std(axis=0) == pytest.approx(expected, rel=0.06)


def test_likelihoods_differ_as_those_of_the_dense_normal_distribution():
    at, height = points()
    sums = sums_of(at, height, np.ones(len(at)), GRID)

    def dense_log(model):
        read, road, error = dense(at, model)
        total = read @ (road + error) @ read.T + model.white_m**2 * np.eye(len(at))
        return multivariate_normal(np.zeros(len(at)), total).logpdf(height)

    other = HeightModel(bend_pct=0.2, error_m=0.7, error_length_m=25.0, white_m=0.9)
    # The plane that the road is free to lie on has a prior in the dense form only; it cancels.
    difference = _cost(sums, MODEL) - _cost(sums, other)
    assert difference == pytest.approx(dense_log(other) - dense_log(MODEL), abs=0.01)


def test_without_a_wandering_error_the_cost_is_that_of_a_vanishing_one():
    at, height = points()
    sums = sums_of(at, height, np.ones(len(at)), GRID)
    none = _cost(sums, MODEL._replace(error_m=0.0))
    assert _cost(sums, MODEL._replace(error_m=1e-4)) == pytest.approx(none, abs=1e-3)


def test_a_straight_line_has_no_second_differences():
    bands = second_difference_bands(7)
    full = sum(np.diag(bands[k, : 7 - k], -k) for k in range(3))
    full = full + np.tril(full, -1).T
    assert full == pytest.approx(np.diff(np.eye(7), 2, axis=0).T @ np.diff(np.eye(7), 2, axis=0))
    assert full @ np.arange(7.0) == pytest.approx(np.zeros(7), abs=1e-12)


def test_the_model_finds_the_noise_it_was_given():
    rng = np.random.default_rng(8)
    grid = np.linspace(0, 30000, 3001)
    gradient = np.cumsum(rng.normal(0, 0.002, 3000))
    height = np.concatenate([[0.0], np.cumsum(gradient * 10)]) + rng.normal(0, 0.8, 3001)
    prior = Prior(HeightModel(0.5, 0.0, 15.0, 0.3), HeightModel(1.0, 0.0, 0.0, 1.5))
    model, _ = fit_model(grid, height, np.ones(3001), grid, prior)
    assert model.white_m == pytest.approx(0.8, rel=0.05)
    assert model.bend_pct == pytest.approx(0.2, rel=0.15)


def test_windows_of_a_long_course_cost_what_they_cost_each_by_itself():
    rng = np.random.default_rng(9)
    grid = np.linspace(0, 60000, 6001)
    at = np.sort(rng.uniform(0, 60000, 6000))
    height = 100 * np.sin(at / 3000) + rng.normal(0, 1, 6000)
    sampled = _sampled(at, height, np.ones(6000), grid)
    assert sampled.nodes == sampled.windows * WINDOW_NODES < len(grid)
    total = 0.0
    for start in np.linspace(0, len(grid) - WINDOW_NODES, sampled.windows).astype(int):
        part = grid[start : start + WINDOW_NODES]
        inside = (at >= part[0]) & (at < part[-1])
        total += _cost(sums_of(at[inside], height[inside], np.ones(inside.sum()), part), MODEL)
    assert _cost(sampled, MODEL) == pytest.approx(total, rel=1e-9)
