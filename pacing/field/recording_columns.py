"""Other names, and other units, for the columns of a ride file."""

from __future__ import annotations

import math
from collections.abc import Iterable
from difflib import get_close_matches
from typing import NamedTuple

from pacing.errors import UnusableInputError
from pacing.field.recording import LIMITS

NAMES = ("time_s", "time", *LIMITS, "position")


class Column(NamedTuple):
    """Where a column is found: its ``name`` in the file, and what its values are multiplied by."""

    name: str
    factor: float = 1.0


def columns_from(texts: Iterable[str]) -> dict[str, Column]:
    """Columns as given on the command line: ``power_w=Watts``, ``distance_m=km*1000``.

    Several may stand in one text, separated by commas. Raises `UnusableInputError` for a name
    that is none of a ride's columns, or a factor that is no positive number.
    """
    found: dict[str, Column] = {}
    for text in (part.strip() for whole in texts for part in whole.split(",")):
        if not text:
            continue
        ours, sign, theirs = text.partition("=")
        ours, theirs = ours.strip(), theirs.strip()
        if not sign or not theirs:
            raise UnusableInputError(
                f"'{text}'", key="--columns", expected="OURS=THEIRS, such as power_w=Watts"
            )
        if ours not in NAMES:
            near = get_close_matches(ours, NAMES, 1)
            raise UnusableInputError(
                f"'{ours}' is no column of a ride",
                key="--columns",
                expected=", ".join(NAMES),
                mend=f"did you mean '{near[0]}'?" if near else None,
            )
        found[ours] = _column(theirs, text)
    return found


def _column(theirs: str, text: str) -> Column:
    name, star, by = theirs.rpartition("*")
    if not star:
        return Column(theirs)
    try:
        factor = float(by)
    except ValueError:
        return Column(theirs)  # a star within the name itself
    if not (math.isfinite(factor) and factor > 0.0):
        raise UnusableInputError(
            f"'{text}'", key="--columns", expected="a positive number after the *"
        )
    return Column(name.strip(), factor)
