"""How far smoothed heights end from the truth, beside a fixed window and a plain spline.

``python tests/course/height_truth.py`` prints the truth table on seeds never tuned on, the same
with ``--tuning`` on the seeds that constants were chosen on, with the ratios that the stated
gradient error was calibrated by.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import make_smoothing_spline
from scipy.signal import savgol_filter

sys.path.insert(0, str(Path(__file__).resolve().parent))

from height_noise import (
    FIRST_TEST_SEED,
    KINDS,
    PROFILES,
    Spoiled,
    grid_of,
    profile,
    spoiled,
    true_source,
)
from roads import Road

from pacing import motion
from pacing.bike.drag_area import DragArea
from pacing.course.heights import HeightProfile, smooth_heights

Array = NDArray[np.float64]

TEST_SEEDS = (FIRST_TEST_SEED + 21, FIRST_TEST_SEED + 22)
MASS_KG, POWER_W, EFFICIENCY = 84.0, 260.0, 0.976
TUNING_SEEDS = (1, 2, 3, 4, 5)

MOST_RMSE_PCT = {
    "white 0.5 m": 0.35,
    "white 1.5 m": 0.7,
    "drift": 0.7,
    "lagging": 0.7,
    "1 m steps": 0.7,
    "10 m steps": 1.3,
    "30 m grid": 1.1,
    "30 m grid, tunnels": 1.1,
    "90 m grid": 1.7,
    "90 m grid, tunnels": 1.9,
}


@dataclass(frozen=True)
class Score:
    """One road, one kind of noise, one seed."""

    kind: str
    name: str
    seed: int
    rmse_pct: float
    stated_pct: float
    source: str
    right_source: bool
    climbing_m_per_km: float
    climbing_off_m_per_km: float
    time_off_pct: float
    """Of a fixed ride with inertia, against the true road."""
    net_off_pct: float
    """The share of that time it takes to lift the rider by what the file's own ends are off."""


def gradient_rmse_pct(elevation_m: Array, road: Road) -> float:
    """Root mean square error of the gradient over 100 m windows every 10 m."""
    grid = grid_of(road)
    error = elevation_m - np.interp(grid, road.distance_m, road.height_m)
    over_m = grid[10] - grid[0]
    return float(100 * np.sqrt(np.mean((error[10:] - error[:-10]) ** 2)) / over_m)


def climbing_m(elevation_m: Array) -> float:
    """Sum of the rises."""
    return float(np.clip(np.diff(elevation_m), 0, None).sum())


def ride_s(elevation_m: Array, grid_m: Array) -> float:
    """Time of a fixed ride with inertia: 260 W, 84 kg, calm, at most 65 km/h."""
    run, rise = np.diff(grid_m), np.diff(elevation_m)
    cell = np.hypot(run, rise)
    count = len(cell)
    weight_n = MASS_KG * 9.80665
    ride = motion.Road(
        cell_m=cell,
        steady_n=weight_n * (rise + 0.004 * run) / cell,
        half_density_kg_m3=np.full(count, 0.6),
        wind_along_m_s=np.zeros(count),
        wind_across_m_s=np.zeros(count),
        position=np.zeros(count, dtype=np.intp),
        drag_areas=(DragArea(np.array([0.0]), np.array([0.25])),),
        bearing_n_per_m_s=0.0087,
        efficiency=EFFICIENCY,
        effective_mass_kg=85.2,
        traction_n=0.25 * weight_n,
        spin_out_m_s=np.inf,
        limit_m_s=np.full(count + 1, 65 / 3.6),
    )
    return motion.simulate_motion(ride, np.full(count, POWER_W), start_speed_m_s=5.0).total_s


def smoothed(points: Spoiled, road: Road) -> HeightProfile:
    """As the program does it: nothing told, the source judged from the heights."""
    return smooth_heights(
        points.distance_m,
        points.elevation_m,
        grid=grid_of(road),
        timed=points.timed,
        closed=road.closed,
    )


def fixed_window(points: Spoiled, grid: Array) -> Array:
    """A Savitzky-Golay filter, second order, over 21 nodes of the 10 m grid."""
    return np.asarray(savgol_filter(np.interp(grid, points.distance_m, points.elevation_m), 21, 2))


