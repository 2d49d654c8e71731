"""What ``pacing debrief`` says: text for the terminal, or the same as JSON."""

from __future__ import annotations

import textwrap
from typing import Any

import pandas as pd

from pacing.field.debrief import Debrief
from pacing.field.debrief_parts import PARTS
from pacing.field.debrief_predict import Prediction
from pacing.field.debrief_updates import Update
from pacing.field.season import TrackRecord
from pacing.report import words

WIDTH = 80
SCHEMA, PREDICTION_SCHEMA = "debrief/1", "prediction/1"
SAID = {
    "power": "power over or under the target",
    "air_and_rolling": "air and rolling off from assumed",
    "limits_and_braking": "limits and braking",
    "stops": "stops",
    "unexplained": "unexplained",
}
WORTH_A_LINE_S = 0.05


def debrief_document(debrief: Debrief, record: TrackRecord | None = None) -> dict[str, Any]:
    """The whole debrief as a JSON document."""
    document: dict[str, Any] = {
        "schema": SCHEMA,
        "ride": debrief.name,
        "from_km": debrief.from_m / 1000.0,
        "to_km": debrief.to_m / 1000.0,
        "whole_course": debrief.whole,
        "planned_s": debrief.planned_s,
        "ridden_s": debrief.ridden_s,
        "difference_s": debrief.difference_s,
        "parts_s": dict(debrief.parts_s),
        "cues": debrief.cues.to_dict(orient="records"),
        "splits": debrief.splits.to_dict(orient="records"),
        "best_with_hindsight_s": debrief.best_with_hindsight_s,
        "updates": [
            {
                "key": update.key,
                "value": update.value,
                "se": update.se,
                "before": update.before,
                "bound": update.bound or None,
                "worth": update.worth,
            }
            for update in debrief.updates
        ],
        "prediction": prediction_figures(debrief.prediction),
        "masked": [
            {"from_s": mask.from_s, "to_s": mask.to_s, "why": mask.why} for mask in debrief.masked
        ],
        "notes": list(debrief.notes),
        "season": None,
    }
    if record is not None:
        document["season"] = {
            "races": record.races,
            "mean_pct": record.mean_pct,
            "typical_pct": record.typical_pct,
            "model_pct": record.model_pct,
            "drag_factor": record.drag_factor,
        }
    return document


def prediction_document(prediction: Prediction, ride: str) -> dict[str, Any]:
    """A prediction check as a JSON document."""
    return {
        "schema": PREDICTION_SCHEMA,
        "ride": ride,
        **prediction_figures(prediction),
        "masked": [
            {"from_s": mask.from_s, "to_s": mask.to_s, "why": mask.why}
            for mask in prediction.masked
        ],
        "notes": list(prediction.notes),
    }


def prediction_figures(prediction: Prediction) -> dict[str, Any]:
    """The figures of a prediction check."""
    return {
        "predicted_s": prediction.predicted_s,
        "ridden_s": prediction.ridden_s,
        "stops_s": prediction.stops_s,
        "error_pct": prediction.error_pct,
        "speed_error_m_s": prediction.speed_error_m_s,
        "drag_factor": prediction.drag_factor,
        "guessed_s": prediction.guessed_s,
    }


def debrief_text(debrief: Debrief, record: TrackRecord | None = None) -> str:
    """The debrief as text within 80 columns."""
    blocks = [
        _headline(debrief),
        _parts(debrief),
        _table(debrief.cues, "cue"),
        _table(_chosen_splits(debrief.splits), "km"),
        _updates(debrief),
        "\n".join(_item(text) for text in _notes(debrief, record)),
    ]
    return "\n\n".join(block for block in blocks if block) + "\n"


def prediction_text(prediction: Prediction, ride: str) -> str:
    """A prediction check as text."""
    error = words.number(prediction.error_pct, 1, signed=True)
    lines = [
        f"{ride}: {words.clock(prediction.predicted_s)} predicted from the recorded power,"
        f" {words.clock(prediction.ridden_s)} ridden, stops left out"
        f" ({words.span(prediction.stops_s)}): {error} % of time.",
        f"Speed differs by {words.speed(prediction.speed_error_m_s)} km/h (root mean square over"
        " distance).",
    ]
    if prediction.drag_factor is not None:
        lines.append(
            f"Drag areas times {prediction.drag_factor:.3f} would have made the time right; it"
            " holds whatever else is off: wind, tyres, meter, brakes."
        )
    lines += [words.sentence(note) for note in prediction.notes]
    if prediction.guessed_s > 0.0:
        lines.append(f"Power was not recorded for {words.span(prediction.guessed_s)} and guessed.")
    return "\n".join(textwrap.fill(line, WIDTH) for line in lines) + "\n"


def _headline(debrief: Debrief) -> str:
    side = "slower" if debrief.difference_s > 0 else "faster"
    part = (
        ""
        if debrief.whole
        else (
            f" Only km {words.distance(debrief.from_m)} to {words.distance(debrief.to_m)} of the"
            " course is in the ride."
        )
    )
    text = (
        f"{words.filled(debrief.name)}: ridden in {words.clock(debrief.ridden_s)}, planned"
        f" {words.clock(debrief.planned_s)}: {words.span(abs(debrief.difference_s))} {side}.{part}"
    )
    best = debrief.best_with_hindsight_s
    if best is not None:
        moving = debrief.ridden_s - float(debrief.ridden.stop_s.sum())
        text += (
            f" With what is known now the best plan would have taken {words.clock(best)},"
            f" {words.span(abs(moving - best))} {'less' if moving > best else 'more'} than was"
            " ridden without stops."
        )
    return textwrap.fill(text, WIDTH)


