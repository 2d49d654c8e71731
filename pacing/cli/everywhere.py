"""The options that every command has, and how a command prints its result."""

from __future__ import annotations

import sys
from collections.abc import Callable, Mapping
from typing import Annotated, Any

import typer

from pacing import __version__


def _print_version(asked: bool) -> None:
    if asked:
        print(f"pacing {__version__}")
        raise typer.Exit()


Json = Annotated[
    bool,
    typer.Option("--json", help="Print one JSON document instead of text.", show_default=False),
]
Debug = Annotated[
    bool, typer.Option("--debug", help="With an error, show where it arose.", show_default=False)
]
Version = Annotated[
    bool,
    typer.Option(
        "--version",
        help="Print the version and stop.",
        callback=_print_version,
        is_eager=True,
        show_default=False,
    ),
]


def print_result(
    text: Callable[[], str], document: Callable[[], Mapping[str, Any]], *, as_json: bool
) -> None:
    """The result on standard output, as text or as one strict JSON document."""
    if as_json:
        from pacing.report.strict_json import json_text

        sys.stdout.write(json_text(document()))
    else:
        print(text())
