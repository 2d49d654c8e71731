"""Drag from rides: exact without noise, honest about what a ride cannot tell."""

from __future__ import annotations

import tomllib
from dataclasses import replace
from typing import Any

import numpy as np
import pandas as pd
import pytest
from ridden_plan import ridden
from ridden_truth import Errors, Truth, coasts, loops, recorded, runs

from pacing.errors import UnusableInputError
from pacing.field.drag_fit import fit_drag, fit_rides
from pacing.field.drag_groups import Where, positions_from
from pacing.plan import plan_race
from pacing.race import vary

QUIET = Errors(
    meter=0.0, mass_kg=0.0, density=0.0, speed=0.0, height_scale=0.0, drift_m_per_s=0.0,
    tilt=0.0, height_m=0.0, wander_m=0.0, power_noise=0.0, speed_noise_m_s=0.0, wind_m_s=0.0,
)  # fmt: skip
SURE = {"uncertainty.wind_speed_m_s": 0.0, "uncertainty.wind_at_rider_pct": 0.0}


@pytest.mark.parametrize(
    ("ride_out", "heights", "method"),
    [(loops, True, "energy balance"), (runs, False, "steady runs"), (coasts, False, "coast-downs")],
)
def test_noise_free_rides_give_the_truth_back_by_the_method_they_suggest(
    calm_race: Any, ride_out: Any, heights: bool, method: str
) -> None:
    truth = Truth(4, 7, calm_race, QUIET)
    for i, ride in enumerate(recorded(truth, ride_out(truth), heights=heights)):
        fit = fit_rides([ride], vary(calm_race, SURE))
        assert fit.method == method
        assert fit.separable
        assert fit.cda_m2 == pytest.approx(truth.cda[i], rel=0.015)
        assert fit.crr == pytest.approx(truth.crr[i], rel=0.04)


def moved_by(race: Any, wind_m_s: float, **test: Any) -> float:
    """Relative change of the drag area when a wind blows along that the fit takes as none."""
    truth = Truth(1, 3, race, QUIET)
    along = np.array([np.sin(np.radians(50.0)), np.cos(np.radians(50.0))])
    for name, value in {
        "east": wind_m_s * along[:1], "north": wind_m_s * along[1:],
        "cda": np.array([0.30]), "crr": np.array([0.005]),
    }.items():  # fmt: skip
        object.__setattr__(truth, name, value)
    (ride,) = recorded(truth, runs(truth, **test), heights=False)
    return fit_rides([ride], vary(race, SURE), method="steady runs").cda_m2 / 0.30 - 1.0


def test_half_a_metre_a_second_of_wind_moves_a_one_way_test_by_a_tenth(calm_race: Any) -> None:
    # Roa 2021, Sports Biomech (second hand): 0.5 m/s of unmodelled wind moves CdA by about 10 %.
    # At one speed v that is 2 w/v; a range of speeds leaves half of it to Crr.
    one_speed = {"levels": (10.0,), "repeats": 5, "both_ways": False}
    assert moved_by(calm_race, 0.5, **one_speed) == pytest.approx(0.10, abs=0.03)
    assert moved_by(calm_race, 0.5, both_ways=False) == pytest.approx(0.05, abs=0.015)


def test_both_ways_the_same_wind_moves_it_by_far_less(calm_race: Any) -> None:
    still = moved_by(calm_race, 0.0, levels=(10.0,), repeats=5)
    assert abs(moved_by(calm_race, 0.5, levels=(10.0,), repeats=5) - still) < 0.01
    assert abs(moved_by(calm_race, 0.5) - moved_by(calm_race, 0.0)) < 0.01


def test_one_way_the_interval_admits_the_wind_and_says_what_to_ride(calm_race: Any) -> None:
    truth = Truth(1, 3, calm_race, Errors(wind_m_s=1.0))
    one, two = (
        recorded(truth, runs(truth, both_ways=both), heights=False)[0] for both in (False, True)
    )
    wide, narrow = (fit_rides([ride], calm_race) for ride in (one, two))
    assert wide.cda_low_m2 <= truth.cda[0] <= wide.cda_high_m2
    assert wide.cda.half > 1.5 * narrow.cda.half
    assert wide.budget["wind"] > 2.0 * narrow.budget["wind"]
    assert not wide.wind[0].estimated
    assert any("both directions" in warning for warning in wide.warnings)


