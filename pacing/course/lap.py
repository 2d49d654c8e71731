"""One lap of the road as it is ridden: turned round, cut to a part, closed, rescaled, gridded."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Bend
from pacing.course.geodesy import distance_between_m, steps, unwrapped_deg, wrapped_deg
from pacing.errors import UnusableInputError

Array = NDArray[np.float64]

CLOSED_WITHIN_M = 100.0
"""A lap whose ends are nearer than this is closed by a straight link; a wider one is no lap."""


@dataclass(frozen=True)
class Lap:
    """The smoothed road at nodes (M+1,): horizontal distance from 0, position, height.

    ``lon_deg`` is continuous over the 180th meridian. ``bends`` lie along ``road_m``.
    ``raw_distance_m`` and ``raw_elevation_m`` (K,) are the heights of the file along ``road_m``.
    ``scale`` is official over measured distance.
    """

    run_m: Array
    lat_deg: Array
    lon_deg: Array
    elevation_m: Array
    raw_distance_m: Array
    raw_elevation_m: Array
    bends: tuple[Bend, ...] = ()
    scale: float = 1.0

    @property
    def road_m(self) -> Array:
        """Road distance (M+1,) [m] from the start of the lap, rise included."""
        steps_m = np.hypot(np.diff(self.run_m), np.diff(self.elevation_m))
        return self.scale * np.concatenate([[0.0], np.cumsum(steps_m)])

    @property
    def length_m(self) -> float:
        """Road length of the lap [m]."""
        return float(self.road_m[-1])


def turned_round(lap: Lap) -> Lap:
    """The lap ridden the other way; twice is the identity."""
    length = lap.length_m
    return replace(
        lap,
        run_m=(lap.run_m[-1] - lap.run_m)[::-1],
        lat_deg=lap.lat_deg[::-1],
        lon_deg=lap.lon_deg[::-1],
        elevation_m=lap.elevation_m[::-1],
        bends=tuple(
            replace(bend, at_m=length - bend.at_m, turn_deg=-bend.turn_deg)
            for bend in reversed(lap.bends)
        ),
        raw_distance_m=(length - lap.raw_distance_m)[::-1],
        raw_elevation_m=lap.raw_elevation_m[::-1],
    )


def part_of(lap: Lap, from_m: float | None, to_m: float | None) -> Lap:
    """The lap from one road distance to another; what lies outside is left out.

    Raises UnusableInputError where the bounds are not in order within the lap.
    """
    if from_m is None and to_m is None:
        return lap
    length = lap.length_m
    start, end = (0.0 if from_m is None else from_m), (length if to_m is None else to_m)
    # A course is often said to end at its rounded length.
    end = length if length < end <= length + 50.0 else end
    for key, at in (("course.from_km", start), ("course.to_km", end)):
        if not 0.0 <= at <= length:
            raise UnusableInputError(
                f"{at / 1000:g}",
                key=key,
                expected=f"a place on the lap, 0 to {length / 1000:.2f} km",
            )
    if end - start < 100.0:
        raise UnusableInputError(
            f"{start / 1000:g} to {end / 1000:g} km",
            key="course.from_km, course.to_km",
            expected="a part of at least 0.1 km, its start before its end",
        )
    road = lap.road_m
    inside = (road > start) & (road < end)
    ends = np.array([start, end])

    def cut(values: Array) -> Array:
        first, last = np.interp(ends, road, values)
        return np.concatenate([[first], values[inside], [last]])

    run = cut(lap.run_m)
    raw = (lap.raw_distance_m >= start) & (lap.raw_distance_m <= end)
    return replace(
        lap,
        run_m=run - run[0],
        lat_deg=cut(lap.lat_deg),
        lon_deg=cut(lap.lon_deg),
        elevation_m=cut(lap.elevation_m),
        bends=tuple(replace(b, at_m=b.at_m - start) for b in lap.bends if start < b.at_m < end),
        raw_distance_m=lap.raw_distance_m[raw] - start,
        raw_elevation_m=lap.raw_elevation_m[raw],
    )


def closed_up(lap: Lap) -> Lap:
    """The lap with its end brought to its start, in place and height, to be ridden again.

    Raises UnusableInputError where the ends are too far apart.
    """
    gap = distance_between_m(lap.lat_deg[-1], lap.lon_deg[-1], lap.lat_deg[0], lap.lon_deg[0])
    if gap > CLOSED_WITHIN_M:
        raise UnusableInputError(
            f"more than one lap of a course whose finish is {gap / 1000:.2f} km from its start",
            key="course.laps",
            expected=f"a closed course, its ends within {CLOSED_WITHIN_M:.0f} m",
            mend="cut one lap out with course.from_km and course.to_km, or set course.laps = 1",
        )
    if gap > 1.0:
        link = unwrapped_deg(np.array([lap.lon_deg[-1], lap.lon_deg[0]]))
        lap = replace(
            lap,
            run_m=np.append(lap.run_m, lap.run_m[-1] + gap),
            lat_deg=np.append(lap.lat_deg, lap.lat_deg[0]),
            lon_deg=np.append(lap.lon_deg, link[-1]),
            elevation_m=np.append(lap.elevation_m, lap.elevation_m[-1]),
        )
    drift = lap.elevation_m[-1] - lap.elevation_m[0]
    return replace(lap, elevation_m=lap.elevation_m - drift * lap.run_m / lap.run_m[-1])


def rescaled(lap: Lap, official_m: float | None) -> Lap:
    """The lap with its road distance stretched to the measured length of the course.

    Raises UnusableInputError where the two differ by more than a tenth.
    """
    if official_m is None:
        return lap
    length = lap.length_m
    if not 0.9 <= official_m / length <= 1.1:
        raise UnusableInputError(
            f"{official_m / 1000:g}",
            key="course.official_km",
            expected=f"within a tenth of the {length / 1000:.2f} km of one lap of the file",
            mend="give the measured length of one lap, or choose the part with course.from_km "
            "and course.to_km",
        )
    factor = official_m / length
    return replace(
        lap,
        scale=lap.scale * factor,
        bends=tuple(replace(b, at_m=b.at_m * factor) for b in lap.bends),
        raw_distance_m=lap.raw_distance_m * factor,
    )


@dataclass(frozen=True)
class Grid:
    """A lap on uniform cells of road: nodes (N+1,), gradient and heading per cell (N,)."""

    distance_m: Array
    lat_deg: Array
    lon_deg: Array
    elevation_m: Array
    gradient: Array
    heading_deg: Array


def on_grid(lap: Lap, cell_m: float) -> Grid:
    """Cut the lap into equal cells as near ``cell_m`` long as divides it, at least one."""
    road = lap.road_m
    count = max(1, round(road[-1] / cell_m))
    at = np.linspace(0.0, road[-1], count + 1)
    lat, lon, elevation = (
        np.interp(at, road, values) for values in (lap.lat_deg, lap.lon_deg, lap.elevation_m)
    )
    rise = np.diff(elevation)
    run = np.sqrt(np.maximum(np.diff(at) ** 2 - rise**2, 1e-12))
    return Grid(at, lat, wrapped_deg(lon), elevation, rise / run, _headings_deg(lat, lon))


def _headings_deg(lat_deg: Array, lon_deg: Array) -> Array:
    """Headings (N,) of the cells; where a turn folds a cell to nothing, that of the one before."""
    east, north = steps(lat_deg, lon_deg)
    length = np.hypot(east, north)
    heading = np.degrees(np.arctan2(east, north)) % 360.0
    sure = length > 0.05 * np.median(length)
    last_sure = np.maximum.accumulate(np.where(sure, np.arange(len(sure)), 0))
    return np.asarray(heading[last_sure])
