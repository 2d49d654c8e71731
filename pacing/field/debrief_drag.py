"""Drag and wind as this ride shows them, against what the plan assumed."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.air import Day, Weather
from pacing.air.wind import rider_height_factor
from pacing.bike import DragArea
from pacing.field.debrief_match import Matched
from pacing.field.drag_segments import Segments
from pacing.field.drag_session import Session, session_of
from pacing.field.drag_solve import Solved, solve_balance
from pacing.field.drag_stretches import BALANCE, stretches_of
from pacing.field.drag_system import Shape, system_of
from pacing.field.drag_unknowns import (
    Unknowns,
    unknowns_for,
    wind_beforehand,
    with_wind_believed,
)
from pacing.field.recording import Masked
from pacing.field.recording_check import Ride
from pacing.race import Race
from pacing.rider import Position
from pacing.units import GRAVITY_M_S2

Array = NDArray[np.float64]

FEWEST_STRETCHES = 6
MOST_OFF, TRIMMINGS = 3.5, 3
WEAK_FACTOR_SD = 0.5
TOLD = 0.5
AT_LIMIT = 0.95
EXPLAINING = ("meter", "mass", "density", "speed", "height scale", "drift")


@dataclass(frozen=True)
class Drag:
    """Factors (P,) of each position's drag area, of Crr, and the wind at the rider (2,) [m/s].

    The wind is where it comes from, east and north, in the open at the clock of the start.
    """

    cda_factor: Array
    crr_factor: float
    wind_m_s: Array


@dataclass(frozen=True)
class Learnt:
    """What a ride says of drag area, tyres and wind, over what the race file says.

    ``likeliest`` holds everything that is uncertain against each other; ``cda_se`` (P,) and
    ``crr_se`` are standard errors of its factors, ``wind_covariance`` (2, 2) of its wind.
    ``explaining`` explains this ride best if masses, meter, air and heights are exactly as the
    race file has them. ``ridden`` (P,) marks the positions that were used.
    """

    likeliest: Drag
    cda_se: Array
    crr_se: float
    wind_covariance: Array
    wind_told: bool
    explaining: Drag
    ridden: NDArray[np.bool_]
    masked: tuple[Masked, ...]
    stretches: int


def learn(
    ride: Ride,
    matched: Matched,
    race: Race,
    *,
    position: NDArray[np.intp],
    limit_m_s: Array,
) -> Learnt | None:
    """Fit factors of drag area and Crr, and the wind, to the matched part of a ride.

    ``position`` (N,) is the index of the position in each cell of the course, ``limit_m_s``
    (N+1,) the planned limit of speed at its nodes: near it the brakes may be on, so that is left
    out. None where too little of the ride can be used.
    """
    session = _session(ride, matched, race, position, limit_m_s)
    stretches = stretches_of(session, race, BALANCE)
    if len(stretches.segments) < FEWEST_STRETCHES:
        return None
    begins = float(matched.node_s[matched.from_node])
    unknowns = _unknowns(ride, race, len(race.rider.positions), begins)
    shapes = tuple(Shape(curve=race.drag_area(p)) for p in race.rider.positions)
    solved, kept = _solve(session, stretches.segments, race, unknowns, shapes)
    unknowns = solved.system.unknowns
    told = _exact(unknowns, EXPLAINING)
    explained = solve_balance(
        system_of(session, kept, race, told, shapes), typical=_typical(race), theta=None
    )
    return _learnt(solved, explained, race, stretches.masked[0])


def _session(
    ride: Ride,
    matched: Matched,
    race: Race,
    position: NDArray[np.intp],
    limit_m_s: Array,
) -> Session:
    """The matched part of the ride over the course's own heights."""
    course = race.course
    on = np.isfinite(matched.at_m)
    height = np.full(on.size, np.nan)
    height[on] = np.interp(matched.at_m[on], course.distance_m, course.elevation_m)
    cell = np.searchsorted(course.distance_m, np.nan_to_num(matched.at_m), side="right") - 1
    cell = np.clip(cell, 0, position.size - 1)
    inside = on & (ride.time_s >= matched.node_s[matched.from_node])
    inside &= ride.time_s <= matched.node_s[matched.to_node]
    limit = np.interp(np.nan_to_num(matched.at_m), course.distance_m, limit_m_s)
    inside &= np.nan_to_num(ride.speed_m_s) < AT_LIMIT * limit
    group = np.where(inside, position[cell], -1).astype(np.intp)
    shown = replace(ride, has_heights=True, height_m=height)
    begins = float(matched.node_s[matched.from_node])
    session = session_of([shown], race, [group], [height], begins_s=begins)
    return replace(
        session,
        wind_share=course.wind_share[cell[:-1]],
        crr_factor=course.crr_factor[cell[:-1]],
    )


