"""One family of errors: what was found, where, what was expected and how to mend it.

Library code raises these; the command line turns them into one message and an exit status.
"""

from __future__ import annotations


class PacingError(Exception):
    """Base of every error this package raises on purpose."""

    exit_status = 3


class UnusableInputError(PacingError):
    """A file, key or argument that cannot be used (exit status 2).

    The message is assembled from its parts, each of which may be left out, as
    ``file, line N: key: found, expected; how to mend it``.
    """

    exit_status = 2

    def __init__(
        self,
        found: str,
        *,
        file: object = None,
        line: int | None = None,
        key: str | None = None,
        expected: str | None = None,
        mend: str | None = None,
    ) -> None:
        self.found = found
        self.file = None if file is None else str(file)
        self.line = line
        self.key = key
        self.expected = expected
        self.mend = mend
        place = "" if self.file is None else self.file
        if line is not None:
            place += f", line {line}" if place else f"line {line}"
        parts = [part for part in (place, key) if part]
        text = ": ".join([*parts, found])
        if expected:
            text += f"; expected {expected}"
        if mend:
            text += f". {mend[0].upper()}{mend[1:]}"
        super().__init__(text if text.endswith((".", "?")) else text + ".")


class CannotBeRiddenError(PacingError):
    """The race as described cannot be ridden: a stall, a reserve that cannot be kept (status 1)."""

    exit_status = 1


class OurFaultError(PacingError):
    """A fault of this program: two of its own parts disagree (exit status 3)."""

    exit_status = 3
