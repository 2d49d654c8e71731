"""``pacing plan``: the main job."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from pacing.cli.everywhere import Debug, Json, Version, print_result

if TYPE_CHECKING:
    from pacing.plan import Plan


def plan(
    race: Annotated[
        Path, typer.Argument(metavar="RACE.toml", help="The race file.", show_default=False)
    ],
    output: Annotated[
        Path | None,
        typer.Option(
            "--output",
            "-o",
            metavar="FOLDER",
            help="Where the plan goes; by default beside the race file, named after it.",
            show_default=False,
        ),
    ] = None,
    air: Annotated[
        Path | None,
        typer.Option(
            metavar="DAY.toml", help="Take the air from this file instead.", show_default=False
        ),
    ] = None,
    start: Annotated[
        str | None,
        typer.Option(metavar="HH:MM", help="Start at this clock instead.", show_default=False),
    ] = None,
    cues: Annotated[
        int | None,
        typer.Option(metavar="N", help="Print at most so many cues.", show_default=False),
    ] = None,
    json: Json = False,
    debug: Debug = False,
    version: Version = False,
) -> None:
    """The powers to ride, the times to expect, and a sheet for the bars.

    \b
    Example:
      pacing plan my-race/race.toml -o sunday --start 10:42
    """
    from pacing.race import load_race
    from pacing.report.output_set import make_ready

    loaded = load_race(race, air=air, start=start, cues=cues)
    folder = output or race.with_name(f"{race.stem}-plan")
    make_ready(folder)
    from pacing.plan import plan_race

    planned = plan_race(loaded)
    planned.save(folder)
    print_result(lambda: _text(planned, folder), planned.to_json_dict, as_json=json)


def _text(planned: Plan, folder: Path) -> str:
    from pacing.report.tables import plan_text

    return f"{plan_text(planned).rstrip()}\n\nThe sheet for the bars and all files: {folder}"