def plain_spline(points: Spoiled, grid: Array) -> Array:
    """A smoothing spline, its weight by generalised cross-validation."""
    at, first = np.unique(points.distance_m, return_index=True)
    return np.asarray(make_smoothing_spline(at, points.elevation_m[first])(grid))


def score(kind: str, name: str, seed: int) -> Score:
    """Spoil, smooth and compare."""
    road = profile(name, seed)
    points = spoiled(kind, name, seed)
    result = smoothed(points, road)
    grid = grid_of(road)
    truth = np.interp(grid, road.distance_m, road.height_m)
    kilometres = grid[-1] / 1000
    true_s = ride_s(truth, grid)
    net_off_m = np.diff(result.elevation_m[[0, -1]])[0] - np.diff(truth[[0, -1]])[0]
    return Score(
        kind=kind,
        name=name,
        seed=seed,
        rmse_pct=gradient_rmse_pct(result.elevation_m, road),
        stated_pct=result.gradient_error_pct,
        source=result.source,
        right_source=result.source == true_source(kind),
        climbing_m_per_km=climbing_m(truth) / kilometres,
        climbing_off_m_per_km=(climbing_m(result.elevation_m) - climbing_m(truth)) / kilometres,
        time_off_pct=100 * (ride_s(result.elevation_m, grid) / true_s - 1),
        net_off_pct=100 * MASS_KG * 9.80665 * abs(net_off_m) / (POWER_W * EFFICIENCY) / true_s,
    )


def beside(kind: str, seed: int) -> tuple[float, float, float]:
    """Sums over the roads of the gradient error [%]: ours, a fixed window's, a plain spline's."""
    sums = np.zeros(3)
    for name in PROFILES:
        road, points = profile(name, seed), spoiled(kind, name, seed)
        grid = grid_of(road)
        heights = (
            smoothed(points, road).elevation_m,
            fixed_window(points, grid),
            plain_spline(points, grid),
        )
        sums += [gradient_rmse_pct(height, road) for height in heights]
    return float(sums[0]), float(sums[1]), float(sums[2])


def climbing_within(one: Score) -> bool:
    """Within 5 % from 8 m a kilometre on, within 2 m a kilometre on flatter courses."""
    if one.climbing_m_per_km >= 8:
        return abs(one.climbing_off_m_per_km) <= 0.05 * one.climbing_m_per_km
    return abs(one.climbing_off_m_per_km) <= 2


def table(seeds: tuple[int, ...]) -> str:
    """The truth table as text."""
    lines = [
        f"{'kind':20s} {'limit':>5s} {'worst':>5s} {'mean':>5s}  stated/true (low, mean, high)"
        f"  {'stated within 30 %':18s} source  climbing  time off %"
    ]
    for kind in KINDS:
        scores = [score(kind, name, seed) for name in PROFILES for seed in seeds]
        rmse = np.array([one.rmse_pct for one in scores])
        ratio = np.array([one.stated_pct for one in scores]) / rmse
        near = np.mean(np.abs(ratio - 1) <= 0.3)
        time = max(abs(one.time_off_pct) for one in scores)
        lines.append(
            f"{kind:20s} {MOST_RMSE_PCT[kind]:5.2f} {rmse.max():5.2f} {rmse.mean():5.2f}  "
            f"{ratio.min():.2f} {np.exp(np.mean(np.log(ratio))):.2f} {ratio.max():.2f}"
            f"{'':15s} {100 * near:4.0f} % {'':11s}"
            f"{100 * np.mean([one.right_source for one in scores]):4.0f} % "
            f"{100 * np.mean([climbing_within(one) for one in scores]):6.0f} % {time:8.2f}"
        )
        for one in scores:
            if "-v" in sys.argv:
                lines.append(
                    f"    {one.name:18s} {one.seed} rmse {one.rmse_pct:.2f} stated "
                    f"{one.stated_pct:.2f} {one.source:12s} climbing {one.climbing_m_per_km:.1f} "
                    f"{one.climbing_off_m_per_km:+.2f} m/km time {one.time_off_pct:+.2f} %"
                )
    return "\n".join(lines)


if __name__ == "__main__":
    chosen = TUNING_SEEDS if "--tuning" in sys.argv else TEST_SEEDS
    print(table(chosen))
    print("\nsum of gradient errors over the roads, %    ours  window  spline")
    for kind in KINDS:
        print(f"{kind:42s}", *(f"{total:7.2f}" for total in beside(kind, chosen[0])))
