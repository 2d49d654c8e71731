"""The rider: mass, critical power and W′, positions, and what they are willing to do."""

from __future__ import annotations

from dataclasses import dataclass

from pacing.rider.position import Position

FIT_FORMS = ("two-parameter", "three-parameter")
LONG_DECLINE_SHARE = 0.07
"""Default fall of critical power per e-fold of time beyond half an hour, over critical power.

Gives −4.9 % at 60 min and −9.7 % at 2 h, the size of what was measured after 2 h of heavy
riding (Source: clark-2018, clark-2019).
"""


@dataclass(frozen=True)
class Rider:
    """One rider on one day; powers are true power, not the meter's.

    ``fit_form`` says which fit critical power and W′ come from: only with "three-parameter"
    does ``peak_power_w`` fall with W′ left, otherwise it is a flat cap. ``long_decline_w``
    lowers critical power beyond half an hour. ``power_meter_factor`` is true power over shown.
    ``tested_position`` names the position whose power share is 1.
    """

    mass_kg: float
    critical_power_w: float
    w_prime_j: float
    positions: tuple[Position, ...]
    kit_mass_kg: float = 2.0
    fit_form: str = "two-parameter"
    peak_power_w: float | None = None
    long_decline_w: float = 0.0
    recovery_law: str = "two-phase"
    power_meter_factor: float = 1.0
    tested_position: str = ""
    max_cadence_rpm: float = 115.0
    max_speed_m_s: float | None = None

    def position(self, name: str) -> Position:
        """The position of that name; ``KeyError`` if there is none."""
        for position in self.positions:
            if position.name == name:
                return position
        raise KeyError(name)
