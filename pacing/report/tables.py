"""The plan as the terminal shows it: plain aligned text within 80 columns."""

from __future__ import annotations

import textwrap
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from pacing.field.season import checked_so_far
from pacing.report import words
from pacing.report.words import Units

if TYPE_CHECKING:
    import pandas as pd

    from pacing.plan.plan import Plan

WIDTH = 80
MOST_SPLITS = 8
MOST_SLOW_PLACES = 8
MERGED_M = 200.0


def plan_text(plan: Plan) -> str:
    """The whole plan as text: what to expect, what to ride where, splits, slow places, cautions."""
    units = words.units_named(plan.race.plan.units)
    blocks = [
        _wrapped(title(plan, units)),
        "\n".join(
            _wrapped(sentence) for sentence in (*summary(plan, units), checked_so_far(plan.race))
        ),
        _cues(plan, units),
        "\n".join(_wrapped(sentence) for sentence in positions(plan, units)),
        _splits(plan, units),
        _slow_places(plan, units),
        "\n".join(_wrapped(caution, "- ", "  ") for caution in cautions(plan)),
    ]
    return "\n\n".join(block for block in blocks if block) + "\n"


def cautions(plan: Plan) -> tuple[str, ...]:
    """What must be said with every plan, then what this one gives cause to say."""
    return tuple(dict.fromkeys(map(words.sentence, (*words.CAUTIONS, *plan.cautions))))


def title(plan: Plan, units: Units) -> str:
    """Course, length and start in one line."""
    return f"{words.filled(plan.race.course.name) or 'course'}, {ridden(plan, units)}"


def ridden(plan: Plan, units: Units) -> str:
    """Length of the course, with its laps where there are several, and the start."""
    course = plan.race.course
    text = f"{words.distance(course.length_m, units, 2)} {units.distance}"
    text = text if course.laps == 1 else f"{text} in {course.laps} laps"
    start = plan.race.plan.start_clock_s
    return text if start is None else f"{text}, start {words.day_clock(start)}"


def mean_power_w(plan: Plan) -> float:
    """Mean power over time (W), as the rider's meter shows it."""
    trace = plan.trace
    return float(np.average(trace["power_w"], weights=trace["time_s"])) / _meter(plan)


def work_j(plan: Plan) -> float:
    """Work (J), as the rider's meter counts it."""
    trace = plan.trace
    return float(np.dot(trace["power_w"], trace["time_s"])) / _meter(plan)


def _meter(plan: Plan) -> float:
    return float(plan.race.rider.power_meter_factor)


def summary(plan: Plan, units: Units) -> tuple[str, ...]:
    """What to expect, one sentence each: finish, work, gain, W′."""
    finish = (
        f"Finish in {words.clock(plan.time_s)} at a mean of {words.number(mean_power_w(plan))} W,"
        f" {words.number(work_j(plan) / 1000)} kJ of work,"
        f" {words.speed(plan.race.course.length_m / plan.time_s, units)} {units.speed}."
    )
    return (finish, gain(plan.time_s, plan.constant), lowest(plan, units))


def gain(time_s: float, constant: Mapping[str, Any] | None) -> str:
    """What the plan is worth against the best constant target."""
    if constant is None:
        return "No constant target keeps the reserve here, so there is none to compare with."
    ahead = float(constant["time_s"]) - time_s
    share = words.number(100 * abs(ahead) / float(constant["time_s"]), 1)
    than = f"than the best constant target, {words.number(constant['power_w'])} W,"
    side = "faster" if ahead >= 0 else "slower"
    return (
        f"{words.span(abs(ahead))} ({share} %) {side} {than} which keeps the same reserve"
        " under the same limits."
    )


