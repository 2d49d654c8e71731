"""Numbers of the race file to bring up to date after a ride, and how sure the new ones are."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from pacing.field.debrief_drag import Learnt, race_as_learnt
from pacing.field.debrief_power import AtLeast
from pacing.field.drag_unknowns import height_factor
from pacing.race import Race

TOO_UNSURE = 0.08
"""A relative standard error of more than this is no reason to change a race file."""


@dataclass(frozen=True)
class Update:
    """A key of the race file, its value ``before``, the ``value`` the ride speaks for, its error.

    ``se`` is one standard error. ``bound`` is "at least" where the ride only shows that it cannot
    be less. ``worth`` False where the ride tells too little to change it.
    """

    key: str
    value: float
    se: float
    before: float
    bound: str = ""
    worth: bool = True


def updates_from(race: Race, learnt: Learnt | None, power: AtLeast | None) -> tuple[Update, ...]:
    """What a ride says of drag areas, Crr, wind and critical power."""
    found: list[Update] = []
    if learnt is not None:
        found += _drag(race, learnt)
        found += _wind(race, learnt)
    if power is not None:
        found.append(
            Update(
                "rider.critical_power_w",
                power.critical_power_w,
                power.se_w,
                race.rider.critical_power_w,
                bound="at least",
            )
        )
    return tuple(found)


def _drag(race: Race, learnt: Learnt) -> list[Update]:
    found = []
    for number, position in enumerate(race.rider.positions):
        if not learnt.ridden[number]:
            continue
        whole, before = race.drag_area(position).m2[0], position.drag_area.m2[0]
        factor, error = learnt.likeliest.cda_factor[number], learnt.cda_se[number]
        found.append(
            Update(
                f"rider.positions[{number}].cda_m2",
                float(before + (factor - 1.0) * whole),
                float(error * whole),
                float(before),
                worth=bool(error < TOO_UNSURE * factor),
            )
        )
    crr = race.bike.crr
    known = race.uncertainty.crr_pct / 100.0
    found.append(
        Update(
            "bike.crr",
            crr * learnt.likeliest.crr_factor,
            crr * learnt.crr_se,
            crr,
            worth=bool(learnt.crr_se < 0.7 * known),
        )
    )
    return found


def _wind(race: Race, learnt: Learnt) -> list[Update]:
    """Speed and direction as the race file gives them; only where one weather holds."""
    if len(race.day.weathers) > 1 or not np.all(np.isfinite(learnt.wind_covariance)):
        return []
    before = race.day.weathers[0]
    after = race_as_learnt(race, replace(learnt.likeliest)).day.weathers[0]
    factor = height_factor(race.day)
    angle = np.radians(after.wind_from_deg)
    along = np.array([np.sin(angle), np.cos(angle)])
    aside = np.array([along[1], -along[0]])
    covariance = learnt.wind_covariance / factor**2
    speed_se = float(np.sqrt(along @ covariance @ along))
    aside_se = float(np.sqrt(aside @ covariance @ aside))
    turn = np.degrees(np.arctan2(aside_se, max(after.wind_speed_m_s, 1e-9)))
    return [
        Update(
            "air.wind_speed_m_s",
            after.wind_speed_m_s,
            speed_se,
            before.wind_speed_m_s,
            worth=learnt.wind_told,
        ),
        Update(
            "air.wind_from_deg",
            after.wind_from_deg,
            float(turn),
            before.wind_from_deg,
            worth=learnt.wind_told,
        ),
    ]
