"""The season log: what every debrief predicted and what was ridden, and how well that agrees."""

from __future__ import annotations

import csv
import io
import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import date
from pathlib import Path

import numpy as np

from pacing.errors import UnusableInputError
from pacing.field.debrief import Debrief
from pacing.race import Race

LOG_NAME = "season.csv"
COLUMNS = (
    "date", "race", "course", "rider", "ride", "from_km", "to_km", "predicted_s", "ridden_s",
    "stops_s", "predicted_from_power_s", "drag_factor", "cda_m2", "cda_se_m2", "crr",
    "critical_power_w", "best_with_hindsight_s",
)  # fmt: skip
MOST_BYTES = 5_000_000
FEW = 3


@dataclass(frozen=True)
class Entry:
    """One debrief in the log: its cells by column; numbers where a column holds them."""

    cells: Mapping[str, str]

    def number(self, column: str) -> float:
        """The number in a column, NaN where there is none."""
        try:
            return float(self.cells.get(column) or "nan")
        except ValueError:
            return float("nan")

    @property
    def key(self) -> tuple[str, str, str]:
        """What tells one debrief from another: race, ride and the part that was ridden."""
        return (self.cells["race"], self.cells["ride"], self.cells["from_km"])

    @property
    def error_pct(self) -> float:
        """Ridden time, stops left out, less the predicted, in percent of the predicted."""
        ridden = self.number("ridden_s") - np.nan_to_num(self.number("stops_s"))
        return float(100.0 * (ridden / self.number("predicted_s") - 1.0))

    @property
    def model_error_pct(self) -> float:
        """Time predicted from the recorded power less the ridden, in percent of the ridden."""
        ridden = self.number("ridden_s") - np.nan_to_num(self.number("stops_s"))
        return float(100.0 * (self.number("predicted_from_power_s") / ridden - 1.0))


@dataclass(frozen=True)
class TrackRecord:
    """How well plans for a rider have predicted so far, over ``races`` debriefed races.

    ``mean_pct`` is the mean of ridden less planned time in percent of the planned, stops left
    out; ``typical_pct`` the mean size of it; ``model_pct`` the same size for the model ridden
    with the recorded power; ``drag_factor`` the median of what would have made that right.
    """

    races: int
    mean_pct: float
    typical_pct: float
    model_pct: float
    drag_factor: float

    def sentence(self) -> str:
        """What a plan should say of it."""
        if self.races == 0:
            return (
                "This rider's plans have never been checked against a ride: debrief an old race"
                " first (pacing debrief RACE.toml RIDE)."
            )
        races = "1 race" if self.races == 1 else f"{self.races} races"
        side = "longer" if self.mean_pct > 0 else "shorter"
        text = (
            f"Checked against {races} of this rider: ridden {abs(self.mean_pct):.1f} % {side} than"
            f" planned on average, off by {self.typical_pct:.1f} % either way"
        )
        if np.isfinite(self.model_pct):
            text += f"; from the recorded power the time came out within {self.model_pct:.1f} %"
        few = " So few races say little." if self.races < FEW else ""
        return f"{text}.{few}"


def log_file(race: Race) -> Path:
    """Where the log of a race stands: beside the race file."""
    return race.file.parent / LOG_NAME


def rider_of(race: Race) -> str:
    """What the rider is called by: the file named under ``[rider]``, empty without one."""
    try:
        table = tomllib.loads(race.file.read_text(encoding="utf-8-sig"))
    except (OSError, ValueError):
        return ""
    rider = table.get("rider")
    named = rider.get("file") if isinstance(rider, dict) else None
    return Path(named).stem if isinstance(named, str) else ""


def read_log(file: Path) -> tuple[Entry, ...]:
    """The entries of a log; none where there is no file.

    Raises `UnusableInputError` for a file that is no log of ours.
    """
    try:
        if file.stat().st_size > MOST_BYTES:
            raise UnusableInputError("too large for a season log", file=file)
        text = file.read_text(encoding="utf-8-sig")
    except FileNotFoundError:
        return ()
    except (OSError, UnicodeDecodeError) as problem:
        raise UnusableInputError(f"cannot be read ({problem})", file=file) from None
    rows = csv.reader(io.StringIO(text, newline=""))
    try:
        header = next(rows, [])
        found = [
            Entry(dict(zip(header, row, strict=False))) for row in rows if any(map(str.strip, row))
        ]
    except csv.Error as problem:
        raise UnusableInputError(
            f"not a CSV table ({problem})", file=file, line=rows.line_num
        ) from None
    missing = [name for name in ("race", "ride", "predicted_s", "ridden_s") if name not in header]
    if header and missing:
        raise UnusableInputError(
            f"no column {missing[0]}",
            file=file,
            line=1,
            expected="a season log written by pacing debrief",
            mend="move the file away, or name another with --season",
        )
    return tuple(Entry({**dict.fromkeys(COLUMNS, ""), **entry.cells}) for entry in found)


