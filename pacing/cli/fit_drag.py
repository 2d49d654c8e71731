"""``pacing fit-drag``: drag area and rolling coefficient from field rides."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from pacing.cli.everywhere import Debug, Json, Version, print_result


def fit_drag(
    rides: Annotated[
        list[Path],
        typer.Argument(
            metavar="RIDE...",
            help="Rides with power as CSV or GPX: laps, out and back, steady runs, coast-downs.",
            show_default=False,
        ),
    ],
    race: Annotated[
        Path | None,
        typer.Option(
            "--race",
            metavar="RACE.toml",
            help="The race file that gives masses, air and efficiency of these rides.",
            show_default=False,
        ),
    ] = None,
    picture: Annotated[
        Path | None,
        typer.Option(
            "--output",
            "-o",
            metavar="PICTURE",
            help="Draw the height misfit along the rides: .png, .pdf or .svg.",
            show_default=False,
        ),
    ] = None,
    columns: Annotated[
        list[str] | None,
        typer.Option(
            metavar="OURS=THEIRS",
            help="Other column names, with a factor if need be: power_w=Watts,speed_m_s=kmh*0.2778",
            show_default=False,
        ),
    ] = None,
    position: Annotated[
        list[str] | None,
        typer.Option(
            metavar="NAME=WHERE",
            help="A position and when it was held, by lap or seconds: 'drops=lap 2,4' or"
            " 'drops=600-1200'. Repeat it for each.",
            show_default=False,
        ),
    ] = None,
    method: Annotated[
        str | None,
        typer.Option(
            metavar="METHOD",
            help="steady runs, energy balance or coast-downs; default by the rides, and said.",
            show_default=False,
        ),
    ] = None,
    json: Json = False,
    debug: Debug = False,
    version: Version = False,
) -> None:
    """Finds drag area and rolling resistance from field rides, and says how sure they are.

    \b
    Example:
      pacing fit-drag laps.csv --race race.toml -o misfit.png
    """
    from pacing.errors import UnusableInputError
    from pacing.field.drag_groups import positions_from
    from pacing.field.recording_columns import columns_from
    from pacing.report.picture_file import check_picture_name

    if race is None:
        raise UnusableInputError(
            "no race file",
            key="--race",
            expected="a race file with the masses, the air and the bicycle of these rides",
            mend="`pacing new FOLDER` writes one to fill in",
        )
    if picture is not None:
        check_picture_name(picture)
    by_name, when = columns_from(columns or []), positions_from(position or [])
    from pacing.field.drag_fit import fit_drag as fit
    from pacing.race import load_race
    from pacing.report.drag_report import drag_document, drag_text

    loaded = load_race(race)
    found = fit(rides, race=loaded, columns=by_name, positions=when, method=method)
    if picture is not None:
        from pacing.report.drag_picture import save_drag_picture

        save_drag_picture(found, picture)
    print_result(lambda: drag_text(found).rstrip("\n"), lambda: drag_document(found), as_json=json)
