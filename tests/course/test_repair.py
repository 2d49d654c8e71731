"""Each kind of damage, put into a sound line on purpose, is found, mended and told.

The truth is the line before the damage; distances are checked with pyproj.
"""

from __future__ import annotations

import numpy as np
import pytest
from pyproj import Geod

from pacing.course.missing import refuse_missing_heights
from pacing.course.repair import repair
from pacing.course.track import Track, joined

GEOD = Geod(ellps="WGS84")


def line(count=400, spacing_m=10.0, seed=3, **other):
    """A winding road of points ``spacing_m`` apart with rolling heights."""
    random = np.random.default_rng(seed)
    heading = np.cumsum(random.normal(0.0, 4.0, count - 1)) + 40.0
    lat, lon = [54.0], [-1.0]
    for azimuth in heading:
        lon_2, lat_2, _ = GEOD.fwd(lon[-1], lat[-1], azimuth, spacing_m)
        lat.append(lat_2)
        lon.append(lon_2)
    way = spacing_m * np.arange(count)
    return Track(
        name="made",
        lat_deg=np.array(lat),
        lon_deg=np.array(lon),
        elevation_m=120.0 + 30.0 * np.sin(way / 400.0),
        time_s=None,
        segment=np.zeros(count, dtype=np.int64),
        **other,
    )


def with_points(track, at, lat, lon, elevation_m):
    """The track with points put in before index ``at``."""
    return Track(
        name=track.name,
        lat_deg=np.insert(track.lat_deg, at, lat),
        lon_deg=np.insert(track.lon_deg, at, lon),
        elevation_m=np.insert(track.elevation_m, at, elevation_m),
        time_s=None,
        segment=np.insert(track.segment, at, 0),
    )


def same_line(track, truth):
    assert track.lat_deg == pytest.approx(truth.lat_deg, abs=1e-9)
    assert track.lon_deg == pytest.approx(truth.lon_deg, abs=1e-9)


def test_a_sound_line_is_left_as_it_is():
    truth = line()
    mended, repairs = repair(truth)
    same_line(mended, truth)
    assert np.array_equal(mended.elevation_m, truth.elevation_m)
    assert repairs == ()


def test_repeated_points_are_merged_and_their_heights_averaged():
    truth = line()
    doubled = with_points(truth, 100, truth.lat_deg[100], truth.lon_deg[100], 200.0)
    mended, repairs = repair(doubled)
    same_line(mended, truth)
    assert mended.elevation_m[100] == pytest.approx((200.0 + truth.elevation_m[100]) / 2)
    (told,) = repairs
    assert (told.what, told.amount) == ("repeated points merged", "1 point")
    assert told.from_km == pytest.approx(1.0, abs=1e-3)


def test_a_point_thrown_far_off_goes_and_is_told_with_its_distance():
    truth = line()
    lon, lat, _ = GEOD.fwd(truth.lon_deg[200], truth.lat_deg[200], 10.0, 4200.0)
    mended, repairs = repair(with_points(truth, 201, lat, lon, 0.0))
    same_line(mended, truth)
    (told,) = repairs
    assert told.what == "points far off the line left out"
    assert told.amount == "1 point, up to 4.2 km off"
    assert told.from_km == pytest.approx(2.0, abs=0.011)


def test_several_points_thrown_to_one_far_place_all_go():
    truth = line()
    lon, lat, _ = GEOD.fwd(truth.lon_deg[200], truth.lat_deg[200], 10.0, 900.0)
    nearby = np.arange(8) * 1e-5
    damaged = with_points(truth, [201] * 8, lat + nearby, lon + nearby, np.full(8, 5.0))
    mended, repairs = repair(damaged)
    same_line(mended, truth)
    assert repairs[0].amount == "8 points, up to 0.9 km off"


@pytest.mark.parametrize("at", [0, 400])
def test_a_lone_first_or_last_point_in_another_town_goes(at):
    truth = line()
    mended, repairs = repair(with_points(truth, at, 54.5, -1.5, 3.0))
    same_line(mended, truth)
    assert repairs[0].what == "points far off the line left out"


