"""The nearest known name to a mistyped one."""

from __future__ import annotations

from collections.abc import Iterable
from difflib import SequenceMatcher

from pacing.race.keys import LIST_MARK, sections

LONGEST_COMPARED = 60


def nearest(name: str, known: Iterable[str]) -> str:
    """The known name most like ``name``; there must be at least one."""
    wanted = name[:LONGEST_COMPARED].lower()
    return max(known, key=lambda other: SequenceMatcher(None, wanted, other.lower()).ratio())


def did_you_mean(name: str, known: Iterable[str]) -> str:
    """The question that ends an error about a mistyped name."""
    return f"did you mean {nearest(name, known)}?"


def did_you_mean_key(name: str, section: str, lists: Iterable[str] = ()) -> str:
    """The same for a key of ``section``; the very name in another table comes first."""
    elsewhere = [s for s, keys in sections().items() if name in keys and s != section]
    if elsewhere:
        return f"did you mean {elsewhere[0]}.{name}?"
    return did_you_mean(name, [*sections()[section], *lists])


def did_you_mean_anywhere(name: str) -> str:
    """The same for a key that stands outside all tables."""
    homes = {key: section for section, keys in reversed(sections().items()) for key in keys}
    key = nearest(name, homes)
    return f"did you mean {homes[key].replace(LIST_MARK, '')}.{key}?"
