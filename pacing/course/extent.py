"""Whether there is a course at all, and how long it may be."""

from __future__ import annotations

from pacing.errors import UnusableInputError

LONGEST_M = 1_000_000.0
LONGEST_SURVEYED_M = 2_000_000.0
SHORTEST_M = 100.0


class NoCourseError(UnusableInputError):
    """The file can be read but no course surveyed: none, a spot, half a continent, or several."""


def refuse_long(length_m: float, file: object) -> UnusableInputError | None:
    """Why a course is too long for a plan: the error to raise, or None.

    A NoCourseError where it is too long to be laid out on a grid at all.
    """
    if length_m <= LONGEST_M:
        return None
    kind = NoCourseError if length_m > LONGEST_SURVEYED_M else UnusableInputError
    return kind(
        f"{length_m / 1000:,.0f} km of road",
        file=file,
        expected=f"a course of at most {LONGEST_M / 1000:,.0f} km, all laps included",
        mend="choose a part with course.from_km and course.to_km",
    )


def refuse_short(length_m: float, file: object) -> NoCourseError | None:
    """Why a course is too short for a plan: the error to raise, or None."""
    if length_m >= SHORTEST_M:
        return None
    return NoCourseError(
        f"{length_m:.0f} m of road",
        file=file,
        expected=f"a course of at least {SHORTEST_M:.0f} m",
        mend="export the whole course",
    )
