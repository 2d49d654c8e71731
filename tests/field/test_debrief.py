"""A debrief: parts that add up, a gain where it was made, numbers brought up to date."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest
from ridden_plan import ridden, with_stop, with_way_there

from pacing.errors import UnusableInputError
from pacing.field.debrief import Debrief, debrief_ride
from pacing.field.debrief_drag import race_as_learnt
from pacing.plan import plan_race


def compared(plan: Any, ride: Any, **other: Any) -> Debrief:
    """A debrief without the second plan, which most of these tests do not look at."""
    return debrief_ride(plan.race, ride, plan=plan, hindsight=False, **other)


def told(found: Debrief, key: str) -> Any:
    return next(update for update in found.updates if update.key == key)


def test_a_ride_of_the_plan_itself_debriefs_to_zero(hilly_plan: Any) -> None:
    found = compared(hilly_plan, ridden(hilly_plan))
    assert found.whole
    assert found.planned_s == pytest.approx(hilly_plan.time_s, abs=1e-6)
    assert found.difference_s == pytest.approx(0.0, abs=0.1)
    assert found.parts_s == pytest.approx(dict.fromkeys(found.parts_s, 0.0), abs=0.5)
    assert found.cues["difference_s"].to_numpy() == pytest.approx(0.0, abs=0.1)
    assert told(found, "rider.positions[0].cda_m2").value == pytest.approx(0.30, rel=0.01)
    assert found.prediction.error_pct == pytest.approx(0.0, abs=0.2)
    assert found.prediction.drag_factor == pytest.approx(1.0, abs=0.01)


@pytest.mark.parametrize(
    "changed", [{}, {"watts": (1, 10.0)}, {"cda": 1.06}, {"watts": (2, -20.0), "cda": 0.95}]
)
def test_the_parts_add_up_to_the_whole_in_every_cue_and_split(
    hilly_plan: Any, changed: dict[str, Any]
) -> None:
    ride = with_stop(ridden(hilly_plan, **changed), 300.0, 45.0)
    found = compared(hilly_plan, ride)
    assert sum(found.parts_s.values()) == pytest.approx(found.difference_s, abs=0.1)
    for table in (found.cues, found.splits):
        parts = sum(table[f"{name}_s"] for name in found.parts_s)
        assert parts.to_numpy() == pytest.approx(table["difference_s"].to_numpy(), abs=0.1)
        assert table["difference_s"].sum() == pytest.approx(found.difference_s, abs=0.1)


def test_ten_watts_more_on_one_climb_are_found_there_as_power(hilly_plan: Any) -> None:
    gradient = hilly_plan.cues["gradient_pct"].to_numpy()
    climb = int(np.argmax(gradient))
    found = compared(hilly_plan, ridden(hilly_plan, watts=(climb, 10.0)))
    gain = found.cues["power_s"].to_numpy()
    assert found.difference_s < -1.0
    assert found.parts_s["power"] == pytest.approx(found.difference_s, abs=0.5)
    assert int(np.argmin(gain)) == climb
    assert gain[climb] < 0.6 * found.difference_s
    assert found.cues["ridden_w"].iloc[climb] - found.cues["planned_w"].iloc[
        climb
    ] == pytest.approx(10.0, abs=1.5)


def test_more_drag_than_assumed_is_found_as_air_and_as_a_number_to_change(hilly_plan: Any) -> None:
    found = compared(hilly_plan, ridden(hilly_plan, cda=1.06))
    assert found.parts_s["air_and_rolling"] == pytest.approx(found.difference_s, rel=0.05)
    cda = told(found, "rider.positions[0].cda_m2")
    assert cda.value == pytest.approx(1.06 * 0.30, abs=2.0 * cda.se)
    assert cda.before == pytest.approx(0.30)


def test_a_stop_is_a_stop_and_nothing_else(hilly_plan: Any) -> None:
    found = compared(hilly_plan, with_stop(ridden(hilly_plan), 300.0, 60.0))
    assert found.parts_s["stops"] == pytest.approx(60.0, abs=1.0)
    assert found.difference_s == pytest.approx(60.0, abs=0.2)


def test_a_ride_that_begins_before_the_line_counts_from_the_line(hilly_plan: Any) -> None:
    found = compared(hilly_plan, with_way_there(ridden(hilly_plan)))
    assert found.whole
    assert found.ridden_s == pytest.approx(hilly_plan.time_s, abs=1.0)


def test_a_ride_of_half_the_course_is_compared_over_that_half(hilly_plan: Any) -> None:
    ride = ridden(hilly_plan)
    half = ride[(ride["time_s"] > 200.0) & (ride["time_s"] < 600.0)]
    found = compared(hilly_plan, half)
    assert not found.whole
    assert any("only" in note for note in found.notes)
    assert found.ridden_s == pytest.approx(400.0, abs=5.0)
    assert found.difference_s == pytest.approx(0.0, abs=0.5)
    assert sum(found.parts_s.values()) == pytest.approx(found.difference_s, abs=0.1)


def test_a_ride_somewhere_else_is_refused(hilly_plan: Any) -> None:
    ride = ridden(hilly_plan)
    ride["lat_deg"] += 0.05
    with pytest.raises(UnusableInputError, match="does not follow the course"):
        compared(hilly_plan, ride)


def test_more_power_than_critical_power_allows_raises_it(hilly_plan: Any) -> None:
    ride = ridden(hilly_plan)
    ride["power_w"] *= 1.12
    found = compared(hilly_plan, ride)
    power = told(found, "rider.critical_power_w")
    assert power.bound == "at least"
    assert power.value > hilly_plan.race.rider.critical_power_w
    assert power.se > 0.0
    assert found.ridden.balance_j.min() < 0.0


def test_hindsight_is_the_plan_of_the_race_as_it_proved_to_be(hilly_plan: Any) -> None:
    found = debrief_ride(hilly_plan.race, ridden(hilly_plan, cda=1.10), plan=hilly_plan)
    assert found.best_with_hindsight_s is not None
    assert found.planned_s < found.best_with_hindsight_s <= found.ridden_s + 0.5


def test_what_was_learnt_changes_the_race_and_nothing_learnt_changes_nothing(
    hilly_plan: Any,
) -> None:
    from pacing.field.debrief_drag import Drag
    from pacing.field.drag_unknowns import wind_beforehand

    race = hilly_plan.race
    before, _ = wind_beforehand(race, race.plan.start_clock_s)
    same = race_as_learnt(race, Drag(np.ones(1), 1.0, before))
    assert same.rider == race.rider
    assert same.bike == race.bike
    assert same.day == race.day
    other = race_as_learnt(race, Drag(np.array([1.1]), 0.9, before + np.array([1.0, 0.0])))
    area = other.drag_area(other.rider.positions[0])
    assert area.m2[0] == pytest.approx(1.1 * 0.30)
    assert other.bike.crr == pytest.approx(0.9 * race.bike.crr)
    moved, _ = wind_beforehand(other, other.plan.start_clock_s)
    assert moved - before == pytest.approx([1.0, 0.0])


def test_a_meter_that_shows_another_power_is_compared_in_what_it_shows(hilly_plan: Any) -> None:
    from pacing.race import vary

    race = vary(hilly_plan.race, {"rider.power_meter_factor": 1.02})
    plan = plan_race(race)
    ride = ridden(plan)
    ride["power_w"] /= 1.02
    found = compared(plan, ride)
    assert found.parts_s["power"] == pytest.approx(0.0, abs=0.5)
    assert found.cues["ridden_w"].to_numpy() == pytest.approx(
        found.cues["planned_w"].to_numpy(), abs=3.0
    )


def test_frames_and_files_are_the_same(hilly_plan: Any, tmp_path: Any) -> None:
    ride = ridden(hilly_plan)
    file = tmp_path / "ride.csv"
    ride.to_csv(file, index=False)
    assert isinstance(pd.read_csv(file), pd.DataFrame)
    by_file = compared(hilly_plan, file)
    by_frame = compared(hilly_plan, ride)
    assert by_file.ridden_s == pytest.approx(by_frame.ridden_s, abs=1e-3)
    assert by_file.name == "ride"


def test_wind_that_changes_with_the_hours_is_no_mistake_of_the_rider(hilly_plan: Any) -> None:
    from pacing.race import vary

    hours = [
        {
            "at": at, "temperature_c": 18.0, "pressure_hpa": 1016.0, "wind_height_m": 1.5,
            "wind_speed_m_s": speed, "wind_from_deg": way,
        }
        for at, speed, way in (("10:00", 0.5, 200.0), ("10:15", 3.0, 280.0))
    ]  # fmt: skip
    race = vary(hilly_plan.race, {"air.hours": hours, "plan.start": "10:00"})
    plan = plan_race(race)
    found = compared(plan, ridden(plan))
    assert found.parts_s == pytest.approx(dict.fromkeys(found.parts_s, 0.0), abs=0.6)
