"""The season log: every debrief once, and how well the plans have done."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest
from ridden_plan import ridden

from pacing.errors import UnusableInputError
from pacing.field.debrief import debrief_ride
from pacing.field.season import (
    COLUMNS,
    Entry,
    add_to_log,
    checked_so_far,
    entry_of,
    log_file,
    read_log,
    track_record,
)


def entry(ride: str, predicted: float, ridden_s: float, rider: str = "", **other: str) -> Entry:
    cells = dict.fromkeys(COLUMNS, "") | {
        "race": "race.toml", "ride": ride, "from_km": "0.00", "rider": rider,
        "predicted_s": str(predicted), "ridden_s": str(ridden_s), **other,
    }  # fmt: skip
    return Entry(cells)


def test_the_record_is_the_mean_and_the_size_of_what_was_off() -> None:
    log = [
        entry("a", 1000.0, 1030.0, predicted_from_power_s="1000", drag_factor="1.08"),
        entry("b", 1000.0, 1050.0, stops_s="60", predicted_from_power_s="1009.8"),
        entry("c", 1000.0, 1500.0, rider="another"),
    ]
    record = track_record(log, "")
    assert record.races == 2
    assert record.mean_pct == pytest.approx(1.0)
    assert record.typical_pct == pytest.approx(2.0)
    assert record.model_pct == pytest.approx(2.46, abs=0.01)
    assert "2 races" in record.sentence()
    assert "never been checked" in track_record(log, "a third").sentence()


def test_a_ride_debriefed_twice_counts_once(tmp_path: Path) -> None:
    file = tmp_path / "season.csv"
    assert read_log(file) == ()
    add_to_log(file, entry("a", 1000.0, 1030.0))
    add_to_log(file, entry("b", 1000.0, 1010.0))
    add_to_log(file, entry("a", 1000.0, 1020.0))
    assert [(e.cells["ride"], e.number("ridden_s")) for e in read_log(file)] == [
        ("b", 1010.0), ("a", 1020.0),
    ]  # fmt: skip
    assert sorted(p.name for p in tmp_path.iterdir()) == ["season.csv"]


def test_a_file_that_is_no_log_is_left_alone(tmp_path: Path) -> None:
    file = tmp_path / "season.csv"
    file.write_text("shopping\nmilk\n", encoding="utf-8")
    with pytest.raises(UnusableInputError, match="no column race"):
        add_to_log(file, entry("a", 1.0, 1.0))
    assert file.read_text(encoding="utf-8") == "shopping\nmilk\n"


def test_a_damaged_line_is_no_reason_to_stop(tmp_path: Path) -> None:
    file = tmp_path / "season.csv"
    add_to_log(file, entry("a", 1000.0, 1030.0))
    with file.open("a", encoding="utf-8") as out:
        out.write("half a line,race.toml\n\n")
    assert track_record(read_log(file), "").races == 1


def test_a_debrief_becomes_an_entry_and_a_plan_says_so(hilly_plan: Any) -> None:
    race = hilly_plan.race
    found = debrief_ride(race, ridden(hilly_plan, cda=1.05), plan=hilly_plan, hindsight=False)
    log_file(race).unlink(missing_ok=True)
    assert "never been checked" in checked_so_far(race)
    add_to_log(log_file(race), entry_of(found))
    (logged,) = read_log(log_file(race))
    assert logged.number("predicted_s") == pytest.approx(hilly_plan.time_s, abs=0.1)
    assert logged.number("cda_m2") == pytest.approx(0.315, abs=0.01)
    assert logged.error_pct > 0.5
    assert "1 race" in checked_so_far(race)
    log_file(race).unlink()
