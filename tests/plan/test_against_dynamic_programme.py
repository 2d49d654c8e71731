"""The optimum against a dynamic programme over speed and W′ left, in which nothing has a slope.

Source: Bellman's principle on the numbers that a plan exports (tests/reference); Martin et al. 1998
for the motion, Skiba et al. 2015 for W′.
"""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from dynamic_programme import DynamicProgramme
from exported import Exported, read_exported

import pacing
from pacing.plan.frames import model_inputs, trace_frame
from pacing.plan.free import ride_free
from pacing.plan.prepare import prepare
from pacing.plan.solve import solve

RACE = """\
[course]
file = "hills.gpx"
[rider]
mass_kg = 72.0
critical_power_w = 300.0
w_prime_kj = 7.0
recovery_law = "skiba-2015"
[[rider.positions]]
name = "aero bars"
cda_m2 = 0.24
[bike]
mass_kg = 8.0
crr = 0.004
[air]
temperature_c = 15.0
pressure_hpa = 1013.0
wind_speed_m_s = 2.0
wind_from_deg = 10.0
[plan]
start_speed_m_s = 8.0
reserve_kj = 1.0
max_power_w = 450.0
first_30_s_max_w = 450.0
"""


def _race(folder: Path) -> pacing.Race:
    """3 km due north over two hills of up to 6 %."""
    points = "".join(
        f'<trkpt lat="{45.0 + 10.0 * i / 111132.0:.8f}" lon="0.0">'
        f"<ele>{200.0 + 14.0 * math.sin(2 * math.pi * i / 150.0):.3f}</ele></trkpt>"
        for i in range(301)
    )
    gpx = '<gpx version="1.1" creator="a test" xmlns="http://www.topografix.com/GPX/1/1">'
    gpx += f"<trk><trkseg>{points}</trkseg></trk></gpx>"
    (folder / "hills.gpx").write_text(gpx, encoding="utf-8")
    (folder / "hills.toml").write_text(RACE, encoding="utf-8")
    return pacing.load_race(folder / "hills.toml")


def _ours_and_the_road(race: pacing.Race, per_piece: int) -> tuple[float, Exported]:
    """Our optimum with pieces of ``per_piece`` cells, and the road as exported."""
    prepared = prepare(race)
    problem = prepared.problem
    assert problem.cells % per_piece == 0
    starts = np.arange(0, problem.cells, per_piece, dtype=np.intp)
    free = ride_free(problem, prepared.constant).ride
    begin_w = np.add.reduceat(free.motion.power_w * free.motion.time_s, starts)
    begin_w /= np.add.reduceat(free.motion.time_s, starts)
    found = solve(problem, starts, begin_w).ride
    return found.motion.total_s, read_exported(trace_frame(race, found), model_inputs(race, found))


@pytest.mark.slow
def test_a_dynamic_programme_comes_down_to_the_same_time_as_its_grid_is_refined(
    tmp_path: Path,
) -> None:
    ours_s, road = _ours_and_the_road(_race(tmp_path), per_piece=10)
    rides = []
    for size in (12, 24, 48, 96):
        programme = DynamicProgramme(road, 10, speeds=size, balances=size, powers=size)
        time_s, _, least = programme.ride(programme.table())
        over = 100.0 * (time_s / ours_s - 1.0)
        print(f"  grid {size:3d}: {time_s:.3f} s, over our {ours_s:.3f} s by {over:+.4f} %")
        assert least >= road.reserve_j - 1e-6
        rides.append(time_s)
    # every one of these is a ride that keeps the reserve, so none may beat the optimum
    assert min(rides) > ours_s * (1.0 - 2e-5)
    assert rides[-1] < ours_s * (1.0 + 2e-4)
    assert rides[-1] - ours_s < 0.5 * (rides[0] - ours_s)
