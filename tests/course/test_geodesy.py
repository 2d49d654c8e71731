"""Distances and headings against an independent geodesic library (GeographicLib, by pyproj)."""

from __future__ import annotations

import numpy as np
import pytest
from pyproj import Geod

from pacing.course.geodesy import (
    along_m,
    distance_between_m,
    distances_m,
    ecef_m,
    headings_deg,
    unwrapped_deg,
    wrapped_deg,
)

GEOD = Geod(ellps="WGS84")


def _pairs(length_m: float, lowest_deg: float, highest_deg: float):
    """Random points, and those ``length_m`` further in a random direction, interleaved."""
    random = np.random.default_rng(7)
    count = 500
    lat = random.uniform(lowest_deg, highest_deg, count)
    lon = random.uniform(-180.0, 180.0, count)
    azimuth = random.uniform(0.0, 360.0, count)
    lon_2, lat_2, _ = GEOD.fwd(lon, lat, azimuth, np.full(count, length_m))
    middle_lon, middle_lat, _ = GEOD.fwd(lon, lat, azimuth, np.full(count, length_m / 2))
    middle_azimuth, _, _ = GEOD.inv(middle_lon, middle_lat, lon_2, lat_2)
    return (
        np.stack([lat, lat_2], axis=1).ravel(),
        np.stack([lon, lon_2], axis=1).ravel(),
        middle_azimuth % 360.0,
    )


@pytest.mark.parametrize("zone", [(-60.0, 60.0), (60.0, 85.0), (-89.9, -85.0)])
@pytest.mark.parametrize("length_m", [1.0, 10.0, 1_000.0, 100_000.0])
def test_distances_agree_with_a_geodesic_library(length_m, zone):
    lat, lon, _ = _pairs(length_m, *zone)
    # Earth-centred coordinates carry a rounding of 1e-9 m.
    assert distances_m(lat, lon)[::2] == pytest.approx(length_m, rel=1e-9, abs=5e-9)


@pytest.mark.parametrize("zone", [(-60.0, 60.0), (60.0, 85.0), (-89.9, -85.0)])
@pytest.mark.parametrize("length_m", [10.0, 1_000.0, 100_000.0])
def test_headings_agree_with_a_geodesic_library(length_m, zone):
    lat, lon, azimuth = _pairs(length_m, *zone)
    turn = (headings_deg(lat, lon)[::2] - azimuth + 180.0) % 360.0 - 180.0
    assert np.max(np.abs(turn)) < 2e-5


def test_the_way_over_the_180th_meridian_is_the_short_one():
    lat, lon = np.array([-17.0, -17.0]), np.array([179.9995, -179.9995])
    _, _, expected = GEOD.inv(lon[0], lat[0], lon[1], lat[1])
    assert distances_m(lat, lon)[0] == pytest.approx(expected, rel=1e-9)
    assert headings_deg(lat, lon)[0] == pytest.approx(90.0, abs=1e-3)


def test_a_step_to_the_same_place_has_no_length():
    assert distances_m(np.array([10.0, 10.0]), np.array([20.0, 20.0]))[0] == 0.0


def test_earth_centred_coordinates_are_those_of_the_transformation_library():
    from pyproj import Transformer

    lat, lon = np.array([0.0, 45.0, -89.0]), np.array([0.0, 170.0, -120.0])
    to_centred = Transformer.from_crs("EPSG:4979", "EPSG:4978")
    expected = np.stack(to_centred.transform(lat, lon, np.zeros(3)), axis=-1)
    assert ecef_m(lat, lon) == pytest.approx(expected, abs=1e-6)


def test_distance_along_a_line_sums_its_steps():
    lat, lon = np.array([50.0, 50.01, 50.02]), np.array([7.0, 7.01, 7.0])
    _, _, steps = GEOD.inv(lon[:-1], lat[:-1], lon[1:], lat[1:])
    assert along_m(lat, lon) == pytest.approx([0.0, steps[0], steps.sum()], rel=1e-9)
    assert distance_between_m(50.0, 7.0, 50.01, 7.01) == pytest.approx(steps[0], rel=1e-9)


def test_longitudes_unwrapped_for_interpolation_wrap_back_to_themselves():
    lon = np.array([179.0, -179.5, -178.0, 179.9])
    unwrapped = unwrapped_deg(lon)
    assert np.max(np.abs(np.diff(unwrapped))) < 10.0
    assert wrapped_deg(unwrapped) == pytest.approx(lon)
