"""Simulated sessions whose drag area, rolling, wind and errors are known.

The motion is integrated here, from forces written out here, independent of the package: only the
container of a ride is the package's own.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.signal import lfilter

from pacing.field.recording import Recording
from pacing.field.recording_check import Ride
from pacing.field.recording_speed import Speed

Array = NDArray[np.float64]

GRAVITY = 9.80665
EFFICIENCY = 0.976
BEARING_N, BEARING_N_PER_M_S = 0.091, 0.0087
ROTATING_KG = 0.14 / (2.10 / (2 * np.pi)) ** 2


@dataclass(frozen=True)
class Errors:
    """One standard deviation of what is wrong with a session."""

    meter: float = 0.015
    mass_kg: float = 0.5
    density: float = 0.005
    speed: float = 0.002
    height_scale: float = 0.02
    drift_m_per_s: float = 10.0 / 3600.0
    tilt: float = 0.002
    height_m: float = 0.15
    wander_m: float = 0.7
    power_noise: float = 0.02
    speed_noise_m_s: float = 0.05
    wind_m_s: float = 2.0
    gust_share: float = 0.25
    gust_s: float = 15.0


@dataclass(frozen=True)
class Truth:
    """What ``cases`` sessions really were; each entry (cases,)."""

    cases: int
    seed: int
    race: Any
    errors: Errors = field(default_factory=Errors)

    def __post_init__(self) -> None:
        random = np.random.default_rng(self.seed)
        normal = random.standard_normal
        n, e = self.cases, self.errors
        speed = random.uniform(0.0, e.wind_m_s, n)
        way = random.uniform(0.0, 2 * np.pi, n)
        rho = float(self.race.day.density_kg_m3(0.0, 0.0))
        for name, value in {
            "random": random,
            "cda": random.uniform(0.22, 0.36, n),
            "crr": random.uniform(0.0035, 0.0065, n),
            "east": speed * np.sin(way),
            "north": speed * np.cos(way),
            "mass": self.race.mass_kg + e.mass_kg * normal(n),
            "rho": rho * (1 + e.density * normal(n)),
            "meter": 1 + e.meter * normal(n),
            "scale": 1 + e.speed * normal(n),
            "height_scale": 1 + e.height_scale * normal(n),
            "drift": e.drift_m_per_s * normal(n),
        }.items():
            object.__setattr__(self, name, value)

    def __getattr__(self, name: str) -> Any:
        raise AttributeError(name)


def wandering(random: Any, shape: tuple[int, int], memory: float) -> Array:
    """Series (cases, T) of unit standard deviation that forget over ``memory`` steps."""
    keep = np.exp(-1.0 / memory)
    kicks = np.sqrt(1 - keep**2) * random.standard_normal(shape)
    kicks[:, 0] /= np.sqrt(1 - keep**2)
    return np.asarray(lfilter([1.0], [1.0, -keep], kicks, axis=1))


def gusts(t: Truth, seconds: int) -> tuple[Array, Array]:
    """Gusts from east and from north (cases, T), larger in more wind, alike in all directions."""
    size = t.errors.gust_share * np.hypot(t.east, t.north)[:, None]
    shape = (t.cases, seconds)
    return tuple(size * wandering(t.random, shape, t.errors.gust_s) for _ in range(2))


def force(t: Truth, v: Array, sine: Array, cosine: Array, gust: tuple[Array, Array]) -> Array:
    """What holds the rider back on the level, in N (Martin 1998, road axis)."""
    east, north = t.east + gust[0], t.north + gust[1]
    along = v + east * sine + north * cosine
    across = east * cosine - north * sine
    air = 0.5 * t.rho * t.cda * np.hypot(along, across) * along
    return air + t.crr * t.mass * GRAVITY + BEARING_N + BEARING_N_PER_M_S * v


@dataclass(frozen=True)
class Motion:
    """True motion at the seconds 0..T (cases, T+1); power per step (cases, T)."""

    v: Array
    s: Array
    east: Array
    north: Array
    heading: Array
    height: Array
    power: Array
    whole: NDArray[np.bool_]


def loops(
    t: Truth, *, seconds: int = 1800, loop_m: float = 4200.0, relief_m: float = 35.0
) -> Motion:
    """Laps of a hilly oval ridden harder uphill, second by second."""
    angle = np.linspace(0, 2 * np.pi, 2001)
    x, y = 1.4 * np.sin(angle), 0.7 * np.cos(angle)
    s = np.concatenate([[0], np.cumsum(np.hypot(np.diff(x), np.diff(y)))])
    stretch = loop_m / s[-1]
    s, x, y = s * stretch, x * stretch, y * stretch
    height = 0.5 * relief_m * (0.7 * np.sin(2 * angle) + 0.3 * np.cos(5 * angle))
    slope, heading = np.gradient(height, s), np.unwrap(np.arctan2(np.gradient(x), np.gradient(y)))
    effort = t.random.uniform(160, 260, t.cases)
    moods = 1 + 0.15 * wandering(t.random, (t.cases, seconds + 1), 40.0)
    blowing = gusts(t, seconds + 1)
    v, at = np.full(t.cases, 8.0), np.zeros(t.cases)
    vs, ats, powers = [v], [at], []
    inertia = t.mass + ROTATING_KG
    for k in range(seconds):
        place = np.mod(at, loop_m)
        grade = np.interp(place, s, slope)
        power = np.clip(effort * moods[:, k] * (1 + 7 * grade), 0, 600)
        power = np.where(v > 16.0, 0.0, power)

        def pull(speed: Array, where: Array, power: Array = power, k: int = k) -> Array:
            p = np.mod(where, loop_m)
            g, h = np.interp(p, s, slope), np.interp(p, s, heading)
            held = force(t, speed, np.sin(h), np.cos(h), (blowing[0][:, k], blowing[1][:, k]))
            # the slope is rise over road here, so the climb takes m g sin = m g · slope
            return (
                EFFICIENCY * power / np.maximum(speed, 2) - held - t.mass * GRAVITY * g
            ) / inertia

        half = v + 0.5 * pull(v, at)
        after = np.maximum(v + pull(half, at + 0.25 * (v + half)), 1.5)
        at = at + 0.5 * (v + after)
        v = after
        vs.append(v), ats.append(at), powers.append(power)
    v, at = np.array(vs).T, np.array(ats).T
    place = np.mod(at, loop_m)
    return Motion(
        v, at, np.interp(place, s, x), np.interp(place, s, y), np.interp(place, s, heading),
        np.interp(place, s, height), np.array(powers).T, np.ones((t.cases, seconds), bool),
    )  # fmt: skip


def runs(
    t: Truth, *, levels: tuple[float, ...] = (7.0, 8.5, 10.0, 11.5, 13.0), seconds: int = 90,
    heading_deg: float = 50.0, both_ways: bool = True, repeats: int = 2,
) -> Motion:  # fmt: skip
    """Runs at even speeds on a straight road of even slope, there and back."""
    parts = []
    ways = (heading_deg, heading_deg + 180.0) if both_ways else (heading_deg,) * 2
    tilt = t.errors.tilt * t.random.standard_normal(t.cases)
    blowing = gusts(t, len(levels) * 2 * repeats * (seconds + 1))
    for number, (level, way) in enumerate((each, w) for each in levels * repeats for w in ways):
        count = seconds + 1
        v = level * (1 + 0.01 * wandering(t.random, (t.cases, count), 8.0))
        here = slice(number * count, (number + 1) * count)
        gust = (blowing[0][:, here], blowing[1][:, here])
        parts.append(_along_a_road(t, v, np.radians(way), gust, tilt, np.radians(heading_deg)))
    return _joined(parts)


def _along_a_road(
    t: Truth, v: Array, way: float, gust: tuple[Array, Array], tilt: Array, axis: float
) -> Motion:
    mid = 0.5 * (v[:, 1:] + v[:, :-1])
    at = np.concatenate([np.zeros((t.cases, 1)), np.cumsum(mid, axis=1)], axis=1)
    east, north = at * np.sin(way), at * np.cos(way)
    up = tilt[:, None] * np.cos(way - axis)
    held = np.stack(
        [
            force(t, mid[:, k], np.sin(way), np.cos(way), (gust[0][:, k], gust[1][:, k]))
            for k in range(mid.shape[1])
        ],
        1,
    )
    gain = 0.5 * (t.mass + ROTATING_KG)[:, None] * np.diff(v**2, axis=1)
    power = ((held + (t.mass * GRAVITY)[:, None] * up) * mid + gain) / EFFICIENCY
    return Motion(
        v, at, east, north, np.full_like(v, way), up * at, power, np.ones(power.shape, bool)
    )


def coasts(t: Truth, *, count: int = 12, heading_deg: float = 50.0, fast: float = 12.5) -> Motion:
    """Coast-downs from ``fast`` m/s, there and back on a straight road of even slope."""
    tilt = t.errors.tilt * t.random.standard_normal(t.cases)
    seconds = 45
    blowing = gusts(t, count * (seconds + 1))
    parts = []
    for number in range(count):
        way = np.radians(heading_deg + 180.0 * (number % 2))
        up = tilt * (1 - 2 * (number % 2))
        v = np.full(t.cases, fast) + 0.3 * t.random.standard_normal(t.cases)
        vs = [v]
        for k in range(seconds):
            at = number * (seconds + 1) + k
            gust = (blowing[0][:, at], blowing[1][:, at])

            def slowing(
                speed: Array, gust: tuple[Array, Array] = gust, way: float = way, up: Array = up
            ) -> Array:
                held = force(t, speed, np.sin(way), np.cos(way), gust)
                return (held + t.mass * GRAVITY * up) / (t.mass + ROTATING_KG)

            v = v - slowing(v - 0.5 * slowing(v))
            vs.append(v)
        v = np.array(vs).T
        mid = 0.5 * (v[:, 1:] + v[:, :-1])
        at = np.concatenate([np.zeros((t.cases, 1)), np.cumsum(mid, axis=1)], axis=1)
        parts.append(
            Motion(
                v,
                at,
                at * np.sin(way),
                at * np.cos(way),
                np.full_like(v, way),
                up[:, None] * at,
                np.zeros_like(mid),
                mid > 3.0,
            )
        )
    return _joined(parts)


def _joined(parts: list[Motion]) -> Motion:
    """Parts one after the other, not whole where one ends and the next begins."""
    between = np.zeros((parts[0].v.shape[0], 1))
    powers, whole = [], []
    for part in parts:
        powers += [part.power, between]
        whole += [part.whole, between.astype(bool)]
    samples = {
        name: np.concatenate([getattr(part, name) for part in parts], axis=1)
        for name in ("v", "s", "east", "north", "heading", "height")
    }
    return Motion(
        **samples,
        power=np.concatenate(powers, axis=1)[:, :-1],
        whole=np.concatenate(whole, axis=1)[:, :-1],
    )


def recorded(t: Truth, motion: Motion, *, heights: bool = True) -> list[Ride]:
    """The rides as instruments with those errors would record them."""
    e, normal = t.errors, t.random.standard_normal
    shape = motion.v.shape
    time = np.arange(shape[1], dtype=float)
    speed = motion.v / t.scale[:, None] + e.speed_noise_m_s * normal(shape)
    height = t.height_scale[:, None] * motion.height + t.drift[:, None] * time
    height = height + e.wander_m * wandering(t.random, shape, 1500.0) + e.height_m * normal(shape)
    power = np.maximum(
        motion.power / t.meter[:, None] * (1 + e.power_noise * normal(motion.power.shape)), 0
    )
    padded = np.pad(power, ((0, 0), (1, 1)), mode="edge")
    at_samples = 0.5 * (padded[:, 1:] + padded[:, :-1])
    # a sample stands for the steps on both sides only where both are part of one run
    broken = ~np.pad(motion.whole, ((0, 0), (1, 1)), constant_values=True)
    at_samples = np.where(
        broken[:, 1:], padded[:, :-1], np.where(broken[:, :-1], padded[:, 1:], at_samples)
    )
    nothing = np.full(shape[1], np.nan)
    return [
        _ride(time, at_samples[i], speed[i], height[i] if heights else nothing, motion, i, e.speed)
        for i in range(shape[0])
    ]


def _ride(
    time: Array, power: Array, speed: Array, height: Array, motion: Motion, i: int, scale_se: float
) -> Ride:
    nothing = np.full(time.size, np.nan)
    recording = Recording(
        name=f"case {i}", time_s=time, power_w=power, lat_deg=nothing, lon_deg=nothing,
        elevation_m=height, distance_m=nothing, speed_m_s=speed, cadence_rpm=nothing,
        temperature_c=nothing, lap=nothing, position=np.full(time.size, ""),
    )  # fmt: skip
    travelled = np.concatenate([[0.0], np.cumsum(0.5 * (speed[1:] + speed[:-1]))])
    return Ride(
        recording=recording,
        time_s=time,
        power_w=power,
        speed_m_s=speed,
        travelled_m=travelled,
        height_m=height,
        heading_deg=np.degrees(motion.heading[i]) % 360.0,
        east_m=motion.east[i],
        north_m=motion.north[i],
        stopped=np.zeros(time.size, dtype=bool),
        whole=motion.whole[i],
        has_heights=bool(np.isfinite(height).any()),
        placed=True,
        speed=Speed(speed, travelled, 1.0, scale_se, "sensor"),
        drift=None,
        masked=(),
        notes=(),
    )