def lowest(plan: Plan, units: Units) -> str:
    """Where W′ left is least, against the reserve."""
    trace = plan.trace
    cell = int(np.argmin(trace["w_balance_to_j"].to_numpy()))
    left_kj = float(trace["w_balance_to_j"].iloc[cell]) / 1000
    return (
        f"{words.W_LEFT} is lowest at {words.place(float(trace['to_m'].iloc[cell]), units)}:"
        f" {words.number(left_kj, 1)} kJ, of which"
        f" {words.number(plan.race.plan.reserve_j / 1000, 1)} kJ is the reserve."
    )


def positions(plan: Plan, units: Units) -> tuple[str, ...]:
    """Where sitting up is faster and what changing is worth; nothing with one position."""
    found = plan.positions
    if found is None:
        return ()
    lower, upper = words.filled(found["lower"]), words.filled(found["upper"])
    lines = [f"At the same effort {upper} is faster nowhere."]
    if found["crossover_kmh"] is not None:
        lines = [
            f"At an effort of {words.number(found['effort_w'])} W, in calm air, {upper} is faster"
            f" than {lower} below {words.speed(found['crossover_kmh'] / 3.6, units)}"
            f" {units.speed}, on gradients above"
            f" {words.number(found['crossover_gradient_pct'], 1)} %."
        ]
    if found["worth_s"] is not None and found["changes"]:
        lines.append(
            f"Changing position gains {words.span(max(0.0, found['worth_s']))} on"
            f" {words.filled(found['best_single'])} all the way."
        )
    if found["break_even_share"] is not None:
        cost = 100.0 * (1.0 - found["break_even_share"] / found["upper_power_share"])
        lines.append(
            f"All the way, {lower} is faster here than {upper} as long as it costs less than"
            f" {words.number(cost, 1)} % of power (power_share"
            f" {words.number(found['break_even_share'], 3)})."
        )
    return tuple(lines)


def _cues(plan: Plan, units: Units) -> str:
    several = plan.cues["position"].nunique() > 1
    names = [words.filled(name) for name in plan.cues["position"]]
    wide = min(12, max(map(len, names), default=0)) if several else 0
    seen_wide = 35 - (wide + 2 if several else 0)
    head = f"{'from':>6}  {'what you see there':{seen_wide}}"
    unit = f"{units.distance:>6}  {'':{seen_wide}}"
    if several:
        head, unit = f"{head}  {'position':{wide}}", f"{unit}  {'':{wide}}"
    head += f"{'power':>8}{'speed':>8}{'clock':>10}{words.W_LEFT:>9}"
    unit += f"{'W':>8}{units.speed:>8}{'h:mm:ss':>10}{'kJ':>9}"
    lines = [head, unit]
    digits = words.cue_digits(plan.cues, units)
    for name, (_, cue) in zip(names, cues_as_said(plan).iterrows(), strict=True):
        at_m = 1000 * float(cue["from_km"])
        seen = _cut(words.seen_beside(cue, units), seen_wide)
        line = f"{words.distance(at_m, units, digits):>6}  {seen}"
        if several:
            line += f"  {_cut(name, wide)}"
        pace = words.speed(float(cue["speed_kmh"]) / 3.6, units)
        line += f"{cue['power_w']:>8.0f}{pace:>8}{cue['clock']:>10}"
        lines.append(line + f"{words.number(cue['w_balance_kj'], 1):>9}")
    finish = (
        f"{words.distance(plan.race.course.length_m, units, digits):>6}  {'finish':{seen_wide}}"
    )
    finish += " " * ((wide + 2 if several else 0) + 16)
    left = float(plan.trace["w_balance_to_j"].iloc[-1]) / 1000
    lines.append(f"{finish}{words.clock(plan.time_s):>10}{words.number(left, 1):>9}")
    return "\n".join(line.rstrip() for line in lines)


