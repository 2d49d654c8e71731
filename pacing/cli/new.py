"""``pacing new``: a starter folder that plans at once."""

from __future__ import annotations

import os
from importlib import resources
from pathlib import Path
from typing import Annotated

import typer

from pacing.cli.everywhere import Debug, Json, Version, print_result

STARTER = ("race.toml", "course.gpx", "efforts.csv")


def new(
    folder: Annotated[
        Path,
        typer.Argument(metavar="FOLDER", help="A folder to make or fill.", show_default=False),
    ],
    json: Json = False,
    debug: Debug = False,
    version: Version = False,
) -> None:
    """Make a starter folder that plans at once.

    It holds a commented race file, a sample course and sample efforts.

    \b
    Example:
      pacing new my-race
      pacing plan my-race/race.toml
    """
    write_starter(folder)
    print_result(
        lambda: "\n".join(
            (
                f"{folder} holds {', '.join(STARTER)}.",
                f"Put in your own course and numbers, then: pacing plan {folder / STARTER[0]}",
            )
        ),
        lambda: {"schema": "new/1", "folder": str(folder), "files": list(STARTER)},
        as_json=json,
    )


def write_starter(folder: Path) -> None:
    """Writes the starter files into ``folder``, all or none, never over an existing file.

    Raises `UnusableInputError` where one of them is there already, or nothing can be written.
    """
    from pacing.errors import UnusableInputError

    source = resources.files("pacing.race").joinpath("starter")
    made: list[Path] = []
    try:
        there = [name for name in STARTER if os.path.lexists(folder / name)]
        if there:
            raise UnusableInputError(
                f"there already: {', '.join(there)}",
                file=folder,
                expected="a folder without these",
                mend="choose another folder; nothing was written",
            )
        made += _folders(folder)
        for name in STARTER:
            with (folder / name).open("xb") as stream:
                made.append(folder / name)
                stream.write(source.joinpath(name).read_bytes())
    except (OSError, ValueError) as problem:
        _take_back(made)
        reason = getattr(problem, "strerror", None) or str(problem)
        raise UnusableInputError(
            f"cannot be written ({reason})", file=folder, expected="a folder that can be written"
        ) from None
    except BaseException:
        _take_back(made)
        raise


def _folders(folder: Path) -> list[Path]:
    missing = [place for place in (folder, *folder.parents) if not place.exists()]
    made = []
    for place in reversed(missing):
        place.mkdir()
        made.append(place)
    return made


def _take_back(made: list[Path]) -> None:
    for path in reversed(made):
        path.rmdir() if path.is_dir() else path.unlink(missing_ok=True)
