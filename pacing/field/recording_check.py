"""What in a recording can be believed: gaps, stops, dropped power, spikes, jumps, scale.

Everything found is masked with its reason; nothing is filled in.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.field.recording import Masked, Recording
from pacing.field.recording_drift import Drift, height_drift
from pacing.field.recording_place import Places, places_of
from pacing.field.recording_speed import Speed, speed_of

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

LONGEST_STEP_S = 3.0
STOPPED_M_S = 1.0
SPIKE_W, SPIKE_RATIO = 600.0, 2.5
DROPPED_S, PEDALLING_RPM = 4.0, 40.0
STUCK_S = 10.0
JUMP_M, JUMP_PER_M = 2.0, 0.25
MOST_LISTED = 400


@dataclass(frozen=True)
class Ride:
    """A recording with what can be believed of it.

    At the samples (n,): ``time_s``, ``speed_m_s`` (scale corrected), ``travelled_m``,
    ``power_w`` (NaN where masked), ``height_m``, ``heading_deg``, ``east_m`` and ``north_m`` of
    the start (NaN where unknown), ``stopped``. Per step between samples (n−1,): ``whole`` where
    everything that an energy balance needs was measured. ``has_heights`` and ``placed`` tell
    whether heights and positions were recorded for most of it.
    """

    recording: Recording
    time_s: Array
    power_w: Array
    speed_m_s: Array
    travelled_m: Array
    height_m: Array
    heading_deg: Array
    east_m: Array
    north_m: Array
    stopped: Flags
    whole: Flags
    has_heights: bool
    placed: bool
    speed: Speed
    drift: Drift | None
    masked: tuple[Masked, ...]
    notes: tuple[str, ...]

    @property
    def moving_s(self) -> float:
        """Time in motion: steps that are neither a stop nor a gap."""
        step = np.diff(self.time_s)
        return float(step[moving_steps(self)].sum())


def moving_steps(ride: Ride) -> Flags:
    """Steps (n−1,) ridden without a stop or a gap in the recording."""
    short = np.diff(ride.time_s) <= longest_step_s(ride.time_s)
    return short & ~(ride.stopped[1:] & ride.stopped[:-1])


def longest_step_s(time_s: Array) -> float:
    """The longest step between samples (n,) that is not a gap."""
    return max(LONGEST_STEP_S, 2.5 * float(np.median(np.diff(time_s))))


def check(recording: Recording) -> Ride:
    """A recording with everything that cannot be believed masked, and said."""
    time = recording.time_s
    step_s = np.diff(time)
    short = step_s <= longest_step_s(time)
    places = places_of(recording)
    speed = speed_of(recording, places, short)
    stopped = np.isfinite(speed.m_s) & (speed.m_s < STOPPED_M_S)
    power, masked = _power(recording)
    height, has_heights, jumped = _heights(recording, speed.m_s, step_s)
    masked += _stops_and_gaps(time, short, stopped, places)
    masked += _runs(time, _steps_to_samples(jumped), "height jumps")
    masked += _runs(time, places.thrown, "position thrown off the road")
    known = np.isfinite(power) & np.isfinite(speed.m_s) & ~stopped
    if has_heights:
        known &= np.isfinite(height)
    if places.placed:
        known &= np.isfinite(places.heading_deg)
        masked += _runs(time, ~np.isfinite(places.heading_deg) & ~stopped, "no position")
    whole = short & ~jumped & known[1:] & known[:-1]
    drift = height_drift(time, places, height, step_s) if has_heights and places.placed else None
    notes = [*recording.notes, *speed.notes, *places.notes]
    if drift is not None:
        notes += drift.notes
    return Ride(
        recording=recording,
        time_s=time,
        power_w=power,
        speed_m_s=speed.m_s,
        travelled_m=speed.travelled_m,
        height_m=height,
        heading_deg=places.heading_deg,
        east_m=places.east_m,
        north_m=places.north_m,
        stopped=stopped,
        whole=whole,
        has_heights=has_heights,
        placed=places.placed,
        speed=speed,
        drift=drift,
        masked=tuple(sorted([*recording.masked, *masked], key=lambda m: (m.from_s, m.to_s))),
        notes=tuple(notes),
    )


def _power(recording: Recording) -> tuple[Array, list[Masked]]:
    """Power with what a meter cannot have meant made NaN."""
    time, power, cadence = recording.time_s, recording.power_w.copy(), recording.cadence_rpm
    masked = _runs(time, ~np.isfinite(power), "no power recorded")
    filled = np.nan_to_num(power)
    spike = _isolated(filled)
    masked += _runs(time, spike, "power spike")
    still = np.isfinite(cadence) & (cadence < 1.0)
    stuck = _held(time, filled, STUCK_S) & (filled > 0.0) & still
    masked += _runs(time, stuck, "power stuck while not pedalling")
    turning = np.isfinite(cadence) & (cadence >= PEDALLING_RPM) & (filled == 0.0)
    moving_legs = turning & ~_held(time, np.nan_to_num(cadence), DROPPED_S)
    dropped = _longer(time, moving_legs & np.isfinite(power), DROPPED_S)
    masked += _runs(time, dropped, "power dropped out while pedalling")
    power[spike | stuck | dropped] = np.nan
    return power, masked


def _isolated(power: Array) -> Flags:
    """Up to two samples that tower above what stands two and three samples to either side."""
    padded = np.pad(power, 3, mode="edge")
    beside = np.maximum.reduce([np.roll(padded, k) for k in (-3, -2, 2, 3)])[3:-3]
    return np.asarray((power > beside + SPIKE_W) & (power > SPIKE_RATIO * beside))


def _heights(recording: Recording, speed: Array, step_s: Array) -> tuple[Array, bool, Flags]:
    """Heights, whether there are any, and the steps at which they jump."""
    height = recording.elevation_m
    has = bool(np.isfinite(height).mean() > 0.5)
    if not has:
        return np.full_like(height, np.nan), False, np.zeros(step_s.size, dtype=bool)
    rise = np.abs(np.diff(np.nan_to_num(height)))
    way = np.nan_to_num(0.5 * (speed[1:] + speed[:-1])) * step_s
    known = np.isfinite(height[1:]) & np.isfinite(height[:-1])
    return height, True, known & (rise > JUMP_M + JUMP_PER_M * way)


def _stops_and_gaps(time: Array, short: Flags, stopped: Flags, places: Places) -> list[Masked]:
    masked = _runs(time, stopped, "stop")
    for i in np.flatnonzero(~short)[:MOST_LISTED].tolist():
        moved = float(
            np.hypot(
                places.east_m[i + 1] - places.east_m[i], places.north_m[i + 1] - places.north_m[i]
            )
        )
        lasted = float(time[i + 1] - time[i])
        paused = np.isfinite(moved) and moved < STOPPED_M_S * lasted
        why = "stop, recorder paused" if paused else "gap in the recording"
        masked.append(Masked(float(time[i]), float(time[i + 1]), why))
    return masked


def _steps_to_samples(steps: Flags) -> Flags:
    return np.asarray(np.concatenate([[False], steps]) | np.concatenate([steps, [False]]))


def _edges(flags: Flags) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """First and last index of each run of flags that are set."""
    change = np.diff(np.concatenate([[0], flags.astype(np.int8), [0]]))
    return np.flatnonzero(change == 1), np.flatnonzero(change == -1) - 1


def _runs(time: Array, flags: Flags, why: str) -> list[Masked]:
    first, last = _edges(flags)
    pairs = list(zip(first.tolist(), last.tolist(), strict=True))[:MOST_LISTED]
    return [Masked(float(time[a]), float(time[b]), why) for a, b in pairs]


def _longer(time: Array, flags: Flags, least_s: float) -> Flags:
    """Only the runs of flags that last at least ``least_s``."""
    kept = np.zeros_like(flags)
    for a, b in zip(*_edges(flags), strict=True):
        if time[b] - time[a] >= least_s:
            kept[a : b + 1] = True
    return kept


def _held(time: Array, values: Array, least_s: float) -> Flags:
    """Samples within a run of one value that lasts at least ``least_s``."""
    same = np.concatenate([[False], np.diff(values) == 0.0])
    held = np.zeros(values.size, dtype=bool)
    for a, b in zip(*_edges(same), strict=True):
        if time[b] - time[a - 1] >= least_s:
            held[a - 1 : b + 1] = True
    return held