def _splits(plan: Plan, units: Units) -> str:
    table = plan.splits
    if len(table) < 2:
        return ""
    whole = table["at_km"].to_numpy().round(6)
    every = next(n for n in (1, 2, 5, 10, 20, 25, 50, 100, 1000) if whole[-1] / n <= MOST_SPLITS)
    chosen = table[whole % every == 0]
    rows = [
        f"{words.distance(1000 * km, units):>6}{words.clock(s):>10}{words.number(kj, 1):>9}"
        for km, s, kj in chosen[["at_km", "elapsed_s", "w_balance_kj"]].itertuples(index=False)
    ]
    head = f"{'at ' + units.distance:>6}{'clock':>10}{words.W_LEFT + ' kJ':>12}"
    return "\n".join(["Splits", f"{head}", *(f"{row[:16]}{row[16:]:>12}" for row in rows)])


def cues_as_said(plan: Plan) -> pd.DataFrame:
    """The cues, with the speed (m/s) of a limit that holds one back for most of its time."""
    trace = plan.trace
    at_limit, _ = _at_limit(trace)
    time, speed = trace["time_s"].to_numpy(), trace["speed_to_m_s"].to_numpy()
    starts = np.searchsorted(trace["from_m"], plan.cues["from_m"].to_numpy() - 1e-6)
    held = np.add.reduceat(np.where(at_limit, time, 0.0), starts)
    fast = np.maximum.reduceat(np.where(at_limit, speed, 0.0), starts)
    return plan.cues.assign(
        held_m_s=np.where(held > 0.5 * np.add.reduceat(time, starts), fast, np.nan)
    )


def _at_limit(trace: pd.DataFrame) -> tuple[np.ndarray, np.ndarray]:
    """Which cells end at their limit of speed, and the speed there."""
    speed = trace["speed_to_m_s"].to_numpy()
    limit = trace["speed_limit_to_m_s"].to_numpy()
    return np.isfinite(limit) & (speed >= limit * (1 - 1e-6)), speed


def slow_places(trace: pd.DataFrame) -> list[tuple[float, float, float]]:
    """Stretches ridden at a limit of speed: from (m), to (m), lowest speed (m/s)."""
    at_limit, speed = _at_limit(trace)
    edge = np.flatnonzero(np.diff(np.concatenate([[0], at_limit.astype(int), [0]])))
    from_m, to_m = trace["from_m"].to_numpy(), trace["to_m"].to_numpy()
    found: list[tuple[float, float, float]] = []
    for a, b in zip(edge[::2], edge[1::2], strict=True):
        begin, end, least = float(from_m[a]), float(to_m[b - 1]), float(speed[a:b].min())
        if found and begin - found[-1][1] <= MERGED_M:
            begin, _, before = found.pop()
            least = min(before, least)
        found.append((begin, end, least))
    return found


def _slow_places(plan: Plan, units: Units) -> str:
    places = slow_places(plan.trace)
    if not places:
        return ""
    kept = sorted(sorted(places, key=lambda item: item[2])[:MOST_SLOW_PLACES])
    lines = ["Where the road or your own limit holds the speed, not your power"]
    for from_m, to_m, least in kept:
        why = [s.note for s in plan.race.course.slow_points if from_m - 20 <= s.at_m <= to_m + 20]
        note = f", {words.filled(why[0])}" if why and words.filled(why[0]) else ""
        where = f"{words.distance(from_m, units, 2)} to {words.distance(to_m, units, 2)}"
        pace = f"no faster than {words.speed(least, units, 0)} {units.speed}"
        lines.append(_cut(f"  {units.distance} {where}: {pace}{note}", WIDTH).rstrip())
    if len(places) > len(kept):
        lines.append(f"  and {len(places) - len(kept)} less slow: see trace.csv")
    return "\n".join(lines)


def _cut(text: str, width: int) -> str:
    """``text`` padded to ``width``, or cut there with an ellipsis."""
    return f"{text:{width}}" if len(text) <= width else f"{text[: width - 1]}…"


def _wrapped(text: str, first: str = "", rest: str = "") -> str:
    return textwrap.fill(text, WIDTH, initial_indent=first, subsequent_indent=rest)