def test_a_point_thrown_off_near_the_start_does_not_take_the_start_with_it():
    truth = line()
    mended, repairs = repair(with_points(truth, 2, 0.0, -1.0, 3.0))
    same_line(mended, truth)
    assert repairs[0].amount.startswith("1 point, up to")


def test_a_gap_after_the_first_points_is_told():
    truth = line()
    keep = np.ones(400, dtype=bool)
    keep[3:90] = False
    _, (told,) = repair(truth.kept(keep))
    assert told.what == "gap bridged by a straight line"


def test_a_dead_turn_is_no_outlier():
    out = line(200)
    back = Track(
        name="there and back",
        lat_deg=np.concatenate([out.lat_deg, out.lat_deg[-2::-1]]),
        lon_deg=np.concatenate([out.lon_deg, out.lon_deg[-2::-1]]),
        elevation_m=np.concatenate([out.elevation_m, out.elevation_m[-2::-1]]),
        time_s=None,
        segment=np.zeros(399, dtype=np.int64),
    )
    mended, repairs = repair(back)
    same_line(mended, back)
    assert repairs == ()


def test_a_dead_turn_on_a_route_of_few_points_is_no_outlier():
    lat = np.array([54.0, 54.01, 54.03, 54.04, 54.03, 54.01, 54.0])
    route = Track(
        name="few",
        lat_deg=lat,
        lon_deg=np.full(7, -1.0),
        elevation_m=np.full(7, 10.0),
        time_s=None,
        segment=np.zeros(7, dtype=np.int64),
    )
    mended, repairs = repair(route)
    same_line(mended, route)
    assert repairs == ()


def test_wandering_at_a_standstill_becomes_one_point():
    truth = line()
    random = np.random.default_rng(5)
    wander = 120
    lat = truth.lat_deg[150] + random.normal(0.0, 2.5, wander) / 111_000.0
    lon = truth.lon_deg[150] + random.normal(0.0, 2.5, wander) / 65_000.0
    heights = np.full(wander, truth.elevation_m[150])
    damaged = with_points(truth, [151] * wander, lat, lon, heights)
    mended, repairs = repair(damaged)
    _, _, step = GEOD.inv(
        mended.lon_deg[:-1], mended.lat_deg[:-1], mended.lon_deg[1:], mended.lat_deg[1:]
    )
    assert step.sum() == pytest.approx(3990.0, abs=15.0)
    assert repairs[0].what == "wandering at a standstill made one point"
    assert repairs[0].from_km == pytest.approx(1.5, abs=0.03)


def test_switchbacks_and_a_roundabout_are_no_standstill():
    angle = np.radians(np.arange(0.0, 360.0, 20.0))
    x = np.concatenate([np.arange(-200.0, -15.0, 5.0), -15.0 * np.cos(angle)])
    y = np.concatenate([np.zeros(37), 15.0 * np.sin(angle)])
    for n in range(8):
        leg = np.arange(0.0, 60.0, 5.0)
        x = np.concatenate([x, leg if n % 2 == 0 else 60.0 - leg])
        y = np.concatenate([y, np.full(12, 40.0 + 8.0 * n)])
    track = Track(
        name="bends",
        lat_deg=46.0 + y / 111_150.0,
        lon_deg=8.0 + x / 77_500.0,
        elevation_m=np.full(len(x), 700.0),
        time_s=None,
        segment=np.zeros(len(x), dtype=np.int64),
    )
    mended, repairs = repair(track)
    same_line(mended, track)
    assert repairs == ()


def test_a_gap_is_told_with_its_place_and_size():
    truth = line()
    keep = np.ones(400, dtype=bool)
    keep[101:160] = False
    _, (told,) = repair(truth.kept(keep))
    assert told.what == "gap bridged by a straight line"
    _, _, gap = GEOD.inv(
        truth.lon_deg[100], truth.lat_deg[100], truth.lon_deg[160], truth.lat_deg[160]
    )
    assert told.amount == f"{gap:.0f} m"
    assert told.from_km == pytest.approx(1.0, abs=1e-3)
    assert told.to_km == pytest.approx(1.0 + gap / 1000.0, abs=1e-3)


