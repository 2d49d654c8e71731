"""Every number of the race file has a range: inside it is taken, at the edge with a caution."""

from __future__ import annotations

import math
from typing import Any

import pytest

from pacing.errors import UnusableInputError
from pacing.race.keys import Key, sections
from pacing.race.origin import Origins
from pacing.race.value import checked_value

EVERY_KEY = [key for keys in sections().values() for key in keys.values()]
NUMBERS = [key for key in EVERY_KEY if key.kind in ("number", "integer", "number or yaw table")]


def check(key: Key, value: Any) -> tuple[Any, list[str]]:
    cautions: list[str] = []
    path = (key.section, key.name)
    found = checked_value(key, value, path, Origins(), lambda _, words: cautions.append(words))
    return found, cautions


def dotted(key: Key) -> str:
    return key.dotted


@pytest.mark.parametrize("key", NUMBERS, ids=dotted)
def test_both_ends_of_the_range_are_taken_and_what_is_beyond_is_refused(key: Key) -> None:
    assert key.low is not None
    assert key.high is not None
    step = 1 if key.kind == "integer" else 1e-6 * max(1.0, abs(key.high))
    for end, beyond in ((key.low, key.low - step), (key.high, key.high + step)):
        value, cautions = check(key, end)
        assert value == end
        assert bool(cautions) == (not _usual(key, end))
        with pytest.raises(UnusableInputError, match="out of range; expected"):
            check(key, beyond)


def _usual(key: Key, value: float) -> bool:
    assert key.usual_low is not None
    assert key.usual_high is not None
    return key.usual_low <= value <= key.usual_high


@pytest.mark.parametrize("key", NUMBERS, ids=dotted)
@pytest.mark.parametrize(
    "value", [math.nan, math.inf, -math.inf, True, "1", [1], 10**400, -(10**400)], ids=repr
)
def test_what_is_no_finite_number_is_refused(key: Key, value: Any) -> None:
    with pytest.raises(UnusableInputError, match=r"expected a (whole )?number"):
        check(key, value)


@pytest.mark.parametrize("key", EVERY_KEY, ids=dotted)
def test_every_key_has_a_meaning_and_a_default_within_its_own_range(key: Key) -> None:
    assert key.meaning
    assert key.required or key.otherwise is not None or key.default is not None
    if key.default is not None:
        value, cautions = check(key, key.default)
        assert value == key.default
        assert cautions == []


@pytest.mark.parametrize("key", EVERY_KEY, ids=dotted)
def test_a_table_where_none_belongs_is_refused(key: Key) -> None:
    with pytest.raises(UnusableInputError):
        check(key, {"anything": 1})


@pytest.mark.parametrize(
    "key", [key for key in EVERY_KEY if key.kind in ("choice", "text", "path")], ids=dotted
)
@pytest.mark.parametrize("value", [1, 1.5, False, [], "\x1b[31m", "a\nb", "x" * 5000], ids=repr)
def test_what_is_no_line_of_text_is_refused(key: Key, value: Any) -> None:
    with pytest.raises(UnusableInputError):
        check(key, value)
