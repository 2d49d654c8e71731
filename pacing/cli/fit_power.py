"""``pacing fit-power``: critical power and W′ from test efforts."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from pacing.cli.everywhere import Debug, Json, Version, print_result


def fit_power(
    efforts: Annotated[
        Path,
        typer.Argument(
            metavar="EFFORTS.csv",
            help="A table of efforts (duration_s, power_w, if you like date and position), or a"
            " ride with power, both as CSV.",
            show_default=False,
        ),
    ],
    picture: Annotated[
        Path | None,
        typer.Option(
            "--output",
            "-o",
            metavar="PICTURE",
            help="Draw efforts, curve and band: .png, .pdf or .svg.",
            show_default=False,
        ),
    ] = None,
    form: Annotated[
        str | None,
        typer.Option(
            metavar="FORM",
            help="two-parameter or three-parameter; default by the efforts, and said.",
            show_default=False,
        ),
    ] = None,
    json: Json = False,
    debug: Debug = False,
    version: Version = False,
) -> None:
    """Fits critical power and W′ to test efforts, with their errors.

    \b
    Example:
      pacing fit-power efforts.csv -o fit.png
    """
    from pacing.errors import UnusableInputError
    from pacing.field.power_test import evaluate
    from pacing.report.picture_file import check_picture_name
    from pacing.report.power_report import power_document, power_text

    if picture is not None:
        check_picture_name(picture)
    fit, means, warnings = evaluate(efforts, form=form)
    if picture is not None:
        if fit is None:
            raise UnusableInputError(
                "no fit to draw", file=efforts, expected="means of at least two durations"
            )
        from pacing.report.power_picture import save_power_picture

        save_power_picture(fit, picture)
    print_result(
        lambda: power_text(fit, means, warnings).rstrip("\n"),
        lambda: power_document(fit, means, warnings),
        as_json=json,
    )
