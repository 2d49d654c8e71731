"""Recordings: read by any name, doubted where they must be, never filled in."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from pacing.errors import UnusableInputError
from pacing.field.recording import recording_of_frame
from pacing.field.recording_check import Ride, check
from pacing.field.recording_columns import Column, columns_from
from pacing.field.recording_read import read_recording


def steady(seconds: int = 900, speed_m_s: float = 9.0) -> pd.DataFrame:
    """A ride due north at one speed, with every column."""
    time = np.arange(float(seconds))
    return pd.DataFrame(
        {
            "time_s": time,
            "lat_deg": 46.0 + speed_m_s * time / 111_150.0,
            "lon_deg": -31.0,
            "elevation_m": 100.0 + 5.0 * np.sin(time / 60.0),
            "distance_m": speed_m_s * time,
            "speed_m_s": speed_m_s,
            "power_w": 200.0 + 10.0 * np.sin(time / 7.0),
            "cadence_rpm": 88.0 + np.arange(seconds) % 4,
        }
    )


def checked(frame: pd.DataFrame) -> Ride:
    return check(recording_of_frame(frame))


def why(ride: Ride) -> dict[str, float]:
    """Seconds masked by reason."""
    found: dict[str, float] = {}
    for mask in ride.masked:
        found[mask.why] = found.get(mask.why, 0.0) + mask.to_s - mask.from_s
    return found


def test_a_sound_ride_is_believed_whole() -> None:
    ride = checked(steady())
    assert ride.masked == ()
    assert ride.notes == ()
    assert ride.whole.all()
    assert ride.speed.scale == 1.0
    assert ride.heading_deg == pytest.approx(0.0, abs=1e-6)


def test_other_names_units_separators_and_clocks_are_read(tmp_path: Path) -> None:
    file = tmp_path / "ride.csv"
    rows = [
        f"2031-05-04T08:00:{s:02d}Z;{200 + s};32,4;{0.01 * s:.2f}".replace(".", ",")
        for s in range(9)
    ]
    file.write_text("Stamp;Watts;Tempo;Weg\n" + "\n".join(rows) + "\n", encoding="utf-8")
    names = columns_from(
        ["time=Stamp,power_w=Watts", "speed_m_s=Tempo*0.27778,distance_m=Weg*1000"]
    )
    found = read_recording(file, names)
    assert found.time_s.tolist() == list(range(9))
    assert found.power_w[3] == 203.0
    assert found.speed_m_s[0] == pytest.approx(9.0, abs=1e-3)
    assert found.distance_m[8] == pytest.approx(80.0)
    assert found.start is not None
    assert found.start.year == 2031


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("watts", "OURS=THEIRS"),
        ("pover_w=Watts", "did you mean 'power_w'"),
        ("power_w=Watts*-1", "positive number"),
    ],
)
def test_a_column_map_that_is_none_says_what_it_should_be(text: str, words: str) -> None:
    with pytest.raises(UnusableInputError, match=r".") as problem:
        columns_from([text])
    assert words.lower() in str(problem.value).lower()


def test_a_star_in_a_name_is_part_of_the_name() -> None:
    assert columns_from(["power_w=P*W"]) == {"power_w": Column("P*W")}


GPX_POINT = (
    '<trkpt lat="{lat:.6f}" lon="-31.0"><ele>{ele}</ele><time>2031-05-04T08:{m:02d}:{s:02d}Z</time>'
    "<extensions><x:more><x:power>{power}</x:power></x:more></extensions></trkpt>"
)


def gpx(seconds: int = 90) -> str:
    points = "".join(
        GPX_POINT.format(lat=46 + 8e-5 * t, ele=100 + t, m=t // 60, s=t % 60, power=180 + t)
        for t in range(seconds)
    )
    return (
        '<gpx version="1.1" creator="t" xmlns="http://www.topografix.com/GPX/1/1" '
        f'xmlns:x="urn:any"><trk><trkseg>{points}</trkseg></trk></gpx>'
    )


def test_power_in_any_extension_of_a_gpx_point_is_read(tmp_path: Path) -> None:
    file = tmp_path / "ride.gpx"
    file.write_text(gpx(), encoding="utf-8")
    found = read_recording(file)
    assert found.power_w.tolist() == [180.0 + t for t in range(90)]
    assert found.time_s[-1] == 89.0
    ride = check(found)
    assert ride.speed.source == "position"
    assert ride.speed_m_s[40] == pytest.approx(8e-5 * 111_150.0, rel=0.003)


def test_gaps_stops_and_pauses_are_found() -> None:
    ride = steady()
    ride = ride[(ride["time_s"] < 200) | (ride["time_s"] >= 260)]  # 60 s ridden, not recorded
    late = ride["time_s"] >= 500
    ride.loc[late, "time_s"] += 100.0  # stood for 100 s, recorder paused
    found = why(checked(ride))
    assert found["gap in the recording"] == pytest.approx(61.0)
    assert found["stop, recorder paused"] == pytest.approx(101.0)
    slow = steady()
    slow.loc[300:329, "speed_m_s"] = 0.0
    slow.loc[300:, "lat_deg"] = slow["lat_deg"].iloc[300]
    assert why(checked(slow))["stop"] == pytest.approx(29.0)


def test_dropped_stuck_and_towering_power_is_masked_and_not_filled() -> None:
    frame = steady()
    frame.loc[100:109, "power_w"] = 0.0  # while the cadence says 90
    frame.loc[200, "power_w"] = 1336.0
    frame.loc[300:320, ["power_w", "cadence_rpm"]] = [240.0, 0.0]
    frame.loc[400:404, "power_w"] = np.nan
    ride = checked(frame)
    found = why(ride)
    assert {
        "power dropped out while pedalling",
        "power spike",
        "power stuck while not pedalling",
        "no power recorded",
    } == set(found)
    for masked in (slice(100, 110), slice(200, 201), slice(300, 321), slice(400, 405)):
        assert np.isnan(ride.power_w[masked]).all()
        assert not ride.whole[masked.start - 1 : masked.stop].any()
    assert np.isfinite(ride.power_w).sum() == 900 - 10 - 1 - 21 - 5


def test_a_sprint_is_no_spike() -> None:
    frame = steady()
    frame.loc[200:204, "power_w"] = [700.0, 950.0, 1000.0, 900.0, 650.0]
    assert checked(frame).masked == ()


def test_duplicated_seconds_and_a_clock_that_goes_back_are_left_out() -> None:
    frame = steady()
    frame.loc[100, "time_s"] = 99.0
    frame.loc[200, "time_s"] = 50.0
    ride = checked(frame)
    assert ride.time_s.size == 898
    assert np.all(np.diff(ride.time_s) > 0)
    assert set(why(ride)) == {"second recorded twice", "clock went back"}
    frame["time_s"] = 3.0
    with pytest.raises(UnusableInputError, match="clock that does not rise"):
        checked(frame)


@pytest.mark.parametrize("scale", [0.96, 1.0, 1.03])
def test_the_scale_of_a_wheel_sensor_is_found_from_the_positions(scale: float) -> None:
    # positions with half a metre of noise; the sensor reads ``scale`` of the true speed
    frame = steady(3000)
    noise = np.random.default_rng(4)
    frame["lat_deg"] += 0.5 / 111_150.0 * noise.standard_normal(3000)
    frame["lon_deg"] += 0.5 / 77_300.0 * noise.standard_normal(3000)
    frame["speed_m_s"] *= scale
    ride = checked(frame)
    assert ride.speed_m_s == pytest.approx(9.0, rel=0.006)
    assert (ride.speed.scale == 1.0) == (scale == 1.0)
    assert any("against the positions" in note for note in ride.notes) == (scale != 1.0)


def test_speed_comes_from_distance_or_position_without_a_sensor() -> None:
    for dropped, source in ((["speed_m_s"], "distance"), (["speed_m_s", "distance_m"], "position")):
        ride = checked(steady().drop(columns=dropped))
        assert ride.speed.source == source
        assert ride.speed_m_s[5:-5] == pytest.approx(9.0, rel=0.005)


def test_height_jumps_break_the_ride_and_drift_is_told() -> None:
    frame = steady()
    frame.loc[450:, "elevation_m"] += 30.0
    ride = checked(frame)
    assert "height jumps" in why(ride)
    assert not ride.whole[449]
    back = frame.iloc[::-1].copy()
    there = steady()
    back["time_s"] = 900.0 + np.arange(900.0)
    back["elevation_m"] = there["elevation_m"].to_numpy()[::-1] + 12.0
    ride = checked(pd.concat([there, back], ignore_index=True))
    assert ride.drift is not None
    assert ride.drift.misclosure_m == pytest.approx(12.0, abs=1.0)
    assert any("recorder drifts" in note for note in ride.notes)


def test_an_even_drift_is_measured_from_places_passed_twice() -> None:
    # 20 m/h put into an out-and-back of half an hour
    there = steady()
    back = there.iloc[::-1].copy()
    back["time_s"] = 900.0 + np.arange(900.0)
    frame = pd.concat([there, back], ignore_index=True)
    frame["elevation_m"] += 20.0 / 3600.0 * frame["time_s"]
    drift = checked(frame).drift
    assert drift is not None
    assert drift.rate_m_per_s * 3600.0 == pytest.approx(20.0, abs=3.0)
    assert drift.rate_se_m_per_s * 3600.0 < 5.0


def test_a_position_thrown_off_the_road_is_not_used() -> None:
    frame = steady()
    frame.loc[300, "lat_deg"] += 0.02
    ride = checked(frame)
    assert "position thrown off the road" in why(ride)
    assert ride.travelled_m[-1] == pytest.approx(9.0 * 899, rel=0.002)


@pytest.mark.parametrize("column", ["power_w", "time_s"])
def test_a_ride_without_power_or_clock_is_refused(column: str) -> None:
    with pytest.raises(UnusableInputError, match=r"power|time"):
        recording_of_frame(steady().drop(columns=column))


def test_a_ride_without_place_and_distance_is_refused() -> None:
    with pytest.raises(UnusableInputError, match="neither position nor distance"):
        recording_of_frame(steady().drop(columns=["lat_deg", "lon_deg", "distance_m"]))


def test_values_no_sensor_can_show_count_as_not_recorded() -> None:
    frame = steady()
    frame.loc[10, "power_w"] = 60_000.0
    frame.loc[20, "lat_deg"] = 460.0
    found = recording_of_frame(frame)
    assert np.isnan(found.power_w[10])
    assert np.isnan(found.lat_deg[20])
    assert np.isnan(found.lon_deg[20])
    assert len(found.notes) == 2
