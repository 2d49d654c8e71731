"""What to paste into a race file after a fit of drag."""

from __future__ import annotations

import json

from pacing.field.drag_result import DragFit
from pacing.race import Race

MOST_CDA_PCT, MOST_CRR_PCT = 30.0, 60.0
"""The most that a race file takes as one standard deviation."""


def drag_fragment(fit: DragFit, race: Race) -> str:
    """TOML for positions, bicycle and uncertainty, with what it was reckoned with."""
    lines = []
    for position in fit.positions:
        low, high = position.cda_m2.low, position.cda_m2.high
        lines += [
            "[[rider.positions]]",
            f"name = {json.dumps(position.name, ensure_ascii=False)}",
            f"cda_m2 = {position.cda_m2.value:.4f}  # 95 %: {low:.4f} to {high:.4f}",
            'cda_convention = "road"',
            "",
        ]
    if fit.on_course:
        rolling = "the tyres' own: the surface of the race file's course is taken off"
    else:
        rolling = "as the road of the test rolls; divide by the factor of a rougher course.surface"
    if not fit.separable:
        rolling = "the race file's, moved as far as the rides ask: they cannot tell it alone"
    bike = race.bike
    lines += [
        "[bike]",
        f"crr = {fit.crr:.5f}  # {rolling}",
        "wheel_rotation_m2 = 0.0  # is in the drag area already",
        f"drivetrain_efficiency = {bike.drivetrain_efficiency:g}  # reckoned with",
        f"power_measured_at = {json.dumps(bike.power_measured_at)}",
    ]
    if bike.cda_by_yaw is not None:
        lines.append("# bike.cda_by_yaw of the race file was taken off: keep it")
    if race.rider.power_meter_factor != 1.0:
        lines.append(
            f"# reckoned with rider.power_meter_factor = {race.rider.power_meter_factor:g}"
        )
    cda_pct = 100.0 * fit.cda.half / 1.96 / fit.cda_m2
    crr_pct = 100.0 * (fit.crr_high - fit.crr_low) / 3.92 / fit.crr
    lines += [
        "",
        "[uncertainty]",
        f"cda_pct = {min(max(cda_pct, 0.1), MOST_CDA_PCT):.1f}",
        f"crr_pct = {min(max(crr_pct, 0.1), MOST_CRR_PCT):.1f}",
    ]
    return "\n".join(lines) + "\n"
