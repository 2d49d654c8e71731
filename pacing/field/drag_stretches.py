"""What of a session is balanced: without brakes and walking pace, cut as the method asks."""

from __future__ import annotations

from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.ndimage import maximum_filter1d

from pacing.field.drag_segments import Segments, chains, even_segments, segments_between
from pacing.field.drag_session import Session
from pacing.field.recording import Masked
from pacing.race import Race
from pacing.units import GRAVITY_M_S2

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]

STEADY, BALANCE, COASTING = "steady runs", "energy balance", "coast-downs"
METHODS = (STEADY, BALANCE, COASTING)

SLOW_M_S = 2.5
BRAKING_M_S2 = 0.5
"""Slowing beyond what coasting explains by so much is the brake (common practice)."""
BRAKING_REACH = 3
IDLE_W, SLOWING_S, MOST_PEDALLED = 30.0, 20.0, 2
PIECE_S, LEAST_PIECE_S = 60.0, 25.0
LEAST_RUN_S, LONGEST_RUN_S = 30.0, 180.0
UNEVEN_M_S2, TURNING_DEG_S = 0.06, 4.0
PEDALLING_W = 20.0
COAST_W = 5.0
LEAST_COAST_S, LEAST_COAST_DROP_M_S = 8.0, 1.0
COAST_PIECE_S = 15.0
MOST_HEIGHT_SPREAD_M = 4.0
COASTING_SHARE, STEADY_SHARE = 0.2, 0.6
FEWEST = 4
MOST_LISTED = 400


class Stretches(NamedTuple):
    """Stretches to balance, how, and what was left out by ride, as `Masked` with a reason."""

    segments: Segments
    method: str
    masked: tuple[tuple[Masked, ...], ...]


def stretches_of(session: Session, race: Race, method: str | None = None) -> Stretches:
    """Cut a session for ``method``, by default the one that the ride itself suggests."""
    slow = session.speed_m_s < SLOW_M_S
    braking = _braking(session, race)
    usable = session.usable & ~slow & ~braking
    if method is None:
        method = method_for(session, usable)
    slowing = np.zeros_like(slow)
    if method != COASTING:
        slowing = usable & _slowing_down(session, slow | braking)
        usable &= ~slowing
    masked = _masked(session, {"braking": braking, "walking pace": slow, "slowing down": slowing})
    if method == COASTING:
        segments = coasts(session, usable)
    elif method == STEADY:
        segments = steady_runs(session, usable)
    else:
        segments = even_segments(session, usable, length_s=PIECE_S, least_s=LEAST_PIECE_S, reach=3)
    return Stretches(segments, method, masked)


def method_for(session: Session, usable: Flags) -> str:
    """Coast-downs or steady runs where most of a flat ride is such, else the energy balance."""
    if not _flat(session):
        return BALANCE
    moving_s = float(session.dt_s[session.speed_m_s > SLOW_M_S].sum())
    for name, found in (
        (COASTING, coasts(session, usable)),
        (STEADY, steady_runs(session, usable)),
    ):
        share = float(found.sums(session.dt_s).sum()) / max(moving_s, 1.0)
        least = COASTING_SHARE if name == COASTING else STEADY_SHARE
        if np.unique(found.run).size >= FEWEST and share >= least:
            return name
    return BALANCE


def _flat(session: Session) -> bool:
    """Whether recorded heights leave a plane by little; without heights it has to be."""
    known = np.isfinite(session.rise_m) & session.usable
    if not known.any():
        return True
    for number in range(len(session.rides)):
        ride = session.rides[number]
        height = ride.height_m[np.isfinite(ride.height_m)]
        if height.size and np.ptp(np.quantile(height, [0.05, 0.95])) > 2.5 * MOST_HEIGHT_SPREAD_M:
            return False
    return True


def _masked(session: Session, causes: dict[str, Flags]) -> tuple[tuple[Masked, ...], ...]:
    """For each ride what its reading masked and what is left out here, the first cause given."""
    left = session.usable.copy()
    listed: list[list[Masked]] = [list(ride.masked) for ride in session.rides]
    for why, flags in causes.items():
        for number, masks in enumerate(listed):
            masks += _listed(session, left & flags & (session.ride == number), why)
        left &= ~flags
    return tuple(
        tuple(sorted(masks, key=lambda mask: (mask.from_s, mask.to_s))) for masks in listed
    )


