"""The plan as files for other programs: CSV tables, strict JSON and a GPX course with cues."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from itertools import pairwise
from pathlib import Path
from typing import TYPE_CHECKING
from xml.sax.saxutils import escape

import numpy as np

from pacing.report import figures, position_picture, sheet, words
from pacing.report.output_set import output_set
from pacing.report.strict_json import json_text

if TYPE_CHECKING:
    import pandas as pd

    from pacing.plan.plan import Plan

CUE_COLUMNS = (
    "from_km", "to_km", "landmark", "position", "power_w", "speed_kmh", "clock", "w_balance_kj",
)  # fmt: skip
CUE_DIGITS = {"from_km": 3, "to_km": 3, "power_w": 1, "speed_kmh": 2, "w_balance_kj": 3}
TRACE_DIGITS = {
    "from_m": 3,
    "to_m": 3,
    "lat_deg": 7,
    "lon_deg": 7,
    "elevation_m": 3,
    "gradient": 7,
    "heading_deg": 3,
    "air_density_kg_m3": 6,
    "wind_along_m_s": 5,
    "wind_across_m_s": 5,
    "crr": 7,
    "power_share": 6,
    "critical_power_w": 4,
    "efficiency": 6,
    "cda_m2": 6,
    "speed_limit_from_m_s": 5,
    "speed_limit_to_m_s": 5,
    "target_w": 4,
    "power_w": 4,
    "braking_n": 4,
    "speed_from_m_s": 6,
    "speed_to_m_s": 6,
    "time_s": 6,
    "w_balance_to_j": 3,
}
"""Decimals: fine enough that the ride can be marched again from the file."""

LEAD_S = 4.0
LEAST_LEAD_M, MOST_LEAD_M = 20.0, 100.0
GPX_NAMESPACE = "http://www.topografix.com/GPX/1/1"


def write_plan(plan: Plan, folder: Path) -> None:
    """Write the output folder of a plan, complete or not at all.

    Raises UnusableInputError where the folder cannot be written or holds other files.
    """
    with output_set(folder) as room:
        (room / "plan.json").write_text(plan_json(plan), encoding="utf-8")
        (room / "cues.csv").write_text(cues_csv(plan), encoding="utf-8", newline="")
        (room / "trace.csv").write_text(trace_csv(plan), encoding="utf-8", newline="")
        (room / "cues.gpx").write_text(cues_gpx(plan), encoding="utf-8", newline="")
        sheet.save_pdf(plan, room / "cue-sheet.pdf")
        sheet.save_preview(plan, room / "cue-sheet.png")
        figures.save_profile(plan, room / "profile.png")
        figures.save_map(plan, room / "map.png")
        if plan.positions is not None:
            position_picture.save_positions(plan, room / "positions.png")


def plan_json(plan: Plan) -> str:
    """The whole result as one strict JSON document."""
    return json_text(plan.to_json_dict())


def cues_csv(plan: Plan) -> str:
    """One row a cue, as printed."""
    return _csv(plan.cues[list(CUE_COLUMNS)], CUE_DIGITS)


def trace_csv(plan: Plan) -> str:
    """One row a grid cell."""
    return _csv(plan.trace, TRACE_DIGITS)


def _csv(table: pd.DataFrame, digits: Mapping[str, int]) -> str:
    """``table`` with a fixed number of decimals a column and Unix line ends."""
    shown = table.copy()
    for name in shown.columns:
        if name in digits:
            shown[name] = _decimals(shown[name].to_numpy(dtype=float), digits[name])
    return str(shown.to_csv(index=False, lineterminator="\n"))


def _decimals(values: np.ndarray, digits: int) -> list[str]:
    """Numbers as text, trailing zeros left out; ``inf`` where free, empty where unknown."""
    texts = []
    for value in values.tolist():
        if math.isfinite(value):
            text = f"{value:.{digits}f}".rstrip("0").rstrip(".")
            texts.append("0" if text == "-0" else text)
        else:
            texts.append("" if math.isnan(value) else str(value))
    return texts


def lead_m(speed_m_s: float) -> float:
    """How far before a change its waypoint stands: a few seconds, within bounds."""
    return min(MOST_LEAD_M, max(LEAST_LEAD_M, LEAD_S * speed_m_s))


def waypoint_places_m(plan: Plan) -> list[float]:
    """Where each cue is announced: the first at the start, the others a little before the change.

    Never before the middle of the cue that goes before, so that the order stays.
    """
    starts = plan.cues["from_m"].to_numpy(dtype=float)
    node_m = plan.trace["from_m"].to_numpy()
    speed = plan.trace["speed_from_m_s"].to_numpy()
    places = [float(starts[0])]
    for before, at in pairwise(starts):
        lead = lead_m(float(np.interp(at, node_m, speed)))
        places.append(float(max(at - lead, 0.5 * (before + at))))
    return places


def cues_gpx(plan: Plan) -> str:
    """The course as a GPX 1.1 track with one waypoint a cue, core elements only."""
    course = plan.race.course
    units = words.units_named(plan.race.plan.units)
    lines = [
        '<?xml version="1.0" encoding="UTF-8"?>',
        f'<gpx version="1.1" creator="pacing" xmlns="{GPX_NAMESPACE}">',
        f"<metadata><name>{_xml(course.name)}</name></metadata>",
    ]
    longitude = np.degrees(np.unwrap(np.radians(course.lon_deg)))
    for at_m, (_, cue) in zip(waypoint_places_m(plan), plan.cues.iterrows(), strict=True):
        lat, lon, ele = (
            float(np.interp(at_m, course.distance_m, along))
            for along in (course.lat_deg, longitude, course.elevation_m)
        )
        seen = words.seen_beside(cue, units)
        place = words.place(1000.0 * float(cue["from_km"]), units, 2)
        about = ", ".join(part for part in (f"from {place}", seen, str(cue["clock"])) if part)
        lines.append(
            f"<wpt {_position(lat, lon)}><ele>{ele:.1f}</ele>"
            f"<name>{words.number(cue['power_w'])} W</name><desc>{_xml(about)}</desc></wpt>"
        )
    lines.append(f"<trk><name>{_xml(course.name)}</name><trkseg>")
    lines += [
        f"<trkpt {_position(lat, lon)}><ele>{ele:.1f}</ele></trkpt>"
        for lat, lon, ele in zip(
            course.lat_deg.tolist(), longitude.tolist(), course.elevation_m.tolist(), strict=True
        )
    ]
    return "\n".join([*lines, "</trkseg></trk>", "</gpx>", ""])


def _position(lat: float, lon: float) -> str:
    east = (lon + 180.0) % 360.0 - 180.0
    text = f"{east:.7f}"
    return f'lat="{lat:.7f}" lon="{"-180.0000000" if text == "180.0000000" else text}"'


def _xml(text: object) -> str:
    """``text`` for an XML element: escaped, without characters XML 1.0 forbids."""
    allowed = re.sub("[^\t\n\r -\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]", "", str(text))
    return escape(" ".join(allowed.split()))
