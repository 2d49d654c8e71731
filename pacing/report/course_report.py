"""What ``pacing course`` says of a course file: one screen of text, or the same as JSON."""

from __future__ import annotations

import textwrap
from typing import Any

from pacing.course.course import Bend, Course, Repair
from pacing.course.summary import headings, pieces_of_one_gradient, steepest_stretch
from pacing.errors import UnusableInputError
from pacing.motion.limits import (
    LATERAL_G_DRY,
    LONGEST_SPEED_KMH_DRY,
    bend_speed_m_s,
)
from pacing.report import words
from pacing.units import KMH_PER_M_S

WIDTH = 80
MOST_BENDS = 6
MOST_REPAIRS = 8
SCHEMA = "course/1"
NO_HEIGHTS = ("none", "level")
_FIGURES = (
    "name",
    "length_m",
    "length_horizontal_m",
    "climbing_raw_m",
    "climbing_m",
    "height_source",
    "height_noise_m",
    "gradient_error_pct",
    "steepest_100m",
    "steepest_1km",
)
SOURCES = {
    "recorded": "recorded on the road",
    "terrain grid": "read from a terrain grid",
    "stepped": "stepped",
    "level": "level, as the race file says",
    "none": "none",
}


def bend_limit_kmh(bend: Bend) -> float | None:
    """Planned speed through a bend on a dry road, None where it is unknown or does not limit."""
    radius_m = bend.planning_radius_m
    if radius_m is None:
        return None
    limit = KMH_PER_M_S * float(bend_speed_m_s(radius_m, lateral_g=LATERAL_G_DRY))
    return limit if limit < LONGEST_SPEED_KMH_DRY else None


def course_document(course: Course) -> dict[str, Any]:
    """The survey of a course as a JSON document; what needs heights is None without them."""
    report = course.report
    known = report.height_source != "none"
    steep = {
        key: _steepest(course, metres) if known else None
        for key, metres in (("steepest_100m", 100.0), ("steepest_1km", 1000.0))
    }
    return {
        "schema": SCHEMA,
        "name": course.name,
        "length_m": course.length_m,
        "length_horizontal_m": report.length_horizontal_m,
        "climbing_raw_m": report.climbing_raw_m if known else None,
        "climbing_m": report.climbing_m if known else None,
        "height_source": report.height_source,
        "height_noise_m": report.height_noise_m if known else None,
        "gradient_error_pct": report.gradient_error_pct if known else None,
        **steep,
        "bends": [
            {
                "at_km": bend.at_m / 1000.0,
                "radius_m": bend.radius_m,
                "turn_deg": bend.turn_deg,
                "limit_kmh": bend_limit_kmh(bend),
                "confidence": bend.confidence,
                "widest_m": bend.widest_m,
            }
            for bend in course.bends
        ],
        "headings": [heading._asdict() for heading in headings(course)],
        "pieces": [
            {
                "from_km": piece.from_m / 1000.0,
                "to_km": piece.to_m / 1000.0,
                "gradient_pct": 100.0 * piece.gradient,
            }
            for piece in pieces_of_one_gradient(course)
        ]
        if known
        else [],
        "repairs": [_repair(repair) for repair in report.repairs],
        "cautions": list(report.cautions),
        "reasons": list(report.reasons),
        "verdict": report.verdict,
    }


def no_course_document(problem: UnusableInputError) -> dict[str, Any]:
    """The document of a file that could be read but holds no course to survey: why, and nothing."""
    return {
        "schema": SCHEMA,
        **dict.fromkeys(_FIGURES),
        **{key: [] for key in ("bends", "headings", "pieces", "repairs", "cautions")},
        "reasons": [f"{problem.found}; expected {problem.expected}"],
        "verdict": "unusable",
    }


def _steepest(course: Course, length_m: float) -> dict[str, float]:
    found = steepest_stretch(course.distance_m, course.elevation_m, length_m)
    return {"at_km": found.middle_m / 1000.0, "gradient_pct": 100.0 * found.gradient}


def _repair(repair: Repair) -> dict[str, Any]:
    return {
        "what": repair.what,
        "from_km": repair.from_km,
        "to_km": repair.to_km,
        "amount": repair.amount,
    }


