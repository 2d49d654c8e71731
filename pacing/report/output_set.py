"""An output folder as a set: complete or absent, never over files that are not ours.

The new set is written into a folder beside the old one, then the two change places by renames.
A crash between the renames leaves the old set whole under another name, and the next run puts
it back. Nothing is ever deleted but files of the set's own names.
"""

from __future__ import annotations

import errno
import os
import re
import secrets
import shutil
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path

from pacing.errors import OurFaultError, UnusableInputError

LEFT_BY_FILE_VIEWERS = frozenset({".DS_Store", "Thumbs.db", "desktop.ini"})
HEAD_BYTES = 4096


@dataclass(frozen=True)
class OutputKind:
    """The files a set may hold, and the one of them whose ``schema`` proves the set ours."""

    names: frozenset[str]
    proof: str
    schema: str


PLAN_OUTPUT = OutputKind(
    names=frozenset(
        {
            "plan.json", "cues.csv", "trace.csv", "cue-sheet.pdf", "cue-sheet.png",
            "profile.png", "map.png", "cues.gpx", "positions.png", "report.html",
        }
    ),
    proof="plan.json",
    schema="plan/",
)  # fmt: skip


def make_ready(folder: Path | str, kind: OutputKind = PLAN_OUTPUT) -> Path:
    """Where the set will stand, after putting back what an interrupted run left.

    To be called before long work, so that a folder that cannot be used is told at once.
    Raises `UnusableInputError`: a file of that name, files that are not ours, not writable.
    """
    asked, place = Path(folder), _resolved(Path(folder))
    try:
        _put_back(place, kind)
        _refuse_foreign(asked, place, kind)
        _try_writing(place)
    except OSError as problem:
        raise _unusable(asked, problem) from None
    return place


@contextmanager
def output_set(folder: Path | str, kind: OutputKind = PLAN_OUTPUT) -> Iterator[Path]:
    """A new folder to write a set into; it takes the place of ``folder`` when all is written.

    On any error, and when interrupted, the old set stays as it was and nothing is left behind.
    Raises as `make_ready` does.
    """
    asked, place = Path(folder), make_ready(folder, kind)
    made: list[Path] = []
    try:
        made = _with_parents(place)
        room = _new_name(place)
        room.mkdir()
    except OSError as problem:
        _remove_empty(made)
        raise _unusable(asked, problem) from None
    try:
        yield room
        _settle(room, kind)
        _swap_in(room, place, kind)
    except BaseException as problem:
        _remove(room, kind, also_unknown=True)
        _remove_empty(made)
        if isinstance(problem, OSError):
            raise _unusable(asked, problem) from None
        raise


def _resolved(folder: Path) -> Path:
    try:
        place = folder.resolve()
        if place.is_dir() and place == Path.cwd():
            raise UnusableInputError(
                "the folder you are in", file=folder, expected="a folder of its own for the output"
            )
    except (ValueError, OSError, RuntimeError) as problem:
        raise _unusable(folder, problem) from None
    if not place.name:
        raise UnusableInputError("no place for output", file=folder, expected="a folder's name")
    return place


def _unusable(folder: Path, problem: Exception) -> UnusableInputError:
    reason = getattr(problem, "strerror", None) or str(problem)
    return UnusableInputError(
        f"cannot be written ({reason})",
        file=folder,
        expected="a folder that can be written",
        mend="choose another with -o",
    )


def _beside(place: Path, what: str) -> Path:
    return place.with_name(f".{place.name}.pacing-{what}")


def _new_name(place: Path) -> Path:
    return _beside(place, f"new-{os.getpid()}-{secrets.token_hex(4)}")


