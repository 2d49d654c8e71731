"""``pacing course``: check a course file and say what was repaired."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from pacing.cli.everywhere import Debug, Json, Version, print_result


def course(
    course: Annotated[
        Path,
        typer.Argument(
            metavar="COURSE", help="The course: a GPX file or a CSV table.", show_default=False
        ),
    ],
    picture: Annotated[
        Path | None,
        typer.Option(
            "--output",
            "-o",
            metavar="PICTURE",
            help="Draw the heights, the gradient and the repairs: .png, .pdf or .svg.",
            show_default=False,
        ),
    ] = None,
    track: Annotated[
        str | None,
        typer.Option(
            metavar="NAME", help="Which track or route, by name or number.", show_default=False
        ),
    ] = None,
    json: Json = False,
    debug: Debug = False,
    version: Version = False,
) -> None:
    """Checks a course file and says what was repaired.

    \b
    Example:
      pacing course sunday.gpx -o sunday.png
    """
    from pacing.course import CourseSpec
    from pacing.course.extent import NoCourseError
    from pacing.course.load import survey_course
    from pacing.report.course_picture import save_picture
    from pacing.report.course_report import course_document, course_text, no_course_document
    from pacing.report.picture_file import check_picture_name

    if picture is not None:
        check_picture_name(picture)
    try:
        survey = survey_course(CourseSpec(file=course, track=track))
    except NoCourseError as problem:
        if json:
            document = no_course_document(problem)
            print_result(str, lambda: document, as_json=True)
        raise
    if picture is not None:
        save_picture(survey.course, picture)
    print_result(
        lambda: course_text(survey.course), lambda: course_document(survey.course), as_json=json
    )
    if survey.refusals:
        raise survey.refusals[0]