def test_laps_tell_the_wind(calm_race: Any) -> None:
    truth = Truth(1, 11, calm_race, replace(QUIET, wind_m_s=2.0))
    (ride,) = recorded(truth, loops(truth))
    wind = fit_rides([ride], calm_race).wind[0]
    assert wind.estimated
    assert wind.from_deg is not None
    blown = wind.speed_m_s * np.array(
        [np.sin(np.radians(wind.from_deg)), np.cos(np.radians(wind.from_deg))]
    )
    assert blown == pytest.approx([truth.east[0], truth.north[0]], abs=0.25)


def test_one_speed_cannot_tell_drag_from_rolling_and_says_what_is_known(calm_race: Any) -> None:
    truth = Truth(1, 5, calm_race, Errors(wind_m_s=0.0, power_noise=0.2))
    (ride,) = recorded(truth, runs(truth, levels=(9.0,), repeats=10), heights=False)
    fit = fit_rides([ride], calm_race)
    assert not fit.separable
    assert fit.known.crr_per_m2 < 0.0
    weight = calm_race.mass_kg * 9.80665
    speed = fit.known.speed_m_s
    half_density = 0.5 * float(calm_race.day.density_kg_m3(0.0, 0.0))
    held = half_density * truth.cda[0] * speed**2 + truth.crr[0] * weight
    assert fit.known.force_n.low <= held <= fit.known.force_n.high
    assert fit.known.force_n.half < 0.08 * held
    assert any("slower and faster" in warning for warning in fit.warnings)
    assert fit.crr_low <= truth.crr[0] <= fit.crr_high


def test_positions_by_lap_are_compared_in_pairs_more_surely_than_each_by_itself(
    calm_race: Any,
) -> None:
    errors = Errors(wind_m_s=1.0)
    truth = Truth(1, 21, calm_race, errors)
    upright = Truth(1, 21, calm_race, errors)
    object.__setattr__(upright, "cda", truth.cda + 0.04)
    rides = []
    for lap, t in enumerate((truth, upright), 1):
        (ride,) = recorded(t, runs(t), heights=False)
        lapped = replace(ride.recording, lap=np.full(ride.time_s.size, float(lap)))
        rides.append(replace(ride, recording=lapped))
    where = {"low": Where(laps=(1.0,)), "upright": Where(laps=(2.0,))}
    fit = fit_rides(rides, calm_race, positions=where)
    assert [p.name for p in fit.positions] == ["low", "upright"]
    (difference,) = fit.differences
    assert difference.cda_m2.low <= 0.04 <= difference.cda_m2.high
    assert difference.cda_m2.half < 1.4 * fit.positions[0].cda_m2.half
    assert difference.cda_m2.low > 0.0


def test_positions_are_asked_for_in_words() -> None:
    found = positions_from(["aero bars=lap 1,3", "upright=0-600,900-1200", "aero bars=lap 5"])
    assert found["aero bars"].laps == (1.0, 3.0, 5.0)
    assert found["upright"].windows_s == ((0.0, 600.0), (900.0, 1200.0))
    for wrong in ("aero bars", "x=lap one", "x=600", "x=900-600", "=lap 1"):
        with pytest.raises(UnusableInputError, match="--position"):
            positions_from([wrong])


def test_a_position_never_ridden_is_an_error(calm_race: Any) -> None:
    truth = Truth(1, 1, calm_race, QUIET)
    (ride,) = recorded(truth, runs(truth), heights=False)
    with pytest.raises(UnusableInputError, match="nothing ridden in position 'low'"):
        fit_rides([ride], calm_race, positions={"low": Where(laps=(9.0,))})


def test_the_budget_adds_up_and_names_what_makes_it_unsure(calm_race: Any) -> None:
    truth = Truth(1, 9, calm_race)
    (ride,) = recorded(truth, runs(truth), heights=False)
    fit = fit_rides([ride], calm_race)
    assert sum(fit.budget.values()) == pytest.approx(1.0)
    assert min(fit.budget.values()) >= 0.0
    poor = fit_rides([ride], vary(calm_race, {"uncertainty.power_meter_pct": 5.0}))
    assert poor.budget["power meter"] > 0.5
    assert poor.cda.half > fit.cda.half
    assert any("meter" in warning for warning in poor.warnings)


