"""The plan as the terminal shows it."""

from __future__ import annotations

import pytest

from pacing.report import tables, words


@pytest.mark.parametrize("cues", [1, 6, 16, 40])
@pytest.mark.parametrize("positions", [1, 2])
def test_no_line_is_wider_than_80_columns(make_plan, cues, positions):
    plan = make_plan(
        cues=cues,
        positions=positions,
        long_names=True,
        length_m=175_350.0,
        name="Round of the seven reservoirs and the windy plateau, clockwise and once more",
        cautions=("The road is narrow and full of sheep; " * 4,),
    )
    lines = tables.plan_text(plan).splitlines()
    assert max(map(len, lines)) <= 80
    assert all(line == line.rstrip() for line in lines)


def test_every_cue_has_a_line_with_power_clock_and_w_left(make_plan):
    plan = make_plan()
    lines = tables.plan_text(plan).splitlines()
    for _, cue in plan.cues.iterrows():
        [line] = [text for text in lines if f" {cue['clock']} " in text and "%" not in text[:6]]
        assert line.split()[0] == f"{cue['from_km']:.2f}"
        assert f" {cue['power_w']} " in line
        assert line.endswith(f"{cue['w_balance_kj']:.1f}")


def test_the_summary_gives_finish_mean_power_work_and_gain(make_plan):
    plan = make_plan()
    text = " ".join(tables.plan_text(plan).split())
    # Work is power times time, mean power work over time: summed here cell by cell.
    joules = sum(plan.trace["power_w"] * plan.trace["time_s"])
    assert f"Finish in {words.clock(plan.time_s)}" in text
    assert f"a mean of {joules / plan.time_s:.0f} W" in text
    assert f"{joules / 1000:.0f} kJ of work" in text
    ahead = plan.constant["time_s"] - plan.time_s
    assert f"{ahead:.1f} s ({100 * ahead / plan.constant['time_s']:.1f} %) faster" in text


def test_mean_power_is_told_as_the_riders_meter_shows_it(make_plan):
    plan = make_plan()
    true_w = tables.mean_power_w(plan)
    plan.race.rider.power_meter_factor = 1.02
    assert tables.mean_power_w(plan) == pytest.approx(true_w / 1.02)


def test_a_plan_without_a_constant_target_says_so(make_plan):
    text = tables.plan_text(make_plan(constant=False))
    assert "No constant target keeps the reserve" in text


def test_a_plan_slower_than_the_constant_target_is_not_called_faster():
    assert "slower than" in tables.gain(1010.0, {"time_s": 1000.0, "power_w": 300.0})


def test_slow_places_are_named_with_speed_and_note(make_plan):
    text = tables.plan_text(make_plan(shape="out and back", length_m=16_100.0))
    assert "no faster than 15 km/h, dead turn" in text


def test_a_cue_spent_mostly_at_a_limit_names_the_limit(make_plan):
    plan = make_plan(cues=4)
    first = plan.trace["from_m"] < plan.cues["to_m"].iloc[0]
    plan.trace.loc[first, "speed_limit_to_m_s"] = plan.trace.loc[first, "speed_to_m_s"]
    said = tables.cues_as_said(plan)["held_m_s"].to_numpy()
    assert said[0] == plan.trace.loc[first, "speed_to_m_s"].max()
    assert not (said[1:] > 0).any()
    assert "start, at most" in tables.plan_text(plan)


def test_splits_are_few_and_at_whole_kilometres(make_plan):
    for length_m in (900.0, 9_000.0, 40_000.0, 175_350.0):
        text = tables.plan_text(make_plan(length_m=length_m, cues=6))
        block = text.split("Splits\n")[1].split("\n\n")[0] if "Splits" in text else ""
        rows = block.splitlines()[1:]
        assert len(rows) <= 8
        assert all(float(row.split()[0]) % 1 == 0 for row in rows)


def test_cautions_stand_once_each(make_plan):
    text = tables.plan_text(make_plan(cautions=(words.CAUTIONS[0], "Mind the sheep.")))
    said = " ".join(text.split())
    for caution in (*words.CAUTIONS, "Mind the sheep."):
        assert said.count(caution) == 1


def test_imperial_units_print_miles_and_mph_and_no_kilometres(make_plan):
    text = tables.plan_text(make_plan(units="imperial"))
    assert "24.85 mile" in text
    assert "mph" in text
    assert "km" not in text