def test_joined_segments_are_told_once():
    truth = line()
    parts = [truth.kept(np.arange(0, 150)), truth.kept(np.arange(150, 400))]
    mended, (told,) = repair(joined(parts, "both"))
    same_line(mended, truth)
    assert (told.what, told.amount) == ("segments joined", "2 segments, up to 10 m apart")


def _with_heights(change):
    track = line()
    heights = track.elevation_m.copy()
    change(heights)
    return Track(
        name=track.name,
        lat_deg=track.lat_deg,
        lon_deg=track.lon_deg,
        elevation_m=heights,
        time_s=None,
        segment=track.segment,
    )


def test_heights_of_zero_amid_hills_are_missing_ones():
    def zeros(heights):
        heights[50:60] = 0.0
        heights[-3:] = 0.0

    mended, repairs = repair(_with_heights(zeros))
    assert np.flatnonzero(np.isnan(mended.elevation_m)).tolist() == [*range(50, 60), 397, 398, 399]
    assert repairs[0].what == "heights of 0 m taken as missing"
    assert repairs[0].amount == "13 points"


def test_a_road_that_comes_down_to_the_sea_keeps_its_zeros():
    def shore(heights):
        heights[:] = np.maximum(np.abs(np.arange(400) - 200.0) * 0.4 - 10.0, 0.0)

    mended, repairs = repair(_with_heights(shore))
    assert repairs == ()
    assert np.isfinite(mended.elevation_m).all()


@pytest.mark.parametrize("wild", [-32768.0, -9999.0, 65535.0, np.inf])
def test_heights_no_road_has_are_missing_ones(wild):
    def spoil(heights):
        heights[[10, 20]] = wild

    mended, repairs = repair(_with_heights(spoil))
    assert np.flatnonzero(np.isnan(mended.elevation_m)).tolist() == [10, 20]
    assert repairs[0].what == "heights outside -450 to 6000 m taken as missing"


def test_missing_heights_are_told_with_share_and_longest_stretch():
    def take(heights):
        heights[100:120] = np.nan

    mended, (told,) = repair(_with_heights(take))
    # From the known point before to the known point after: 21 steps of 10 m of 3,990.
    assert (told.what, told.amount) == (
        "missing heights interpolated",
        "5 % of the way, 210 m at a stretch",
    )
    assert refuse_missing_heights(mended, "f") is None


@pytest.mark.parametrize(
    ("gone", "found"),
    [
        (slice(0, 110), "no heights on 28 % of the way, 1.1 km at a stretch"),
        (slice(0, 400), "no heights at all"),
    ],
)
def test_too_many_missing_heights_are_refused(gone, found):
    def take(heights):
        heights[gone] = np.nan

    mended, _ = repair(_with_heights(take))
    assert refuse_missing_heights(mended, "f").found == found


def test_repairs_are_the_same_across_the_180th_meridian():
    truth = line(spacing_m=11.0)  # not the radius of a standstill, where rounding decides
    random = np.random.default_rng(5)
    wander = 60
    lat = truth.lat_deg[150] + random.normal(0.0, 2.5, wander) / 111_000.0
    lon = truth.lon_deg[150] + random.normal(0.0, 2.5, wander) / 65_000.0
    damaged = with_points(truth, [151] * wander, lat, lon, np.full(wander, 100.0))
    shift = 180.0 - damaged.lon_deg[150]
    moved = Track(
        name="moved",
        lat_deg=damaged.lat_deg,
        lon_deg=(damaged.lon_deg + shift + 180.0) % 360.0 - 180.0,
        elevation_m=damaged.elevation_m,
        time_s=None,
        segment=damaged.segment,
    )
    here, told_here = repair(damaged)
    there, told_there = repair(moved)
    assert [r.amount for r in told_here] == [r.amount for r in told_there]
    turned = (there.lon_deg - here.lon_deg - shift + 180.0) % 360.0 - 180.0
    assert np.max(np.abs(turned)) < 1e-9