def _unknowns(ride: Ride, race: Race, positions: int, begins_s: float) -> Unknowns:
    """A factor for each position; tyres and wind as far as the race file knows them."""
    shown = replace(ride, drift=None)
    crr_sd = max(race.uncertainty.crr_pct / 100.0, 1e-3) * race.bike.crr
    found = unknowns_for(
        [shown],
        race,
        positions=[f"position {i}" for i in range(positions)],
        crr=race.bike.crr,
        crr_sd=crr_sd,
        drag_area=(1.0, WEAK_FACTOR_SD),
        tilt=None,
        headed=ride.placed,
        begins_s=begins_s,
    )
    return _exact(found, ("drift",))


def _exact(unknowns: Unknowns, names: tuple[str, ...]) -> Unknowns:
    """The same with some unknowns taken as known exactly."""
    exact = np.array([name.startswith(names) for name in unknowns.names])
    return replace(unknowns, fixed=unknowns.fixed | exact)


def _solve(
    session: Session, whole: Segments, race: Race, unknowns: Unknowns, shapes: tuple[Shape, ...]
) -> tuple[Solved, Segments]:
    off = np.zeros(len(whole), dtype=bool)
    theta = None
    for turn in range(TRIMMINGS):
        kept = whole.kept(~off)
        system = system_of(session, kept, race, unknowns, shapes)
        solved = solve_balance(system, typical=_typical(race), theta=theta)
        theta = solved.theta
        wrong = np.abs(solved.white) > MOST_OFF * max(1.0, float(np.std(solved.white)))
        if (~off).sum() - wrong.sum() < FEWEST_STRETCHES:
            wrong[:] = False
        if turn == 0:
            unknowns = with_wind_believed(unknowns, theta, 1)
        if not wrong.any() and unknowns is system.unknowns:
            break
        off[np.flatnonzero(~off)[wrong]] = True
    return solved, solved.system.segments


def _typical(race: Race) -> Array:
    weight_n = race.mass_kg * GRAVITY_M_S2
    return np.array([0.3 * weight_n, 0.06 * weight_n, 0.3])


def _learnt(solved: Solved, explained: Solved, race: Race, masked: tuple[Masked, ...]) -> Learnt:
    u, positions = solved.system.unknowns, len(race.rider.positions)
    crr, first = u.at("rolling"), u.start("wind")
    headed = solved.system.session.headed
    here = slice(first, first + (2 if headed else 1))
    covariance = solved.covariance[here, here]
    left = np.linalg.eigvals(covariance @ u.precision[here, here]).real
    before, _ = wind_beforehand(race, race.plan.start_clock_s)

    def drag(theta: Array) -> Drag:
        # What the forecast was off by; a head wind alone cannot be laid on the compass.
        wind = before + (theta[here] - u.mean[here]) if headed else before
        return Drag(theta[:positions], float(theta[crr] / u.mean[crr]), wind)

    return Learnt(
        likeliest=drag(solved.theta),
        cda_se=np.sqrt(np.diag(solved.covariance)[:positions]),
        crr_se=float(np.sqrt(solved.covariance[crr, crr]) / u.mean[crr]),
        wind_covariance=covariance if headed else np.full((2, 2), np.nan),
        wind_told=bool(headed and np.all(left < TOLD) and not u.fixed[here].any()),
        explaining=drag(explained.theta),
        ridden=np.isin(np.arange(positions), solved.system.group),
        masked=masked,
        stretches=len(solved.system.segments),
    )


def race_as_learnt(race: Race, drag: Drag) -> Race:
    """The race with drag areas and Crr multiplied and the wind moved.

    Hours other than the start's move by the same vector of wind.
    """
    before, _ = wind_beforehand(race, race.plan.start_clock_s)
    moved = drag.wind_m_s - before
    positions = tuple(
        replace(position, drag_area=_grown(race, position, float(factor)))
        for position, factor in zip(race.rider.positions, drag.cda_factor, strict=True)
    )
    return replace(
        race,
        rider=replace(race.rider, positions=positions),
        bike=replace(race.bike, crr=race.bike.crr * drag.crr_factor),
        day=Day(tuple(_blown(weather, moved) for weather in race.day.weathers)),
    )


def _grown(race: Race, position: Position, factor: float) -> DragArea:
    """The position's drag area such that all that goes with it is multiplied by ``factor``."""
    return position.drag_area + race.drag_area(position).scaled(factor - 1.0)


def _blown(weather: Weather, moved: Array) -> Weather:
    """The weather with its wind, brought to the rider, moved by a vector (2,) [m/s]."""
    if not np.any(moved):
        return weather
    factor = rider_height_factor(weather.surroundings, wind_height_m=weather.wind_height_m)
    angle = np.radians(weather.wind_from_deg)
    vector = weather.wind_speed_m_s * np.array([np.sin(angle), np.cos(angle)]) + moved / factor
    return replace(
        weather,
        wind_speed_m_s=float(np.hypot(*vector)),
        wind_from_deg=float(np.degrees(np.arctan2(vector[0], vector[1])) % 360.0),
    )
