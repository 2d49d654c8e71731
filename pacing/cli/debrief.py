"""``pacing debrief``: ridden against planned."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from pacing.cli.everywhere import Debug, Json, Version, print_result

if TYPE_CHECKING:
    from pacing.field.recording_columns import Column
    from pacing.race import Race


def debrief(
    race: Annotated[
        Path,
        typer.Argument(
            metavar="RACE.toml",
            help="The race file, with the air of the day if it is known by now.",
            show_default=False,
        ),
    ],
    ride: Annotated[
        Path,
        typer.Argument(
            metavar="RIDE", help="The ride with power, as CSV or GPX.", show_default=False
        ),
    ],
    predict: Annotated[
        bool,
        typer.Option(
            "--predict",
            help="Only check the model: predict the ride from its recorded power.",
            show_default=False,
        ),
    ] = False,
    columns: Annotated[
        list[str] | None,
        typer.Option(
            metavar="OURS=THEIRS",
            help="Other column names, with a factor if need be: power_w=Watts,speed_m_s=kmh*0.2778",
            show_default=False,
        ),
    ] = None,
    output: Annotated[
        Path | None,
        typer.Option(
            "--output",
            "-o",
            metavar="FOLDER",
            help="Where table and picture go; by default beside the race file, named after it"
            " (with --predict: nowhere).",
            show_default=False,
        ),
    ] = None,
    season: Annotated[
        Path | None,
        typer.Option(
            metavar="FILE.csv",
            help="The season log to add to; by default season.csv beside the race file.",
            show_default=False,
        ),
    ] = None,
    json: Json = False,
    debug: Debug = False,
    version: Version = False,
) -> None:
    """Where the time went, why, and which numbers to bring up to date.

    \b
    Example:
      pacing debrief my-race/race.toml ride.csv
    """
    from pacing.field.recording_columns import columns_from
    from pacing.race import load_race
    from pacing.report.output_set import make_ready

    by_name = columns_from(columns or [])
    loaded = load_race(race)
    if predict:
        _predict(loaded, ride, by_name, output, as_json=json)
        return
    from pacing.report.debrief_export import DEBRIEF_OUTPUT, write_debrief

    folder = output or race.with_name(f"{race.stem}-debrief")
    make_ready(folder, DEBRIEF_OUTPUT)
    from pacing.field.debrief import debrief_ride
    from pacing.field.season import (
        add_to_log,
        entry_of,
        log_file,
        read_log,
        rider_of,
        track_record,
    )
    from pacing.report.debrief_report import debrief_document, debrief_text

    log = season or log_file(loaded)
    read_log(log)
    found = debrief_ride(loaded, ride, columns=by_name)
    add_to_log(log, entry_of(found))
    record = track_record(read_log(log), rider_of(loaded))
    write_debrief(found, folder, record)
    print_result(
        lambda: (
            debrief_text(found, record) + f"\nTable and picture: {folder}\nThe season so far: {log}"
        ),
        lambda: debrief_document(found, record),
        as_json=json,
    )


def _predict(
    loaded: Race,
    ride: Path,
    by_name: Mapping[str, Column],
    output: Path | None,
    *,
    as_json: bool,
) -> None:
    from pacing.field.debrief_predict import predict
    from pacing.field.recording_check import check
    from pacing.field.recording_read import read_recording
    from pacing.report.debrief_export import PREDICTION_OUTPUT, write_prediction
    from pacing.report.debrief_report import prediction_document, prediction_text
    from pacing.report.output_set import make_ready

    if output is not None:
        make_ready(output, PREDICTION_OUTPUT)
    checked = check(read_recording(ride, by_name))
    found = predict(checked, loaded)
    name = checked.recording.name
    if output is not None:
        write_prediction(found, name, output)
    print_result(
        lambda: prediction_text(found, name).rstrip("\n"),
        lambda: prediction_document(found, name),
        as_json=as_json,
    )