def test_the_fragment_is_what_a_race_file_takes(calm_race: Any) -> None:
    truth = Truth(1, 9, calm_race)
    (ride,) = recorded(truth, runs(truth), heights=False)
    fit = fit_rides([ride], calm_race)
    table = tomllib.loads(fit.fragment)
    assert table["rider"]["positions"][0]["cda_m2"] == pytest.approx(fit.cda_m2, abs=1e-4)
    assert table["rider"]["positions"][0]["cda_convention"] == "road"
    assert table["bike"]["wheel_rotation_m2"] == 0.0
    assert {"drivetrain_efficiency", "power_measured_at", "crr"} <= set(table["bike"])
    race = vary(
        calm_race,
        {
            'rider.positions."drops".cda_m2': table["rider"]["positions"][0]["cda_m2"],
            "bike.crr": table["bike"]["crr"],
            **{f"uncertainty.{key}": value for key, value in table["uncertainty"].items()},
        },
    )
    assert race.uncertainty.cda_pct > 0.0


def test_the_height_misfit_stays_in_its_band_and_shows_a_bad_stretch(calm_race: Any) -> None:
    truth = Truth(1, 13, calm_race)
    (ride,) = recorded(truth, loops(truth))
    (misfit,) = fit_rides([ride], calm_race).misfit
    known = np.isfinite(misfit.height_m)
    inside = np.abs(misfit.height_m) <= misfit.band_m
    assert inside[known].mean() > 0.7
    # a rider on the brakes, or behind another, for two minutes: 60 W that go nowhere
    power = ride.power_w.copy()
    power[900:1020] += 60.0
    (bad,) = fit_rides([replace(ride, power_w=power)], calm_race).misfit
    assert np.nanmax(np.abs(bad.height_m)) > 1.5 * np.nanmax(np.abs(misfit.height_m))


def test_the_bike_s_own_yaw_table_is_taken_off(calm_race: Any) -> None:
    truth = Truth(1, 7, calm_race, QUIET)
    (ride,) = recorded(truth, runs(truth), heights=False)
    yawed = vary(
        calm_race, {**SURE, "bike.cda_by_yaw": {"yaw_deg": [0, 10], "delta_m2": [0.02, 0.02]}}
    )
    plain = fit_rides([ride], vary(calm_race, SURE))
    assert fit_rides([ride], yawed).cda_m2 == pytest.approx(plain.cda_m2 - 0.02, abs=5e-4)


def test_frames_are_read_and_a_ride_too_short_is_refused(calm_race: Any) -> None:
    time = np.arange(60.0)
    frame = pd.DataFrame(
        {"time_s": time, "distance_m": 9 * time, "speed_m_s": 9.0, "power_w": 200.0}
    )
    with pytest.raises(UnusableInputError, match=r"stretches.*at least"):
        fit_drag(frame, race=calm_race)
    with pytest.raises(UnusableInputError, match="a method"):
        fit_drag(frame, race=calm_race, method="guess")


def test_a_ride_without_positions_still_gives_an_interval_with_the_wind_in_it(
    calm_race: Any,
) -> None:
    truth = Truth(1, 3, calm_race, replace(QUIET, wind_m_s=0.5))
    (ride,) = recorded(truth, runs(truth), heights=False)
    nothing = np.full(ride.time_s.size, np.nan)
    blind = replace(ride, placed=False, heading_deg=nothing, east_m=nothing, north_m=nothing)
    fit = fit_rides([blind], calm_race)
    assert fit.cda_low_m2 <= truth.cda[0] <= fit.cda_high_m2
    assert fit.wind[0].from_deg is None


def test_a_ride_of_the_race_s_own_course_has_its_heights_and_surface(hilly_plan: Any) -> None:
    # 1.4 on the road, no heights in the ride: both come from the course
    race = vary(hilly_plan.race, {"course.surface": "coarse"})
    frame = ridden(plan_race(race)).drop(columns="elevation_m")
    fit = fit_drag(frame, race=race)
    assert fit.on_course
    assert fit.method == "energy balance"
    assert any("taken from the course" in note for note in fit.notes)
    assert fit.cda_m2 == pytest.approx(0.30, abs=0.03)
    assert fit.crr_low <= 0.005 <= fit.crr_high
    assert race.course.crr_factor[0] != 1.0