def _parts(debrief: Debrief) -> str:
    lines = ["Where the time went (seconds, + slower)"]
    for name in PARTS:
        seconds = words.number(debrief.parts_s[name], 1, signed=True)
        lines.append(f"  {SAID[name]:36}{seconds:>9}")
    total = words.number(debrief.difference_s, 1, signed=True)
    lines.append(f"  {'ridden less planned':36}{total:>9}")
    return "\n".join(lines)


def _table(table: pd.DataFrame, what: str) -> str:
    head = (
        f"{'from':>6}{'to':>7}{'time':>8}{'power':>11}{'speed':>13}{'W′ left':>12}{'of which':>10}"
    )
    unit = f"{'km':>6}{'km':>7}{'± s':>8}{'W':>11}{'km/h':>13}{'kJ':>12}{'':>10}"
    rows = []
    for _, row in table.iterrows():
        largest = max(PARTS, key=lambda name, row=row: abs(row[f"{name}_s"]))  # type: ignore[misc]
        seconds = float(row[f"{largest}_s"])
        why = ""
        if abs(seconds) >= WORTH_A_LINE_S:
            why = f"{SHORT[largest]} {words.number(seconds, 1, signed=True)}"
        rows.append(
            f"{words.number(row['from_km'], 2):>6}{words.number(row['to_km'], 2):>7}"
            f"{words.number(row['difference_s'], 1, signed=True):>8}"
            f"{row['ridden_w']:>6.0f}/{row['planned_w']:<4.0f}"
            f"{row['ridden_kmh']:>7.1f}/{row['planned_kmh']:<5.1f}"
            f"{words.number(row['ridden_w_balance_kj'], 1):>6}"
            f"/{words.number(row['planned_w_balance_kj'], 1):<5}  {why}".rstrip()
        )
    title = "By cue: ridden/planned" if what == "cue" else "By kilometre: ridden/planned"
    return "\n".join([title, head.rstrip(), unit.rstrip(), *rows])


SHORT = {
    "power": "power",
    "air_and_rolling": "air, tyres",
    "limits_and_braking": "brakes",
    "stops": "stops",
    "unexplained": "unexplained",
}


def _chosen_splits(splits: pd.DataFrame) -> pd.DataFrame:
    """Few enough rows for a screen: whole kilometres joined where there are many."""
    count = len(splits)
    every = next(n for n in (1, 2, 5, 10, 20, 50, 1000) if count / n <= 12)
    if every == 1:
        return splits
    block = splits.index // every
    sums = [name for name in splits.columns if name.endswith("_s") and "elapsed" not in name]
    joined = splits.groupby(block)
    table = joined[sums].sum()
    table["from_km"], table["to_km"] = joined["from_km"].first(), joined["to_km"].last()
    length = splits["to_km"] - splits["from_km"]
    for kind in ("planned", "ridden"):
        moving = splits[f"{kind}_s"] - (splits["stops_s"] if kind == "ridden" else 0.0)
        work = (splits[f"{kind}_w"] * moving).groupby(block).sum()
        table[f"{kind}_w"] = work / moving.groupby(block).sum()
        table[f"{kind}_kmh"] = 3600.0 * length.groupby(block).sum() / table[f"{kind}_s"]
        name = f"{kind}_w_balance_kj"
        table[name] = joined[name].last()
    return table


def _updates(debrief: Debrief) -> str:
    if not debrief.updates:
        return ""
    lines = ["Numbers to bring up to date (± one standard error)"]
    for update in debrief.updates:
        lines.append(_update(update))
    return "\n".join(lines)


def _update(update: Update) -> str:
    digits = 5 if update.key == "bike.crr" else 4 if update.key.endswith("_m2") else 1
    digits = 2 if update.key.endswith("_m_s") else digits
    value = words.number(update.value, digits)
    bound = f"{update.bound} " if update.bound else ""
    text = (
        f"  {update.key:28}{bound}{value} ± {words.number(update.se, digits)}"
        f"  was {words.number(update.before, digits)}"
    )
    return text if update.worth else f"{text}, told too poorly to change it"


def _notes(debrief: Debrief, record: TrackRecord | None) -> list[str]:
    prediction = debrief.prediction
    said = [
        f"From the recorded power the model gives {words.clock(prediction.predicted_s)} without"
        f" stops, {words.number(prediction.error_pct, 1, signed=True)} % of the ridden time"
        + (
            "."
            if prediction.drag_factor is None
            else f"; drag areas times {prediction.drag_factor:.3f} would have made that right."
        )
    ]
    if not any(update.key == "rider.critical_power_w" for update in debrief.updates):
        least = float(debrief.ridden.balance_j.min()) / 1000.0
        said.append(
            f"W′ left never fell below {words.number(least, 1)} kJ: the ride does not show that"
            " critical power is higher."
        )
    if record is not None:
        said.append(record.sentence())
    said += [words.sentence(note) for note in debrief.notes]
    counts: dict[str, float] = {}
    for mask in debrief.masked:
        counts[mask.why] = counts.get(mask.why, 0.0) + mask.to_s - mask.from_s
    if counts:
        listed = ", ".join(f"{why} {seconds:.0f} s" for why, seconds in counts.items())
        said.append(f"Left out of the fit or filled in: {listed}.")
    return said


def _item(text: str) -> str:
    return textwrap.fill(text, WIDTH, initial_indent="- ", subsequent_indent="  ")
