"""The application: its commands, and the one place where errors become messages and statuses."""

from __future__ import annotations

import os
import sys
import traceback
import warnings
from collections.abc import Sequence
from contextlib import suppress

import typer

from pacing.cli.course import course
from pacing.cli.debrief import debrief
from pacing.cli.everywhere import Debug, Version
from pacing.cli.fit_drag import fit_drag
from pacing.cli.fit_power import fit_power
from pacing.cli.new import new
from pacing.cli.plan import plan
from pacing.errors import OurFaultError, PacingError

for name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(name, "1")  # many small systems: threads only wait for each other

DONE, UNUSABLE, OUR_FAULT, INTERRUPTED = 0, 2, 3, 130

app = typer.Typer(
    name="pacing",
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    no_args_is_help=True,
)
for command in (new, course, plan, fit_power, fit_drag, debrief):
    app.command(command.__name__.replace("_", "-"))(command)


@app.callback()
def pacing(version: Version = False, debug: Debug = False) -> None:
    """Plan a cycling time trial: from a course file and a rider to the powers to ride.

    \b
    Example:
      pacing new my-race
      pacing plan my-race/race.toml
    """


def main(arguments: Sequence[str] | None = None) -> int:
    """Runs the command line and returns the exit status.

    0 done; 1 the race as described cannot be ridden; 2 unusable input or usage; 3 a fault of
    ours; 130 interrupted. A closed pipe is silent.
    """
    arguments = list(sys.argv[1:] if arguments is None else arguments)
    debug = "--debug" in arguments
    if not debug and not sys.warnoptions:
        warnings.simplefilter("ignore")
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")
    status = _run(arguments, debug=debug)
    try:
        if sys.stdout is not None:
            sys.stdout.flush()
    except BrokenPipeError:
        _discard_output()
    except OSError as problem:
        _discard_output()
        return _say(f"standard output: cannot be used ({problem.strerror}).", UNUSABLE)
    return status


def _run(arguments: list[str], *, debug: bool) -> int:
    try:
        status = app(args=arguments, prog_name="pacing", standalone_mode=False)
        return status if isinstance(status, int) else DONE
    except (typer.Abort, KeyboardInterrupt):
        return INTERRUPTED
    except PacingError as problem:
        _trace(debug)
        what = "a fault of this program: " if isinstance(problem, OurFaultError) else ""
        return _say(f"{what}{problem}", problem.exit_status)
    except SystemExit as stop:
        if isinstance(stop.__context__, BrokenPipeError):
            _discard_output()
            return DONE
        raise
    except BrokenPipeError:
        _discard_output()
        return DONE
    except OSError as problem:
        _trace(debug)
        where = problem.filename or "standard output"
        return _say(f"{where}: cannot be used ({problem.strerror or problem}).", UNUSABLE)
    except Exception as problem:
        if hasattr(problem, "format_message"):
            return _usage(problem)
        _trace(debug)
        name = f"{type(problem).__name__}: {problem}".rstrip(": ")
        hint = "" if debug else " Run it again with --debug to see where, and report that."
        return _say(f"a fault of this program ({name}).{hint}", OUR_FAULT)


def _usage(problem: Exception) -> int:
    """A mistake on the command line, in one line (the argument library's own error classes)."""
    context = getattr(problem, "ctx", None)
    command = context.command_path if context is not None else "pacing"
    message = str(problem.format_message()).strip()  # type: ignore[attr-defined]
    if message.startswith("Usage:"):
        print(message, file=sys.stderr)
        return UNUSABLE
    end = "" if message.endswith((".", "?")) else "."
    return _say(f"{message}{end} See {command} --help", UNUSABLE)


def _say(message: str, status: int) -> int:
    with suppress(OSError, ValueError):
        if sys.stdout is not None:
            sys.stdout.flush()
    with suppress(OSError, ValueError):
        print(f"pacing: {message}", file=sys.stderr, flush=True)
    return status


def _trace(debug: bool) -> None:
    if debug:
        with suppress(OSError, ValueError):
            traceback.print_exc()


def _discard_output() -> None:
    """Nobody reads on: let the interpreter's own last flush go nowhere."""
    with suppress(OSError, ValueError):
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.__stdout__.fileno())  # type: ignore[union-attr]


if __name__ == "__main__":
    sys.exit(main())
