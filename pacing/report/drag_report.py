"""What ``pacing fit-drag`` says: one screen of text, or the same as JSON."""

from __future__ import annotations

import textwrap
from collections import defaultdict
from typing import Any

from pacing.field.drag_result import DragFit, Interval
from pacing.report import words
from pacing.units import KMH_PER_M_S

WIDTH = 80
SCHEMA = "drag-fit/1"
CAUTION = (
    "Test on quiet roads, alone and within the law; coast-downs and even runs are no reason to"
    " ignore traffic."
)


def drag_text(fit: DragFit) -> str:
    """The fit as text: the numbers, what they rest on, what was left out, what to paste."""
    blocks = [
        _headline(fit),
        _differences(fit),
        _basis(fit),
        _budget(fit),
        _left_out(fit),
        "\n".join(_item(text) for text in (*fit.warnings, *fit.notes, CAUTION)),
        "To paste into a race file:\n\n" + fit.fragment.rstrip(),
    ]
    return "\n\n".join(block for block in blocks if block) + "\n"


def drag_document(fit: DragFit) -> dict[str, Any]:
    """The same as a JSON document."""
    return {
        "schema": SCHEMA,
        "cda_m2": fit.cda_m2,
        "cda_low_m2": fit.cda_low_m2,
        "cda_high_m2": fit.cda_high_m2,
        "crr": fit.crr,
        "crr_low": fit.crr_low,
        "crr_high": fit.crr_high,
        "separable": fit.separable,
        "method": fit.method,
        "positions": [
            {"name": p.name, **_interval("cda", p.cda_m2), "used_s": p.used_s}
            for p in fit.positions
        ],
        "differences": [
            {"name": d.name, "against": d.against, **_interval("cda", d.cda_m2)}
            for d in fit.differences
        ],
        "known": {
            "speed_m_s": fit.known.speed_m_s,
            "force_n": fit.known.force_n.value,
            "force_low_n": fit.known.force_n.low,
            "force_high_n": fit.known.force_n.high,
            "crr_per_m2": fit.known.crr_per_m2,
        },
        "wind": [
            {"ride": w.ride, "speed_m_s": w.speed_m_s, "from_deg": w.from_deg, "se_m_s": w.se_m_s}
            for w in fit.wind
            if w.estimated
        ],
        "budget": fit.budget,
        "used_s": fit.used_s,
        "moving_s": fit.moving_s,
        "stretches": fit.stretches,
        "masked": [
            {"ride": ride, "from_s": mask.from_s, "to_s": mask.to_s, "why": mask.why}
            for ride, mask in fit.masked
        ],
        "warnings": list(fit.warnings),
        "notes": list(fit.notes),
        "fragment": fit.fragment,
    }


def _interval(name: str, value: Interval) -> dict[str, float]:
    return {f"{name}_m2": value.value, f"{name}_low_m2": value.low, f"{name}_high_m2": value.high}


def _headline(fit: DragFit) -> str:
    several = len(fit.positions) > 1
    wide = max(22, *(len(p.name) + 5 for p in fit.positions)) if several else 22
    lines = []
    for position in fit.positions:
        label = f"CdA {words.filled(position.name)}" if several else "drag area CdA"
        lines.append(_row(label[:40], wide, position.cda_m2, "m²", 4))
    crr = Interval(fit.crr, fit.crr_low, fit.crr_high)
    rests = "" if fit.separable else "  (rests on the race file)"
    lines.append(_row("rolling Crr", wide, crr, "", 5) + rests)
    return "\n".join(lines)


def _row(label: str, wide: int, value: Interval, unit: str, digits: int) -> str:
    low, high = words.number(value.low, digits), words.number(value.high, digits)
    text = f"{label:{wide}}{words.number(value.value, digits):>9} {unit:2}"
    return f"{text}  95 %: {low} to {high}"


def _differences(fit: DragFit) -> str:
    lines = []
    for found in fit.differences:
        value = found.cda_m2
        low, high = (words.number(edge, 4, signed=True) for edge in (value.low, value.high))
        text = (
            f"{words.filled(found.name)} less {words.filled(found.against)}:"
            f" {words.number(value.value, 4, signed=True)} m² ({low} to {high})"
        )
        clear = value.low > 0.0 or value.high < 0.0
        lines.append(text if clear else f"{text}, no difference shown")
    return "\n".join(textwrap.fill(line, WIDTH, subsequent_indent="  ") for line in lines)


def _basis(fit: DragFit) -> str:
    text = (
        f"By {fit.method}: {fit.stretches} stretches, {fit.used_s / 60.0:.0f} of"
        f" {fit.moving_s / 60.0:.0f} minutes in motion."
    )
    for wind in fit.wind:
        if not wind.estimated:
            continue
        where = "" if wind.from_deg is None else f" from {wind.from_deg:.0f}°"
        text += (
            f" Wind in {wind.ride}: {words.number(wind.speed_m_s, 1)} ±"
            f" {words.number(wind.se_m_s, 1)} m/s{where} at the rider, found from the ride."
        )
    known = fit.known
    text += (
        f" On the level in still air {words.number(known.force_n.value, 1)} ±"
        f" {words.number(known.force_n.half, 1)} N hold back at"
        f" {KMH_PER_M_S * known.speed_m_s:.0f} km/h."
    )
    return textwrap.fill(text, WIDTH)


def _budget(fit: DragFit) -> str:
    large = [(c, s) for c, s in sorted(fit.budget.items(), key=lambda i: -i[1]) if s >= 0.01]
    listed = ", ".join(f"{cause} {100 * share:.0f} %" for cause, share in large)
    return textwrap.fill(f"What makes the drag area unsure (share of variance): {listed}.", WIDTH)


def _left_out(fit: DragFit) -> str:
    counts: dict[str, list[float]] = defaultdict(lambda: [0, 0.0])
    for _, mask in fit.masked:
        counts[mask.why][0] += 1
        counts[mask.why][1] += mask.to_s - mask.from_s
    if not counts:
        return "Nothing was left out."
    lines = [f"{'left out':46}{'times':>7}{'seconds':>9}"]
    for why, (times, seconds) in sorted(counts.items(), key=lambda item: -item[1][1]):
        lines.append(f"{why[:46]:46}{times:>7.0f}{seconds:>9.0f}")
    return "\n".join(lines)


def _item(text: str) -> str:
    return textwrap.fill(text, WIDTH, initial_indent="- ", subsequent_indent="  ")
