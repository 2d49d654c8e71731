"""The keys of the race file, read from ``defaults.toml``, the one place that lists them."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Any, NamedTuple

LIST_MARK = "[]"
ENTRY_NAME = {
    "rider.positions[]": "name",
    "course.landmarks[]": "name",
    "course.slow_points[]": "note",
    "air.hours[]": "at",
    "options[]": "name",
}
"""By which of its keys an entry of a list of tables is called in an option."""


class NotYet(NamedTuple):
    """A key (or one value of it) that is understood but not built, and why it is refused."""

    key: str
    value: object
    reason: str


NOT_YET: tuple[NotYet, ...] = (
    NotYet(
        "plan.risk_pct",
        None,
        "planning to a stated risk of running out of W′ is not built",
    ),
    NotYet("plan.units", "imperial", "printing in miles and feet is not built"),
)
"""What is refused for now rather than silently ignored; a value of None means any value."""


@dataclass(frozen=True)
class Key:
    """One key of the race file.

    ``low`` and ``high`` bound what is accepted; outside ``usual_low`` and ``usual_high`` there is
    a caution. ``section`` is the table it belongs to, with ``[]`` for an entry of a list.
    """

    section: str
    name: str
    kind: str
    meaning: str
    required: bool = False
    default: Any = None
    otherwise: str | None = None
    choices: tuple[str, ...] = ()
    columns: tuple[str, str] | None = None
    low: float | None = None
    high: float | None = None
    usual_low: float | None = None
    usual_high: float | None = None

    @property
    def dotted(self) -> str:
        """The full name, e.g. ``rider.positions[].cda_m2``."""
        return f"{self.section}.{self.name}"

    @property
    def expected(self) -> str:
        """What may stand there, in words."""
        if self.kind == "choice":
            return "one of " + ", ".join(f'"{choice}"' for choice in self.choices)
        bounds = "" if self.low is None else f" from {self.low:g} to {self.high:g}"
        words = {
            "flag": "true or false",
            "clock": 'a clock such as "09:30"',
            "path": "a path in quotes",
            "text": "text in quotes",
            "number": f"a number{bounds}",
            "integer": f"a whole number{bounds}",
            "numbers": f"a list of numbers{bounds}",
            "text or integer": f"text in quotes, or a whole number{bounds}",
        }
        if self.kind in words:
            return words[self.kind]
        table = "{{ {} = [...], {} = [...] }}".format(*(self.columns or ("", "")))
        if self.kind == "yaw table":
            return f"a table {table}"
        return f"a number{bounds} or a table {table}"


@cache
def sections() -> dict[str, dict[str, Key]]:
    """Every section's keys in the order of ``defaults.toml``; ``air.hours[]`` repeats air's."""
    text = resources.files("pacing.race").joinpath("defaults.toml").read_text(encoding="utf-8")
    table = {
        section: {name: _key(section, name, entry) for name, entry in keys.items()}
        for section, keys in tomllib.loads(text).items()
    }
    weather = {
        name: _key("air.hours[]", name, entry)
        for name, entry in tomllib.loads(text)["air"].items()
        if name != "file"
    }
    table["air.hours[]"] |= weather
    return table


def _key(section: str, name: str, entry: dict[str, Any]) -> Key:
    low, high = entry.pop("range", (None, None))
    usual_low, usual_high = entry.pop("usual", (low, high))
    choices = tuple(entry.pop("choices", ()))
    columns = entry.pop("columns", None)
    return Key(
        section,
        name,
        choices=choices,
        columns=None if columns is None else (columns[0], columns[1]),
        low=low,
        high=high,
        usual_low=usual_low,
        usual_high=usual_high,
        **entry,
    )


def lists_of(section: str) -> tuple[str, ...]:
    """The lists of tables a section may hold: ``positions`` for ``rider``."""
    start = section + "."
    return tuple(
        name[len(start) : -len(LIST_MARK)]
        for name in sections()
        if name.startswith(start) and name.endswith(LIST_MARK)
    )
