"""What was ridden, cell by cell of the course: time, stops, power, speed, W′ left."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from pacing.field.debrief_match import Matched
from pacing.field.recording import Masked
from pacing.field.recording_check import Ride, longest_step_s
from pacing.plan.balance import balance_at_nodes
from pacing.race import Race
from pacing.rider.budget import recovery_law

Array = NDArray[np.float64]
Index = NDArray[np.intp]

BRIDGED_S = 10.0
STANDING_M, STANDING_M_S = 15.0, 1.0


@dataclass(frozen=True)
class Ridden:
    """The part of the course that was ridden: M cells between M + 1 nodes from ``first`` on.

    Per cell (M,): ``time_s`` with ``stop_s`` of it standing, ``power_w`` true mean power while
    moving. At nodes (M+1,): ``clock_s`` of the recording, ``speed_m_s``, ``balance_j`` W′ left,
    below 0 where critical power and W′ say that it could not be done.
    ``guessed_s`` is for how long no power was recorded while moving.
    """

    first: int
    time_s: Array
    stop_s: Array
    power_w: Array
    clock_s: Array
    speed_m_s: Array
    balance_j: Array
    guessed_s: float
    masked: tuple[Masked, ...]

    @property
    def cells(self) -> slice:
        """The cells of the course."""
        return slice(self.first, self.first + self.time_s.size)

    @property
    def moving_s(self) -> float:
        """Time without stops."""
        return float(self.time_s.sum() - self.stop_s.sum())


def ridden_cells(
    ride: Ride, matched: Matched, race: Race, *, critical_power_w: float, share: Array
) -> Ridden:
    """Bring a matched ride to the cells of the course.

    ``critical_power_w`` and ``share`` (N,), the power share of the position in every cell of the
    course, decide W′. Where power is missing while moving it is bridged between its neighbours,
    over long holes by the ride's mean, and told.
    """
    nodes = slice(matched.from_node, matched.to_node + 1)
    clock = matched.node_s[nodes]
    moving = _moving_s(ride)
    power, masked, guessed = _filled_power(ride, clock[0], clock[-1], moving)
    power = power * race.rider.power_meter_factor
    clock = _moving_first(ride, clock, moving)
    # Each step is ridden first and stood at its end, so that a stop lies at one place.
    knots = np.concatenate([ride.time_s[:1], ride.time_s[1:]])
    ridden_to = ride.time_s[:-1] + moving
    at = np.stack([ridden_to, knots[1:]], axis=1).ravel()
    standing = np.stack([np.zeros(moving.size), np.diff(ride.time_s) - moving], axis=1).ravel()
    worked = 0.5 * (power[1:] + power[:-1]) * moving
    working = np.stack([worked, np.zeros(moving.size)], axis=1).ravel()
    at = np.concatenate([knots[:1], at])
    stood = np.interp(clock, at, np.concatenate([[0.0], np.cumsum(standing)]))
    work = np.interp(clock, at, np.concatenate([[0.0], np.cumsum(working)]))
    time = np.maximum(np.diff(clock), 1e-6)
    stop, done = np.diff(stood), np.diff(work)
    riding = np.maximum(time - stop, 1e-3)
    speed = np.interp(clock, ride.time_s, np.nan_to_num(ride.speed_m_s))
    here = share[matched.from_node : matched.to_node]
    balance = balance_at_nodes(
        recovery_law(race.rider.recovery_law),
        excess_w=done / time / here - critical_power_w,
        time_s=time,
        w_prime_j=race.rider.w_prime_j,
    )
    return Ridden(
        first=matched.from_node,
        time_s=time,
        stop_s=np.minimum(stop, time),
        power_w=np.maximum(done / riding, 0.0),
        clock_s=clock,
        speed_m_s=speed,
        balance_j=balance,
        guessed_s=guessed,
        masked=masked,
    )


def _moving_s(ride: Ride) -> Array:
    """Time in motion within each step (n−1,).

    None while standing. Over a gap of the recording as much as the way takes at the ride's mean
    speed, the rest counts as standing.
    """
    step, way = np.diff(ride.time_s), np.diff(ride.travelled_m)
    still = ride.stopped[1:] & ride.stopped[:-1]
    gap = step > longest_step_s(ride.time_s)
    usual = ~still & ~gap
    mean = float(way[usual].sum() / max(step[usual].sum(), 1e-9))
    across = np.minimum(step, way / max(mean, STANDING_M_S))
    return np.where(gap, across, np.where(still, 0.0, step))


def _moving_first(ride: Ride, clock: Array, moving_s: Array) -> Array:
    """When nodes were passed if the way across a gap was ridden before anybody stood."""
    step = np.clip(np.searchsorted(ride.time_s, clock, side="right") - 1, 0, moving_s.size - 1)
    begun = ride.time_s[step]
    share = (clock - begun) / np.diff(ride.time_s)[step]
    return np.where(share < 1.0, begun + share * moving_s[step], clock)


def _filled_power(
    ride: Ride, from_s: float, to_s: float, moving_s: Array
) -> tuple[Array, tuple[Masked, ...], float]:
    """Power at every sample, what was bridged, and for how many seconds of the ride."""
    power, time = ride.power_w.copy(), ride.time_s
    missing = ~np.isfinite(power)
    known = np.flatnonzero(~missing)
    filled = np.interp(time, time[known], power[known])
    inside = (time >= from_s) & (time <= to_s)
    riding = inside & ~missing & ~ride.stopped
    mean = float(np.mean(power[riding])) if riding.any() else float(np.mean(power[known]))
    change = np.diff(np.concatenate([[0], missing.astype(np.int8), [0]]))
    masked, guessed = [], 0.0
    for a, b in zip(np.flatnonzero(change == 1), np.flatnonzero(change == -1) - 1, strict=True):
        before, after = max(int(a) - 1, 0), min(int(b) + 1, time.size - 1)
        lasted = float(time[after] - time[before])
        if lasted > BRIDGED_S:
            filled[a : b + 1] = mean
        lost = moving_s[before:after].sum()
        if inside[a : b + 1].any() and lost > 0.0:
            guessed += float(lost)
            how = "the ride's mean" if lasted > BRIDGED_S else "what lies beside"
            masked.append(Masked(float(time[a]), float(time[b]), f"no power: taken as {how}"))
    step, far = np.diff(time), np.diff(ride.travelled_m) > STANDING_M
    for i in np.flatnonzero((step > longest_step_s(time)) & far).tolist():
        if inside[i] and inside[i + 1]:
            # The mean of both ends stands for the step; the ends belong to other steps too, but
            # only for a second each.
            filled[i] = filled[i + 1] = mean
            guessed += float(moving_s[i])
            why = "gap in the recording: ridden at the mean speed and power"
            masked.append(Masked(float(time[i]), float(time[i + 1]), why))
    return filled, tuple(masked), guessed
