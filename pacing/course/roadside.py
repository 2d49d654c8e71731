"""What the race file says of places along the road, brought to distances of the whole course."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from pacing.course.course import Bend, CourseSpec, Landmark, SlowPoint
from pacing.errors import UnusableInputError
from pacing.units import KMH_PER_M_S

Array = NDArray[np.float64]

SURFACES = {"smooth": 1.0, "average": 1.15, "coarse": 1.4}
"""What multiplies the tyre's rolling coefficient; common practice, no source."""

IGNORED_WITHIN_M = 100.0


def slow_points(spec: CourseSpec, lap_m: float) -> tuple[SlowPoint, ...]:
    """The slow points of every lap, in the order they are met.

    ``at_km`` counts along one lap and returns on each, or along the whole course where
    ``every_lap`` is false. Raises UnusableInputError for a place that is not on the road.
    """
    found = [
        SlowPoint(
            at_m=at,
            speed_m_s=float(entry["speed_kmh"]) / KMH_PER_M_S,
            length_m=float(entry.get("length_m", 15.0)),
            note=str(entry.get("note", "")),
        )
        for entry, at in _places("slow_points", spec.slow_points, spec.laps, lap_m)
    ]
    return tuple(sorted(found, key=lambda point: point.at_m))


def landmarks(spec: CourseSpec, lap_m: float) -> tuple[Landmark, ...]:
    """The landmarks of every lap, in the order they are met. Raises as ``slow_points`` does."""
    found = [
        Landmark(at_m=at, name=str(entry["name"]))
        for entry, at in _places("landmarks", spec.landmarks, spec.laps, lap_m)
    ]
    return tuple(sorted(found, key=lambda mark: mark.at_m))


def _places(
    key: str, entries: tuple[dict[str, Any], ...], laps: int, lap_m: float
) -> Iterator[tuple[dict[str, Any], float]]:
    for index, entry in enumerate(entries):
        every_lap = bool(entry.get("every_lap", True))
        at_m = 1000.0 * float(entry["at_km"])
        _check_place(f"course.{key}[{index}].at_km", at_m, lap_m if every_lap else laps * lap_m)
        for lap in range(laps if every_lap else 1):
            yield entry, at_m + lap * lap_m


def _check_place(key: str, at_m: float, end_m: float) -> None:
    if not 0.0 <= at_m <= end_m + 1.0:
        raise UnusableInputError(
            f"{at_m / 1000:g}", key=key, expected=f"a place on the road, 0 to {end_m / 1000:.2f} km"
        )


def stretch_factors(spec: CourseSpec, nodes_m: Array) -> tuple[Array, Array]:
    """Rolling factor and share of the wind in each cell (N,) of one lap with nodes (N+1,).

    A stretch's ``crr_factor`` replaces the surface's; a cell that a stretch covers in part takes
    the part. Where stretches overlap the later one holds. Raises UnusableInputError for an unknown
    surface and for a stretch off the road or without length.
    """
    if spec.surface not in SURFACES:
        raise UnusableInputError(
            f"'{spec.surface}'", key="course.surface", expected="one of " + ", ".join(SURFACES)
        )
    rolling = np.full(len(nodes_m) - 1, SURFACES[spec.surface])
    wind = np.ones(len(nodes_m) - 1)
    for index, entry in enumerate(spec.stretches):
        start, end = 1000.0 * float(entry["from_km"]), 1000.0 * float(entry["to_km"])
        key = f"course.stretches[{index}]"
        _check_place(f"{key}.from_km", start, float(nodes_m[-1]))
        _check_place(f"{key}.to_km", end, float(nodes_m[-1]))
        if end <= start:
            raise UnusableInputError(
                f"{start / 1000:g} to {end / 1000:g} km", key=key, expected="from_km below to_km"
            )
        covered = np.diff(np.clip(nodes_m, start, end)) / np.diff(nodes_m)
        if "crr_factor" in entry:
            rolling += covered * (float(entry["crr_factor"]) - rolling)
        if "wind_share" in entry:
            wind += covered * (float(entry["wind_share"]) - wind)
    return rolling, wind


def bends_kept(bends: tuple[Bend, ...], spec: CourseSpec, lap_m: float) -> tuple[Bend, ...]:
    """The bends of one lap without those the user ignores, each named by its kilometre.

    Raises UnusableInputError where no bend lies within ``IGNORED_WITHIN_M`` of the kilometre.
    """
    left = list(bends)
    for index, at_km in enumerate(spec.ignore_bends_km):
        key = f"course.ignore_bends[{index}]"
        _check_place(key, 1000.0 * at_km, lap_m)
        near = [b for b in bends if abs(b.at_m - 1000.0 * at_km) <= IGNORED_WITHIN_M]
        if not near:
            raise UnusableInputError(
                f"no bend near km {at_km:g}",
                key=key,
                expected=f"the kilometre of a bend, within {IGNORED_WITHIN_M:.0f} m",
                mend="`pacing course` lists the bends",
            )
        nearest = min(near, key=lambda bend: abs(bend.at_m - 1000.0 * at_km))
        left = [bend for bend in left if bend is not nearest]
    return tuple(left)