def _put_back(place: Path, kind: OutputKind) -> None:
    """Ends what a killed run began: the old set back in its place, its unfinished one away."""
    old = _beside(place, "old")
    if old.is_dir():
        if place.exists():
            _remove(old, kind)
        else:
            old.rename(place)
    pattern = re.compile(re.escape(_beside(place, "new-").name) + r"(\d+)-[0-9a-f]{8}")
    if place.parent.is_dir():
        for left in list(place.parent.iterdir()):
            found = pattern.fullmatch(left.name)
            if found and not _running(int(found[1])):
                _remove(left, kind)


def _running(process: int) -> bool:
    if os.name != "posix":
        return True
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return False
    except (OSError, OverflowError):
        return True
    return True


def _refuse_foreign(asked: Path, place: Path, kind: OutputKind) -> None:
    if not place.exists():
        return
    if not place.is_dir():
        raise UnusableInputError(
            "a file, not a folder", file=asked, mend="choose another folder with -o"
        )
    entries = [entry for entry in place.iterdir() if entry.name not in LEFT_BY_FILE_VIEWERS]
    ours = {e.name for e in entries if e.name in kind.names and e.is_file() and not e.is_symlink()}
    foreign = sorted(entry.name for entry in entries if entry.name not in ours)
    if not foreign and (not entries or _proven(place, kind)):
        return
    found = ", ".join(foreign[:3]) + (", …" if len(foreign) > 3 else "")
    reason = found or f"no {kind.proof} of ours beside {min(ours)}"
    raise UnusableInputError(
        f"holds files that are not ours ({reason})",
        file=asked,
        expected="a new or empty folder, or one from an earlier run",
        mend="choose another with -o",
    )


def _proven(place: Path, kind: OutputKind) -> bool:
    try:
        with (place / kind.proof).open("rb") as stream:
            head = stream.read(HEAD_BYTES)
    except OSError:
        return False
    return re.search(rb'"schema"\s*:\s*"' + re.escape(kind.schema.encode()), head) is not None


def _try_writing(place: Path) -> None:
    """Fails early where the folder beside could not be made."""
    if place.parent.is_dir():
        trial = _new_name(place)
        trial.mkdir()
        trial.rmdir()
        return
    there = next(parent for parent in place.parents if parent.exists())
    if not (there.is_dir() and os.access(there, os.W_OK | os.X_OK)):
        raise PermissionError(errno.EACCES, os.strerror(errno.EACCES))


def _with_parents(place: Path) -> list[Path]:
    missing = [parent for parent in place.parents if not parent.exists()]
    made: list[Path] = []
    for parent in reversed(missing):
        parent.mkdir(exist_ok=True)
        made.append(parent)
    return made


def _settle(room: Path, kind: OutputKind) -> None:
    """Everything on the disk before the renames, so that a power cut cannot undo only half."""
    written = {file.name for file in room.iterdir()}
    if not written <= kind.names or not _proven(room, kind):
        raise OurFaultError(
            f"the output set is not as it should be: {', '.join(sorted(written)) or 'no files'}"
        )
    for name in written:
        handle = os.open(room / name, os.O_RDWR)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _swap_in(room: Path, place: Path, kind: OutputKind) -> None:
    old = _beside(place, "old")
    had_one = place.exists()
    if had_one:
        shutil.copymode(place, room)
        place.rename(old)
    try:
        room.rename(place)
    except BaseException:
        if had_one and not place.exists():
            old.rename(place)
        raise
    if had_one:
        # Renamed first: half of an old set must never look like one to be put back.
        away = _new_name(place)
        old.rename(away)
        _remove(away, kind)


def _remove(folder: Path, kind: OutputKind, *, also_unknown: bool = False) -> None:
    """Deletes the set's files, then the folder if that emptied it."""
    with suppress(OSError):
        for file in list(folder.iterdir()):
            if also_unknown or file.name in kind.names | LEFT_BY_FILE_VIEWERS:
                with suppress(OSError):
                    file.unlink()
        folder.rmdir()


def _remove_empty(folders: list[Path]) -> None:
    for folder in reversed(folders):
        with suppress(OSError):
            folder.rmdir()
