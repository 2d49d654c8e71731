"""Published sources, cited by key from the docstrings and in the README."""

from __future__ import annotations

from typing import NamedTuple


class Source(NamedTuple):
    """One published source."""

    authors: str
    year: int
    title: str
    where: str


SOURCES: dict[str, Source] = {
    "martin-1998": Source(
        "Martin, Milliken, Cobb, McFadden, Coggan",
        1998,
        "Validation of a mathematical model for road cycling power",
        "J Appl Biomech 14(3):276-291",
    ),
}
