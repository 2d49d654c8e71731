"""The energy balance of every stretch, and its slopes in all that is not known.

Over each stretch, at the wheel:

    η·W = ½ m_eff Δv² + m g Δh + Crr m g s + b₀ s + b₁ ∫v ds + ∫½ρ CdA·flow·along ds

Source: martin-1998 (the same terms as `pacing.bike.resistance`).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from pacing.bike import DragArea
from pacing.field.drag_segments import Segments
from pacing.field.drag_session import Session
from pacing.field.drag_unknowns import Unknowns
from pacing.field.drag_wind import UnknownWind, no_unknown_wind
from pacing.race import Race
from pacing.units import GRAVITY_M_S2

Array = NDArray[np.float64]
Index = NDArray[np.intp]


class Balance(NamedTuple):
    """Work left over in each stretch (K,) [J], and its slopes (K, p) in the unknowns."""

    left_j: Array
    slopes: Array


@dataclass(frozen=True)
class Shape:
    """Drag area against yaw: the unknown number times ``curve``, plus ``added``.

    Either None: the number itself at every yaw, and nothing added.
    """

    curve: DragArea | None = None
    added: DragArea | None = None


@dataclass(frozen=True)
class System:
    """Sums over the stretches that do not depend on the unknowns, and what does.

    ``wind`` is what is held of the wind that is not known, see `UnknownWind`.
    """

    session: Session
    segments: Segments
    unknowns: Unknowns
    shapes: tuple[Shape, ...]
    mass_kg: float
    rotating_kg: float
    bearing_n: float
    bearing_n_per_m_s: float
    work_j: Array
    way_m: Array
    rolled_m: Array
    speed_way: Array
    square: Array
    rise_m: Array
    east_m: Array
    north_m: Array
    lasting_s: Array
    ride: Index
    group: Index
    wind: UnknownWind

    @property
    def level(self) -> bool:
        """Whether the road is taken as a plane rather than as its recorded heights."""
        return self.unknowns.start("tilt") >= 0

    def balance(self, theta: Array) -> Balance:
        """The balance at the unknowns ``theta`` (p,)."""
        u, mass = self.unknowns, self.mass_kg + theta[self.unknowns.at("mass")]
        scale, density = theta[u.at("speed")], 1.0 + theta[u.at("density")]
        crr = theta[u.at("rolling")]
        slopes = np.zeros((len(self.segments), theta.size))
        air = self._air(theta, slopes)
        weight = mass * GRAVITY_M_S2
        rise = self._rise(theta, slopes, weight)
        kinetic = (mass + self.rotating_kg) * scale**2 * self.square
        rolling = weight * crr * scale * self.rolled_m
        bearing = self.bearing_n * scale * self.way_m
        bearing = bearing + self.bearing_n_per_m_s * scale**2 * self.speed_way
        work = (1.0 + theta[u.at("meter")]) * self.work_j
        left = work - kinetic - weight * rise - rolling - bearing - density * air.force_j

        slopes[:, u.at("rolling")] = -weight * scale * self.rolled_m
        slopes[:, u.at("meter")] = self.work_j
        slopes[:, u.at("density")] = -air.force_j
        by_mass = scale**2 * self.square + GRAVITY_M_S2 * (rise + crr * scale * self.rolled_m)
        slopes[:, u.at("mass")] = -by_mass
        by_speed = 2.0 * kinetic + rolling + bearing
        slopes[:, u.at("speed")] = -(by_speed / scale + density * air.by_speed)
        slopes[:, u.fixed] = 0.0
        return Balance(left, slopes)

    def _rise(self, theta: Array, slopes: Array, weight: float) -> Array:
        """True rise of each stretch (K,) [m]; fills the slopes of what heights are unsure of."""
        u = self.unknowns
        if self.level:
            at = u.start("tilt")
            slopes[:, at] = -weight * self.east_m
            slopes[:, at + 1] = -weight * self.north_m
            return np.asarray(theta[at] * self.east_m + theta[at + 1] * self.north_m)
        at = u.start("drift")
        stretch = 1.0 + theta[u.at("height scale")]
        slopes[:, u.at("height scale")] = -weight * self.rise_m
        rows = np.arange(self.ride.size)
        slopes[rows, at + self.ride] = weight * self.lasting_s
        return np.asarray(stretch * self.rise_m - theta[at + self.ride] * self.lasting_s)

    def _air(self, theta: Array, slopes: Array) -> _Air:
        """Work against the air (K,); fills the slopes in drag areas and wind."""
        s, u = self.session, self.unknowns
        scale, density = theta[u.at("speed")], 1.0 + theta[u.at("density")]
        first = u.start("wind")
        if s.headed:
            east = theta[first + 2 * s.ride] + s.wind_turn_m_s[0]
            north = theta[first + 1 + 2 * s.ride] + s.wind_turn_m_s[1]
            along = scale * s.speed_m_s + s.wind_share * (north * s.cosine + east * s.sine)
            across = s.wind_share * (east * s.cosine - north * s.sine)
        else:
            along = scale * s.speed_m_s + s.wind_share * theta[first + s.ride]
            across = np.zeros_like(along)
        flow = np.hypot(along, across) + 1e-12
        area, unit = self._areas(theta, along, across)
        way = s.half_density_kg_m3 * s.way_m
        mean, error = self.wind.squares(s)
        force = way * (flow * along + mean + theta[u.at("wind square")] * error)
        by_along = way * area * (flow + along**2 / flow)
        columns = [scale * area * force, scale * unit * force, scale * way * area * error]
        columns.append(area * force + scale * by_along * s.speed_m_s)
        if s.headed:
            by_across = way * area * along * across / flow
            share = scale * s.wind_share
            columns.append(share * (by_along * s.sine + by_across * s.cosine))
            columns.append(share * (by_along * s.cosine - by_across * s.sine))
        else:
            columns.append(scale * s.wind_share * by_along)
        air, by_area, by_square, by_speed, *by_wind = self.segments.sums(np.stack(columns))
        rows = np.arange(self.group.size)
        slopes[rows, self.group] = -density * by_area
        slopes[:, u.at("wind square")] = -density * by_square
        for side, column in enumerate(by_wind):
            slopes[rows, first + len(by_wind) * self.ride + side] = -density * column
        return _Air(air, by_speed)

    def _areas(self, theta: Array, along: Array, across: Array) -> tuple[Array, Array]:
        """Drag area of each step (S,) and what the unknown number multiplies in it."""
        group = np.maximum(self.session.group, 0)
        unit, added = np.ones_like(along), np.zeros_like(along)
        for index, shape in enumerate(self.shapes):
            if shape.curve is None and shape.added is None:
                continue
            here = group == index
            yaw = np.arctan2(np.abs(across[here]), along[here])
            if shape.curve is not None:
                unit[here] = shape.curve.m2_at(yaw)
            if shape.added is not None:
                added[here] = shape.added.m2_at(yaw)
        return theta[group] * unit + added, unit

    def gust_w(self, theta: Array) -> Array:
        """Power (K,) that a gust of 1 m/s takes in each stretch [W per m/s]."""
        drag_area = theta[self.group]
        if any(shape.curve is not None for shape in self.shapes):
            curves = [s.curve.m2[0] if s.curve is not None else 1.0 for s in self.shapes]
            drag_area = drag_area * np.array(curves)[self.group]
        speed = self.way_m / self.lasting_s
        density = self.segments.sums(self.session.half_density_kg_m3 * self.session.dt_s)
        return np.asarray(2.0 * density / self.lasting_s * np.abs(drag_area) * speed**2)


class _Air(NamedTuple):
    """Work against the air (K,) at the density given, and its slope in the scale of speed."""

    force_j: Array
    by_speed: Array


def system_of(
    session: Session,
    segments: Segments,
    race: Race,
    unknowns: Unknowns,
    shapes: tuple[Shape, ...],
) -> System:
    """Sum up once what does not change with the unknowns."""
    bike, sums = race.bike, segments.sums
    return System(
        session=session,
        segments=segments,
        unknowns=unknowns,
        shapes=shapes,
        mass_kg=race.mass_kg,
        rotating_kg=bike.rotating_mass_kg,
        bearing_n=bike.bearing_n,
        bearing_n_per_m_s=bike.bearing_n_per_m_s,
        work_j=sums(session.work_j),
        way_m=sums(session.way_m),
        rolled_m=sums(session.crr_factor * session.way_m),
        speed_way=sums(session.speed_m_s * session.way_m),
        square=sums(session.half_square),
        rise_m=sums(np.nan_to_num(session.rise_m)),
        east_m=sums(session.east_m),
        north_m=sums(session.north_m),
        lasting_s=sums(session.dt_s),
        ride=session.ride[segments.start],
        group=session.group[segments.start].astype(np.intp),
        wind=no_unknown_wind(len(session.rides)),
    )
