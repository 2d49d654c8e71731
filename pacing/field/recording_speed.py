"""Speed of a ride: from the sensor, brought to true scale by the positions, or from positions."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.field.recording import Recording
from pacing.field.recording_place import Places

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

SENSOR_SHARE = 0.7
FAST_ENOUGH_M_S = 3.0
STRAIGHT_DEG = 8.0
PIECE_M = 500.0
FEWEST_PIECES = 4
WORTH_CORRECTING = 0.003
MOST_SCALE = 0.25
UNCHECKED_SE = 0.005
"""Relative error of a wheel sensor's scale that no position could check (common practice)."""
LEAST_SE = 0.002


@dataclass(frozen=True)
class Speed:
    """Speed (n,) [m/s] and way since the start (n,) [m] at the samples; NaN where unknown.

    ``scale`` is what the sensor's speed was multiplied by, ``scale_se`` the relative standard
    error that remains. ``source`` is "sensor", "distance" or "position".
    """

    m_s: Array
    travelled_m: Array
    scale: float
    scale_se: float
    source: str
    notes: tuple[str, ...] = ()


def speed_of(recording: Recording, places: Places, short: Flags) -> Speed:
    """Speed at every sample; ``short`` (n−1,) are the steps that are no gap."""
    time = recording.time_s
    sensor = recording.speed_m_s
    if np.isfinite(sensor).mean() >= SENSOR_SHARE:
        return _scaled(time, sensor, places, short)
    if np.isfinite(recording.distance_m).mean() >= SENSOR_SHARE:
        way = np.diff(recording.distance_m)
        way = np.where(way < 0.0, np.nan, way)
        source = "distance"
    else:
        way, source = places.step_m, "position"
    speed = _from_way(time, np.where(short, way, np.nan))
    if source == "distance":
        found = _scaled(time, speed, places, short)
        return Speed(found.m_s, found.travelled_m, found.scale, found.scale_se, source, found.notes)
    said = ("no speed recorded: taken from the positions",)
    return Speed(speed, _travelled(time, speed, places, short), 1.0, LEAST_SE, source, said)


def _scaled(time: Array, sensor: Array, places: Places, short: Flags) -> Speed:
    """A sensor's speed with its scale error found from the positions and taken out."""
    found = _scale(time, sensor, places, short)
    notes: tuple[str, ...] = ()
    scale, error = 1.0, UNCHECKED_SE
    if found is not None:
        ratio, error = found
        off = abs(ratio - 1.0)
        if off > MOST_SCALE:
            said = f"recorded speed is {100 / ratio:.0f} % of what the positions say: not used"
            speed = _from_way(time, np.where(short, places.step_m, np.nan))
            travelled = _travelled(time, speed, places, short)
            return Speed(speed, travelled, 1.0, LEAST_SE, "position", (said,))
        if off > max(WORTH_CORRECTING, 2.0 * error):
            scale = ratio
            word = "too low" if ratio > 1.0 else "too high"
            notes = (f"recorded speed {100 * off:.1f} % {word} against the positions: corrected",)
    speed = scale * sensor
    travelled = _travelled(time, speed, places, short)
    return Speed(speed, travelled, scale, max(error, LEAST_SE), "sensor", notes)


def _scale(time: Array, sensor: Array, places: Places, short: Flags) -> tuple[float, float] | None:
    """Way by position over way by sensor, and its relative standard error.

    From straight, quick stretches of half a kilometre each: their median is proof against a few
    bad positions. Three samples a step keep the noise of positions from lengthening the way.
    """
    if not places.placed:
        return None
    three = 3
    first = np.arange(0, time.size - three, three)
    last = first + three
    broken = np.concatenate([[0], np.cumsum(~short)])
    unbroken = broken[first] == broken[last]
    chord = np.hypot(
        places.east_m[last] - places.east_m[first], places.north_m[last] - places.north_m[first]
    )
    turn = np.abs((places.heading_deg[last] - places.heading_deg[first] + 180.0) % 360.0 - 180.0)
    slowest = np.minimum.reduce([sensor[first + k] for k in range(three + 1)])
    way = _integral(time, sensor)
    by_sensor = way[last] - way[first]
    with np.errstate(invalid="ignore"):
        good = unbroken & (turn < STRAIGHT_DEG) & (slowest > FAST_ENOUGH_M_S) & np.isfinite(chord)
        good &= np.abs(chord - by_sensor) < 0.5 * by_sensor + 5.0
    if not good.any():
        return None
    piece = np.floor(np.cumsum(by_sensor[good]) / PIECE_M).astype(int)
    long = np.bincount(piece, by_sensor[good])
    ratio = np.bincount(piece, chord[good])[long > 0.5 * PIECE_M] / long[long > 0.5 * PIECE_M]
    if ratio.size < FEWEST_PIECES:
        return None
    middle = float(np.median(ratio))
    spread = 1.4826 * float(np.median(np.abs(ratio - middle)))
    return middle, 1.25 * spread / float(np.sqrt(ratio.size))


def _integral(time: Array, speed: Array) -> Array:
    """Way (n,) by trapezoids; unknown speed counts as none."""
    known = np.nan_to_num(speed)
    steps = 0.5 * (known[1:] + known[:-1]) * np.diff(time)
    return np.concatenate([[0.0], np.cumsum(steps)])


def _travelled(time: Array, speed: Array, places: Places, short: Flags) -> Array:
    """Way since the start: speed over time, and across gaps the straight between positions."""
    steps = np.diff(_integral(time, speed))
    straight = np.hypot(np.diff(places.east_m), np.diff(places.north_m))
    steps = np.where(short, steps, np.nan_to_num(straight))
    return np.concatenate([[0.0], np.cumsum(steps)])


def _from_way(time: Array, way: Array) -> Array:
    """Speed (n,) from the way of each step (n−1,), over two samples to either side within runs."""
    known = np.isfinite(way)
    total = np.concatenate([[0.0], np.cumsum(np.where(known, way, 0.0))])
    at = np.arange(time.size)
    run = np.concatenate([[0], np.cumsum(~known)])
    first = np.searchsorted(run, run, side="left")
    last = np.searchsorted(run, run, side="right") - 1
    before, after = np.maximum(at - 2, first), np.minimum(at + 2, last)
    lasted = time[after] - time[before]
    moved = total[after] - total[before]
    return np.where(lasted > 0.0, moved / np.maximum(lasted, 1e-9), np.nan)
