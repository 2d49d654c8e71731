"""One value of the race file against its key: kind, range, finiteness."""

from __future__ import annotations

import datetime
import math
import re
from collections.abc import Callable
from dataclasses import replace
from typing import Any

from pacing.race.keys import Key
from pacing.race.lines import Path
from pacing.race.nearest import did_you_mean
from pacing.race.origin import Origins, shown

LONGEST_TEXT = 300
LONGEST_PATH = 4000
MOST_VALUES = 1000
_CLOCK = re.compile(r"(\d{1,2}):(\d{2})(?::(\d{2})(?:\.\d+)?)?")


def checked_value(
    key: Key, value: Any, path: Path, origins: Origins, caution: Callable[[Path, str], None]
) -> Any:
    """The value as plain Python, numbers as float; raises `UnusableInputError` naming the key.

    ``caution`` is called with the path and the words for a value at the edge of its range.
    """
    match key.kind:
        case "number":
            return _number(key, value, path, origins, caution)
        case "integer":
            return _integer(key, value, path, origins, caution)
        case "text" | "path":
            return _text(key, value, path, origins)
        case "text or integer":
            if isinstance(value, str):
                return _text(key, value, path, origins)
            return _integer(key, value, path, origins, caution)
        case "choice":
            return _choice(key, value, path, origins)
        case "flag":
            if isinstance(value, bool):
                return value
        case "clock":
            return clock_text(clock_s(value, path, origins, key.expected))
        case "numbers":
            return _numbers(key, value, path, origins, caution)
        case "number or yaw table":
            if not isinstance(value, dict):
                return _number(key, value, path, origins, caution)
            return _yaw_table(key, value, path, origins, caution)
        case "yaw table":
            if isinstance(value, dict):
                return _yaw_table(key, value, path, origins, caution)
    raise origins.error(path, shown(value), expected=key.expected)


def clock_s(value: Any, path: Path, origins: Origins, expected: str) -> float:
    """Seconds of the day of a clock given as text or as a TOML time."""
    if isinstance(value, datetime.time):
        return value.hour * 3600.0 + value.minute * 60.0 + value.second
    found = _CLOCK.fullmatch(value.strip()) if isinstance(value, str) and len(value) < 20 else None
    if found:
        hour, minute, second = int(found[1]), int(found[2]), int(found[3] or 0)
        if hour < 24 and minute < 60 and second < 60:
            return hour * 3600.0 + minute * 60.0 + second
    raise origins.error(path, shown(value), expected=expected)


def clock_text(seconds: float) -> str:
    """Seconds of the day as ``hh:mm``, with seconds only where there are any."""
    whole = int(seconds)
    text = f"{whole // 3600:02d}:{whole // 60 % 60:02d}"
    return text if whole % 60 == 0 else f"{text}:{whole % 60:02d}"


def _number(
    key: Key, value: Any, path: Path, origins: Origins, caution: Callable[[Path, str], None]
) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float):
        mend = "write the number without quotes" if isinstance(value, str) else None
        raise origins.error(path, shown(value), expected=key.expected, mend=mend)
    if isinstance(value, float) and not math.isfinite(value):
        raise origins.error(path, shown(value), expected=key.expected)
    if key.low is not None and key.high is not None and not key.low <= value <= key.high:
        raise origins.error(path, f"{shown(value)} is out of range", expected=key.expected)
    number = float(value) + 0.0
    if key.usual_low is not None and key.usual_high is not None:
        low, high = key.usual_low, key.usual_high
        if not low <= number <= high:
            caution(path, f"{number:g} is at the edge, {low:g} to {high:g} is usual")
    return number


def _integer(
    key: Key, value: Any, path: Path, origins: Origins, caution: Callable[[Path, str], None]
) -> int:
    number = _number(key, value, path, origins, caution)
    if number != int(number):
        raise origins.error(path, shown(value), expected=key.expected)
    return int(number)


def _text(key: Key, value: Any, path: Path, origins: Origins) -> str:
    longest = LONGEST_PATH if key.kind == "path" else LONGEST_TEXT
    if not isinstance(value, str) or (not value.strip() and key.default != ""):
        raise origins.error(path, shown(value), expected=key.expected)
    if len(value) > longest:
        raise origins.error(
            path, f"a text of {len(value)} characters", expected=f"at most {longest}"
        )
    if not all(c.isprintable() for c in value):
        raise origins.error(path, shown(value), expected="text in one line")
    return value.strip()


def _choice(key: Key, value: Any, path: Path, origins: Origins) -> str:
    if isinstance(value, str) and value in key.choices:
        return value
    mend = did_you_mean(value, key.choices) if isinstance(value, str) else None
    raise origins.error(path, shown(value), expected=key.expected, mend=mend)


def _numbers(
    key: Key, value: Any, path: Path, origins: Origins, caution: Callable[[Path, str], None]
) -> list[float]:
    if not isinstance(value, list) or len(value) > MOST_VALUES:
        raise origins.error(path, shown(value), expected=key.expected)
    item_key = replace(key, kind="number")
    return [
        _number(item_key, item, (*path, number), origins, caution)
        for number, item in enumerate(value)
    ]


def _yaw_table(
    key: Key,
    value: dict[str, Any],
    path: Path,
    origins: Origins,
    caution: Callable[[Path, str], None],
) -> dict[str, list[float]]:
    assert key.columns is not None
    angles, values = key.columns
    for name in value:
        if name not in key.columns:
            mend = did_you_mean(name, key.columns)
            raise origins.error((*path, name), "unknown key", expected=key.expected, mend=mend)
    for name in key.columns:
        if name not in value:
            raise origins.error((*path, name), "missing", expected=key.expected)
    yaw_key = Key(key.section, angles, "numbers", "", low=0.0, high=90.0)
    value_key = Key(
        key.section, values, "numbers", "", low=key.low, high=key.high,
        usual_low=key.usual_low, usual_high=key.usual_high,
    )  # fmt: skip
    yaw = _numbers(yaw_key, value[angles], (*path, angles), origins, caution)
    column = _numbers(value_key, value[values], (*path, values), origins, caution)
    if len(yaw) != len(column) or not yaw:
        raise origins.error(
            path,
            f"{len(yaw)} angles in {angles} and {len(column)} values in {values}",
            expected="as many of one as of the other, at least one",
        )
    for number in range(1, len(yaw)):
        if yaw[number] <= yaw[number - 1]:
            raise origins.error(
                (*path, angles, number),
                f"{yaw[number]:g}° after {yaw[number - 1]:g}°",
                expected="angles that rise",
            )
    return {angles: yaw, values: column}
