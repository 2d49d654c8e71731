"""A picture under the name the user gave: refused before any work, or written whole."""

from __future__ import annotations

from pathlib import Path

from matplotlib.figure import Figure

from pacing.errors import UnusableInputError
from pacing.report import style

DPI = 110
SUFFIXES = {".png": style.PNG_METADATA, ".pdf": style.PDF_METADATA, ".svg": {"Date": None}}


def check_picture_name(file: Path) -> None:
    """Refuse, before any work, a picture that cannot be written under that name."""
    if file.suffix.lower() not in SUFFIXES:
        raise UnusableInputError(
            f"a picture called '{file.name}'",
            key="--output",
            expected="a name that ends in " + ", ".join(SUFFIXES),
        )
    if not file.absolute().parent.is_dir():
        raise UnusableInputError(
            "no such folder", file=file.parent, key="--output", mend="make the folder first"
        )


def save_figure(picture: Figure, file: Path) -> None:
    """Write a figure to ``file`` (.png, .pdf or .svg); complete or not at all.

    Call inside ``style.applied()``. Raises UnusableInputError where it cannot be written.
    """
    beside = file.with_name(f".{file.name}.part")
    suffix = file.suffix.lower()
    try:
        picture.savefig(beside, format=suffix[1:], dpi=DPI, metadata=SUFFIXES[suffix])
        beside.replace(file)
    except OSError as problem:
        raise UnusableInputError(
            f"cannot be written ({problem.strerror})", file=file, key="--output"
        ) from None
    finally:
        beside.unlink(missing_ok=True)
