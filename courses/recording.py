"""What a recorder or a route planner makes of a road: noisy points, written as GPX 1.1."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from pathlib import Path
from xml.sax.saxutils import escape

import numpy as np
from numpy.typing import NDArray
from roads import Array, Road

FIRST_START = datetime(2031, 5, 4, 8, 0, tzinfo=UTC)


@dataclass(frozen=True)
class Recording:
    """Points as a file holds them. ``time_s`` is None for a planned route."""

    name: str
    lat_deg: Array
    lon_deg: Array
    elevation_m: Array
    time_s: Array | None
    true_distance_m: Array


def ridden_speed_m_s(road: Road, flat_m_s: float = 11.0) -> Array:
    """A plausible speed at every point of the road (N,): slower uphill and in bends."""
    percent = 100 * road.slope
    speed = np.where(
        percent > 0, flat_m_s / (1 + 0.25 * percent), np.minimum(flat_m_s - 0.9 * percent, 17.0)
    )
    speed = np.minimum(np.maximum(speed, 2.8), np.sqrt(3.0 * road.radius_m))
    window = np.ones(41) / 41
    return np.asarray(np.convolve(np.pad(speed, 20, mode="edge"), window, mode="valid"))


def wandering(
    rng: np.random.Generator, count: int, sd: float, memory: float
) -> NDArray[np.float64]:
    """A random series (count,) of given standard deviation that forgets over ``memory`` steps."""
    keep = np.exp(-1.0 / memory)
    kicks = rng.normal(0.0, sd * np.sqrt(1 - keep**2), count)
    series = np.empty(count)
    value = rng.normal(0.0, sd)
    for i in range(count):
        value = keep * value + kicks[i]
        series[i] = value
    return series


def record(
    road: Road,
    rng: np.random.Generator,
    *,
    every_s: float = 1.0,
    position_sd_m: float = 1.2,
    drift_sd_m: float = 1.5,
    height_sd_m: float = 0.15,
) -> Recording:
    """A ride with a satellite receiver and a barometer: slow errors in place and height."""
    speed = ridden_speed_m_s(road)
    steps = np.diff(road.distance_m) * 2 / (speed[1:] + speed[:-1])
    clock = np.concatenate([[0.0], np.cumsum(steps)])
    time_s = np.arange(0.0, clock[-1] + every_s, every_s)
    time_s[-1] = clock[-1]
    at = np.interp(time_s, clock, road.distance_m)
    count = len(time_s)
    memory = 25.0 / every_s
    east, north = (
        wandering(rng, count, position_sd_m, memory) + rng.normal(0.0, 0.25, count)
        for _ in range(2)
    )
    height = np.interp(at, road.distance_m, road.height_m)
    height += wandering(rng, count, drift_sd_m, 1500.0 / every_s)
    height += rng.normal(0.0, height_sd_m, count)
    lat = np.interp(at, road.distance_m, road.lat_deg)
    lon = np.interp(at, road.distance_m, road.lon_deg)
    metres_a_degree = 111200.0
    return Recording(
        name=road.name,
        lat_deg=lat + north / metres_a_degree,
        lon_deg=lon + east / (metres_a_degree * np.cos(np.radians(lat))),
        elevation_m=height,
        time_s=np.round(time_s),
        true_distance_m=at,
    )


def gpx_text(recording: Recording) -> str:
    """The recording as a GPX 1.1 track of core elements only, six decimals and decimetres."""
    lines = [
        '<?xml version="1.0" encoding="UTF-8"?>',
        '<gpx version="1.1" creator="courses/make.py" xmlns="http://www.topografix.com/GPX/1/1">',
        f"<trk><name>{escape(recording.name)}</name><trkseg>",
    ]
    for i in range(len(recording.lat_deg)):
        when = ""
        if recording.time_s is not None:
            clock = FIRST_START + timedelta(seconds=float(recording.time_s[i]))
            when = f"<time>{clock:%Y-%m-%dT%H:%M:%SZ}</time>"
        lines.append(
            f'<trkpt lat="{recording.lat_deg[i]:.6f}" lon="{recording.lon_deg[i]:.6f}">'
            f"<ele>{recording.elevation_m[i]:.1f}</ele>{when}</trkpt>"
        )
    lines.append("</trkseg></trk></gpx>")
    return "\n".join(lines) + "\n"


def write_gpx(recording: Recording, path: Path) -> None:
    """Write the recording to ``path`` with line feeds on every system."""
    path.write_bytes(gpx_text(recording).encode("utf-8"))
