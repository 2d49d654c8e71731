"""The sentences and the numbers a person reads: cautions, what one sees at a cue, units."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, NamedTuple

from pacing.units import KM_PER_MILE, KMH_PER_M_S, clock_text

if TYPE_CHECKING:
    import pandas as pd

CAUTIONS: tuple[str, ...] = (
    "Predicted descent and bend speeds are not safe speeds: brake for what you see.",
    "Local traffic law and the event's rules come first.",
    "Maximal efforts need medical clearance by a licensed practitioner.",
    "The plan is an estimate with an error, not a promise.",
)
"""What has to be said wherever a plan is printed."""

W_LEFT = "W′ left"
MINUS = "−"
NOTHING = "–"
DAY_S = 86_400
WORTH_SAYING_PCT = 1.0
"""Mean gradient of a cue from which it is called a climb or a descent."""


class Units(NamedTuple):
    """How distance and speed are printed; files stay SI."""

    distance: str
    speed: str
    m_per_distance: float
    speed_per_m_s: float


METRIC = Units("km", "km/h", 1000.0, KMH_PER_M_S)
IMPERIAL = Units("mile", "mph", 1000.0 * KM_PER_MILE, KMH_PER_M_S / KM_PER_MILE)


def units_named(name: str) -> Units:
    """The units of ``plan.units``."""
    return IMPERIAL if name == "imperial" else METRIC


def number(value: float | None, digits: int = 0, *, signed: bool = False) -> str:
    """A number with a true minus sign and no negative zero; a dash where there is none."""
    if value is None or not math.isfinite(value):
        return NOTHING
    rounded = round(float(value), digits) + 0.0
    sign = MINUS if rounded < 0 else "+" if signed and rounded > 0 else ""
    return f"{sign}{abs(rounded):.{digits}f}"


def distance(at_m: float, units: Units = METRIC, digits: int = 1) -> str:
    """A distance (m) in the printed unit, without its name."""
    return number(at_m / units.m_per_distance, digits)


def place(at_m: float, units: Units = METRIC, digits: int = 1) -> str:
    """A place along the course, such as ``km 12.5``."""
    return f"{units.distance} {distance(at_m, units, digits)}"


def speed(speed_m_s: float, units: Units = METRIC, digits: int = 1) -> str:
    """A speed (m/s) in the printed unit, without its name."""
    return number(speed_m_s * units.speed_per_m_s, digits)


def clock(seconds: float) -> str:
    """Elapsed seconds as ``h:mm:ss``."""
    return clock_text(seconds)


def day_clock(second_of_day: float) -> str:
    """A clock of the day: ``09:30``, with seconds only where there are any."""
    whole = round(second_of_day) % DAY_S
    text = f"{whole // 3600:02d}:{whole // 60 % 60:02d}"
    return text if whole % 60 == 0 else f"{text}:{whole % 60:02d}"


def span(seconds: float) -> str:
    """A difference of times: seconds to a minute and a half, minutes and seconds above."""
    if abs(seconds) < 90:
        return f"{number(seconds, 1)} s"
    whole = abs(round(seconds))
    text = f"{whole // 60} min {whole % 60:02d} s" if whole < 3600 else clock_text(whole)
    return f"{MINUS if seconds < 0 else ''}{text}"


def filled(text: object) -> str:
    """``text`` as a string on one line; empty for None, NaN and the like."""
    if text is None or (isinstance(text, float) and math.isnan(text)) or text != text:
        return ""
    return " ".join(str(text).split())


def sentence(text: str) -> str:
    """``text`` with a capital and a full stop."""
    plain = filled(text)
    end = "" if plain.endswith((".", "!", "?")) else "."
    return f"{plain[:1].upper()}{plain[1:]}{end}" if plain else ""


def cue_digits(cues: pd.DataFrame, units: Units = METRIC) -> int:
    """Decimals a cue's place needs to be printed as it was planned, within 6 m: one or two."""
    tenths = cues["from_km"].to_numpy() * 10_000.0 / units.m_per_distance
    return 1 if bool((abs(tenths - tenths.round()) < 0.06).all()) else 2


SAID = {
    "crest": "over the top",
    "bottom": "at the bottom",
    "bend": "at the bend",
    "sharp bend": "at the sharp bend",
}
"""How a rider says what the course calls these places."""


def seen(cue: pd.Series, units: Units = METRIC) -> str:
    """What the rider sees where a cue begins: the landmark, the words for it, or the kilometre."""
    name = filled(cue.get("landmark")) or filled(cue.get("words"))
    return SAID.get(name, name) or place(1000.0 * float(cue["from_km"]), units)


def seen_beside(cue: pd.Series, units: Units = METRIC) -> str:
    """As ``seen``, for beside a distance: where nothing stands there, how the road goes on.

    ``held_m_s``, where a cue has it, is a limit of speed that decides most of it.
    """
    text = seen(cue, units)
    if text.startswith(f"{units.distance} "):
        grade = float(cue["gradient_pct"])
        way = "climb" if grade > 0 else "descent"
        text = f"{way} {number(abs(grade))} %" if abs(grade) >= WORTH_SAYING_PCT else ""
    held = cue.get("held_m_s")
    if held is None or not math.isfinite(held):
        return text
    most = f"at most {speed(held, units, 0)} {units.speed}"
    return f"{text}, {most}" if text else most
