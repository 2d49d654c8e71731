"""What is to be said of a fit of drag before it is trusted, and how to ride a better test."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from pacing.field.drag_result import DragFit
from pacing.field.drag_unknowns import rolling_crr
from pacing.field.recording_check import Ride
from pacing.race import Race
from pacing.units import KMH_PER_M_S

LEAST_USED_S = 600.0
WIDE_CDA = 0.05
"""Half an interval of more than this share of the drag area is not worth much for planning."""
NARROW_SPEEDS = 1.6
FAR_OFF_K = 7.0
USUAL_CDA_M2 = (0.17, 0.60)
USUAL_CRR = (0.0015, 0.012)


def warnings_for(fit: DragFit, rides: Sequence[Ride], race: Race) -> tuple[str, ...]:
    """Sentences about what to doubt and what to ride next time; empty if there is nothing."""
    said = [*_separation(fit), *_wind(fit, race), *_amount(fit, race), *_values(fit, race)]
    said += _air(rides, race)
    if fit.method != "coast-downs" and race.uncertainty.power_meter_pct > 0.0:
        share = fit.budget.get("power meter", 0.0)
        if share > 0.4:
            said.append(
                "The power meter's own error is the largest part of the interval: a better test"
                " needs a checked meter, not more rides."
            )
    return tuple(said)


def _separation(fit: DragFit) -> list[str]:
    if fit.separable:
        return []
    known = fit.known
    slow, fast = (KMH_PER_M_S * v for v in fit.speed_range_m_s)
    return [
        "Drag area and rolling resistance cannot be told apart: Crr rests on the race file, and"
        f" drag area with it. What is known: at {KMH_PER_M_S * known.speed_m_s:.0f} km/h the two"
        f" together hold back with {known.force_n.value:.1f} ± {known.force_n.half:.1f} N; a drag"
        f" area higher by 0.01 m² goes with a Crr lower by {-0.01 * known.crr_per_m2:.5f}.",
        f"Ride slower and faster runs: most of these were between {slow:.0f} and {fast:.0f} km/h."
        if fast < NARROW_SPEEDS * slow
        else "Ride longer, without stops and brakes, at several even speeds.",
    ]


def _wind(fit: DragFit, race: Race) -> list[str]:
    said = []
    for wind in fit.wind:
        if wind.contradicts:
            where = "" if wind.from_deg is None else f" from {wind.from_deg:.0f}°"
            said.append(
                f"{wind.ride} speaks of a wind of {wind.speed_m_s:.1f} m/s{where} at the rider,"
                " far from the race file's: is that the air of this day?"
            )
    untold = [w.ride for w in fit.wind if not (w.estimated or w.contradicts)]
    if untold and race.uncertainty.wind_speed_m_s > 0.0:
        said.append(
            f"The wind of {', '.join(untold)} could not be told from the drag and is taken as the"
            " race file gives it, with its error: ride both directions, or laps."
        )
    if fit.budget.get("wind", 0.0) > 0.5:
        said.append("The wind makes most of the error: test on a calm day, in both directions.")
    return said


def _amount(fit: DragFit, race: Race) -> list[str]:
    said = []
    if fit.used_s < LEAST_USED_S:
        said.append(
            f"Only {fit.used_s / 60:.0f} minutes could be used: twenty or more are worth riding."
        )
    if fit.moving_s > 0.0 and fit.used_s < 0.5 * fit.moving_s and fit.method == "energy balance":
        share = 100.0 * fit.used_s / fit.moving_s
        said.append(f"Only {share:.0f} % of the time in motion could be used; the rest is masked.")
    if fit.cda.half > WIDE_CDA * fit.cda_m2:
        dominant = max(fit.budget, key=lambda cause: fit.budget[cause])
        said.append(
            f"The drag area is known to no better than ± {100 * fit.cda.half / fit.cda_m2:.0f} %,"
            f" most of it for {_cause(dominant)}."
        )
    return said


def _cause(name: str) -> str:
    words = {
        "scatter": "the scatter of the stretches",
        "wind": "the wind",
        "heights": "the heights",
        "rolling": "the rolling resistance",
        "power meter": "the power meter",
    }
    return words.get(name, f"the {name}")


def _values(fit: DragFit, race: Race) -> list[str]:
    said = [
        f"A drag area of {p.cda_m2.value:.3f} m² in position '{p.name}' is outside"
        f" {USUAL_CDA_M2[0]} to {USUAL_CDA_M2[1]} m², where riders lie (common practice): look for"
        " a draught, brakes, wrong masses or a meter that is off."
        for p in fit.positions
        if not USUAL_CDA_M2[0] <= p.cda_m2.value <= USUAL_CDA_M2[1]
    ]
    if not USUAL_CRR[0] <= fit.crr <= USUAL_CRR[1]:
        said.append(f"A Crr of {fit.crr:.4f} is outside what tyres do on asphalt.")
    before = race.bike.crr if fit.on_course else rolling_crr(race)
    if fit.separable and not fit.crr_low <= before <= fit.crr_high:
        said.append(
            f"Crr comes out at {fit.crr:.4f}, the race file has {before:.4f} on its surface: the"
            " road of the test rolls differently, or something else is in it."
        )
    return said


def _air(rides: Sequence[Ride], race: Race) -> list[str]:
    """The recorder's thermometer against the race file's weather."""
    read = [r.recording.temperature_c for r in rides]
    known = np.concatenate(read)[np.isfinite(np.concatenate(read))]
    if known.size == 0:
        return []
    told = race.day.weathers[0].temperature_k - 273.15
    off = float(np.median(known)) - told
    if abs(off) < FAR_OFF_K:
        return []
    return [
        f"The recorder showed {np.median(known):.0f} °C, the race file says {told:.0f} °C: is it"
        f" the air of this day? {abs(off):.0f} K are {abs(off) / 2.9:.0f} % of density."
    ]