def course_text(course: Course) -> str:
    """The survey of a course on one screen of 80 columns."""
    blocks = [
        _title(course),
        _heights(course),
        _bends(course),
        _headings(course),
        _repairs(course.report.repairs),
        _verdict(course),
    ]
    return "\n\n".join(block for block in blocks if block)


def _title(course: Course) -> str:
    length = f"{words.distance(course.length_m, digits=2)} km"
    text = f"{words.filled(course.name) or 'course'}, {length}"
    return textwrap.shorten(text, WIDTH, placeholder=f"…, {length}")


def _heights(course: Course) -> str:
    report = course.report
    source = SOURCES.get(report.height_source, report.height_source)
    if report.height_source in NO_HEIGHTS:
        return f"Heights: {source}."
    rows = [
        ("climbing", f"{report.climbing_m:.0f} m ({report.climbing_raw_m:.0f} m in the file)"),
        ("heights", f"{source}, {words.number(report.height_noise_m, 1)} m of noise taken off"),
        ("gradient", f"over 100 m known to {words.number(report.gradient_error_pct, 1)} points"),
    ]
    for label, metres in (("100 m", 100.0), ("1 km", 1000.0)):
        found = steepest_stretch(course.distance_m, course.elevation_m, metres)
        grade = words.number(100.0 * found.gradient, 1, signed=True)
        where = (
            f"km {words.distance(found.from_m, digits=2)} to {words.distance(found.to_m, digits=2)}"
        )
        rows.append((f"steepest {label}", f"{grade} % at {where}"))
    return "\n".join(f"{label:<16}{text}" for label, text in rows)


def _bends(course: Course) -> str:
    sharp = sorted(
        (bend for bend in course.bends if bend.radius_m is not None),
        key=lambda bend: bend.radius_m or 0.0,
    )
    unknown = len(course.bends) - len(sharp)
    if not course.bends and course.report.verdict == "unusable":
        return ""
    if not course.bends:
        return "No bend that limits the speed was found."
    lines = [f"Sharpest bends of {len(course.bends)}; speeds are planned, not safe ones"]
    lines.append(f"{'km':>8}{'radius m':>10}{'turn °':>9}{'km/h dry':>10}{'sure':>7}")
    for bend in sorted(sharp[:MOST_BENDS], key=lambda bend: bend.at_m):
        lines.append(
            f"{words.distance(bend.at_m, digits=2):>8}{words.number(bend.radius_m):>10}"
            f"{words.number(bend.turn_deg, signed=True):>9}"
            f"{words.number(bend_limit_kmh(bend)):>10}{100 * bend.confidence:>5.0f} %"
        )
    if unknown:
        lines.append(f"  {unknown} more where the points are too far apart to tell the radius")
    return "\n".join(lines)


def _headings(course: Course) -> str:
    share = [f"{h.towards} {100 * h.share:.0f} %" for h in headings(course)]
    return "Heads  " + "  ".join(share)


def _repairs(repairs: tuple[Repair, ...]) -> str:
    if not repairs:
        return "Repairs: none."
    lines = ["Repairs"]
    grouped: dict[str, list[Repair]] = {}
    for repair in repairs:
        grouped.setdefault(repair.what, []).append(repair)
    shown = 0
    for what, group in grouped.items():
        for repair in group[: max(1, MOST_REPAIRS // len(grouped))]:
            where = f"km {repair.from_km:.1f}"
            if repair.to_km - repair.from_km >= 0.05:
                where += f" to {repair.to_km:.1f}"
            if repair.to_km == 0.0:
                where = "the file"
            lines += textwrap.wrap(
                f"{where}: {what}, {repair.amount}",
                WIDTH,
                initial_indent="  ",
                subsequent_indent="    ",
            )
            shown += 1
    if shown < len(repairs):
        lines.append(f"  and {len(repairs) - shown} more of these: --json lists all")
    return "\n".join(lines)


def _verdict(course: Course) -> str:
    report = course.report
    opening = {
        "good": "Verdict: good.",
        "usable": "Verdict: usable, with these cautions:",
        "unusable": "Verdict: not usable:",
    }[report.verdict]
    lines = [opening]
    for text in (*report.reasons, *report.cautions):
        lines += textwrap.wrap(f"- {text}", WIDTH, subsequent_indent="  ")
    return "\n".join(lines)