def entry_of(debrief: Debrief, on: date | None = None) -> Entry:
    """The log's entry for a debrief; the date is the ride's own, else ``on``, else today."""
    race, ridden = debrief.plan.race, debrief.ridden
    start = debrief.recording.start
    day = start.date() if start is not None else (on or date.today())
    cda = next((u for u in debrief.updates if u.key.endswith("cda_m2")), None)
    crr = next((u for u in debrief.updates if u.key == "bike.crr"), None)
    power = next((u for u in debrief.updates if u.key == "rider.critical_power_w"), None)
    values: dict[str, object] = {
        "date": day.isoformat(),
        "race": race.file.name,
        "course": race.course.name,
        "rider": rider_of(race),
        "ride": debrief.name,
        "from_km": f"{debrief.from_m / 1000.0:.2f}",
        "to_km": f"{debrief.to_m / 1000.0:.2f}",
        "predicted_s": f"{debrief.planned_s:.1f}",
        "ridden_s": f"{debrief.ridden_s:.1f}",
        "stops_s": f"{float(ridden.stop_s.sum()):.1f}",
        "predicted_from_power_s": f"{debrief.prediction.predicted_s:.1f}",
        "drag_factor": _text(debrief.prediction.drag_factor, 4),
        "cda_m2": _text(cda.value if cda else None, 4),
        "cda_se_m2": _text(cda.se if cda else None, 4),
        "crr": _text(crr.value if crr else None, 5),
        "critical_power_w": _text(power.value if power else race.rider.critical_power_w, 1),
        "best_with_hindsight_s": _text(debrief.best_with_hindsight_s, 1),
    }
    return Entry({name: str(values[name]) for name in COLUMNS})


def _text(value: float | None, digits: int) -> str:
    return "" if value is None else f"{value:.{digits}f}"


def add_to_log(file: Path, entry: Entry) -> None:
    """Put an entry into a log; a debrief of the same ride is replaced, not counted twice.

    Written beside and swapped in. Raises `UnusableInputError` where that is not possible.
    """
    kept = [old for old in read_log(file) if old.key != entry.key]
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(COLUMNS)
    for each in [*kept, entry]:
        writer.writerow([each.cells.get(name, "") for name in COLUMNS])
    beside = file.with_name(f".{file.name}.part")
    try:
        beside.write_text(out.getvalue(), encoding="utf-8")
        beside.replace(file)
    except OSError as problem:
        raise UnusableInputError(
            f"cannot be written ({problem.strerror})", file=file, key="--season"
        ) from None
    finally:
        beside.unlink(missing_ok=True)


def track_record(entries: Sequence[Entry], rider: str) -> TrackRecord:
    """How well plans have predicted so far, of one rider (by `rider_of`)."""
    own = [entry for entry in entries if entry.cells.get("rider", "") == rider]
    errors = np.array([entry.error_pct for entry in own])
    errors = errors[np.isfinite(errors)]
    model = np.array([entry.model_error_pct for entry in own])
    factors = np.array([entry.number("drag_factor") for entry in own])
    model, factors = model[np.isfinite(model)], factors[np.isfinite(factors)]
    return TrackRecord(
        races=int(errors.size),
        mean_pct=float(errors.mean()) if errors.size else float("nan"),
        typical_pct=float(np.abs(errors).mean()) if errors.size else float("nan"),
        model_pct=float(np.abs(model).mean()) if model.size else float("nan"),
        drag_factor=float(np.median(factors)) if factors.size else float("nan"),
    )


def checked_so_far(race: Race) -> str:
    """One sentence for a plan: whether it was ever checked, and how well it has predicted."""
    try:
        entries = read_log(log_file(race))
    except UnusableInputError as problem:
        return f"How well plans have predicted so far cannot be told: {problem}"
    return track_record(entries, rider_of(race)).sentence()