def _slowing_down(session: Session, trouble: Flags) -> Flags:
    """Freewheeling shortly before or after brakes or walking pace: the brakes may be on, gently."""
    trouble = trouble | (session.speed_m_s < SLOW_M_S)
    times = np.cumsum(session.dt_s)
    pedalled = np.cumsum(session.power_w > IDLE_W)
    near = np.zeros(times.size, dtype=bool)
    at = np.flatnonzero(trouble)
    if at.size == 0:
        return near
    here = np.arange(times.size)
    for side in (np.searchsorted(at, here), np.searchsorted(at, here, side="right") - 1):
        inside = (side >= 0) & (side < at.size)
        other = at[np.clip(side, 0, at.size - 1)]
        close = np.abs(times[other] - times) <= SLOWING_S
        near |= inside & close & (np.abs(pedalled[other] - pedalled) <= MOST_PEDALLED)
    return near & (session.power_w <= IDLE_W)


def _braking(session: Session, race: Race) -> Flags:
    """Steps slowed by more than air, tyres and slope with a large drag area would."""
    gain = _smooth(session.half_square, 3) / np.maximum(_smooth(session.way_m, 3), 0.5)
    rise = np.nan_to_num(session.rise_m)
    slope = _smooth(rise, 15) / np.maximum(_smooth(session.way_m, 15), 1.0)
    coasting = session.half_density_kg_m3 * 0.5 * (
        session.speed_m_s + 2.0
    ) ** 2 / race.mass_kg + GRAVITY_M_S2 * (0.008 + np.clip(slope, -0.3, 0.3))
    hard = -gain > np.maximum(coasting, 0.0) + BRAKING_M_S2
    hard &= session.power_w < 0.5 * race.rider.critical_power_w
    wide = maximum_filter1d(hard, 2 * BRAKING_REACH + 1, mode="constant")
    return np.asarray(wide & session.usable)


def steady_runs(session: Session, usable: Flags) -> Segments:
    """Runs at even speed and power on a straight; long ones in parts of up to three minutes.

    Source: martin-2006 (power over speed against speed squared gives drag area and Crr).
    """
    gain = np.abs(_smooth(session.half_square, 11)) / np.maximum(_smooth(session.way_m, 11), 1.0)
    turn = _turning(session)
    even = usable & (gain < UNEVEN_M_S2) & (turn < TURNING_DEG_S)
    even &= _smooth(session.power_w, 5) > PEDALLING_W
    return even_segments(session, even, length_s=LONGEST_RUN_S, least_s=LEAST_RUN_S, reach=2)


def coasts(session: Session, usable: Flags) -> Segments:
    """Parts of runs without pedalling in which speed falls, each a few seconds long."""
    idle = usable & (session.power_w <= COAST_W)
    times = np.concatenate([[0.0], np.cumsum(session.dt_s)])
    gains = np.concatenate([[0.0], np.cumsum(session.half_square)])
    starts, ends = [], []
    for a, b in zip(*chains(idle, session.first), strict=True):
        # The first second still holds the end of the last pedal stroke.
        a, b = a + 2, b - 1
        if b - a < 2 or times[b] - times[a] < LEAST_COAST_S:
            continue
        fast = float(session.speed_m_s[a])
        if gains[a] - gains[b] < LEAST_COAST_DROP_M_S * (fast - 0.5 * LEAST_COAST_DROP_M_S):
            continue
        count = max(2, round((times[b] - times[a]) / COAST_PIECE_S))
        nodes = a + np.searchsorted(times[a : b + 1], np.linspace(times[a], times[b], count + 1))
        nodes = np.unique(np.clip(nodes, a, b))
        starts.append(nodes[:-1])
        ends.append(nodes[1:])
    found = segments_between(starts, ends, 1)
    speed = np.append(session.speed_m_s, session.speed_m_s[-1:])
    middle = max(float(np.mean(speed[found.start])), 1.0) if len(found) else 1.0
    return replace(
        found, node_weight=np.column_stack([speed[found.start], speed[found.end]]) / middle
    )


def _turning(session: Session) -> Array:
    """Rate of turn [deg/s] at each step."""
    heading = np.unwrap(np.arctan2(session.sine, session.cosine))
    change = np.abs(np.gradient(heading)) if heading.size > 1 else np.zeros(heading.size)
    return np.degrees(_smooth(change, 5)) / np.maximum(_smooth(session.dt_s, 5), 1e-3)


def _smooth(values: Array, wide: int) -> Array:
    """Running mean over ``wide`` steps."""
    padded = np.pad(values, wide // 2, mode="edge")
    return np.convolve(padded, np.ones(wide) / wide, mode="valid")


def _listed(session: Session, flags: Flags, why: str) -> list[Masked]:
    change = np.diff(np.concatenate([[0], flags.astype(np.int8), [0]]))
    first, last = np.flatnonzero(change == 1), np.flatnonzero(change == -1) - 1
    return [
        Masked(float(session.from_s[a]), float(session.from_s[b] + session.dt_s[b]), why)
        for a, b in list(zip(first.tolist(), last.tolist(), strict=True))[:MOST_LISTED]
    ]
