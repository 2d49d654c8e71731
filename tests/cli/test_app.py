"""The command line as a whole: statuses, one message an error, silence where it is due."""

from __future__ import annotations

import json
import os
import re
import signal
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

import pacing
from pacing.cli.app import main
from pacing.errors import CannotBeRiddenError, OurFaultError

COMMANDS = ("new", "course", "plan", "fit-power")
NEEDED = {"new": "FOLDER", "course": "COURSE", "plan": "RACE.toml", "fit-power": "EFFORTS.csv"}
HEAVY = ("scipy", "pandas", "matplotlib", "gpxpy", "numpy", "rich")


def pacing_run(*arguments: str, **how: object) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "pacing.cli.app", *arguments],
        capture_output=True,
        text=True,
        check=False,
        timeout=60,
        **how,  # type: ignore[call-overload]
    )


@pytest.mark.parametrize("arguments", [["--help"], ["plan", "--help"], ["--version"]])
def test_help_imports_nothing_heavy(arguments: list[str]) -> None:
    code = (
        "import sys\nfrom pacing.cli.app import main\n"
        f"status = main({arguments!r})\n"
        f"loaded = [name for name in {HEAVY!r} if name in sys.modules]\n"
        "assert not loaded, loaded\nsys.exit(status)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert (done.returncode, done.stderr) == (0, "")


def test_importing_the_package_imports_nothing_heavy() -> None:
    code = f"import sys, pacing\nassert not [n for n in {HEAVY!r} if n in sys.modules]"
    subprocess.run([sys.executable, "-c", code], check=True)


def test_the_public_names_are_there() -> None:
    assert callable(pacing.load_race)
    assert callable(pacing.plan_race)
    assert issubclass(pacing.UnusableInputError, pacing.PacingError)
    assert set(pacing.__all__) <= set(dir(pacing))
    with pytest.raises(AttributeError, match="no attribute 'plan_rase'"):
        pacing.plan_rase  # noqa: B018


@pytest.mark.parametrize("command", COMMANDS)
def test_every_command_has_help_with_an_example(
    command: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main([command, "--help"]) == 0
    out, err = capsys.readouterr()
    assert f"\n    pacing {command} " in out
    assert "Example:" in out
    for option in ("--json", "--debug", "--version", "--help"):
        assert option in out
    assert err == ""


def test_help_is_plain_text(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["--help"]) == 0
    text = capsys.readouterr().out
    assert re.fullmatch(r"[\n -~′]+", text), "no boxes, colours or pictures"
    assert all(f"\n  {command} " in text for command in COMMANDS)


@pytest.mark.parametrize("arguments", [["--version"], *([c, "--version"] for c in COMMANDS)])
def test_the_version_is_printed(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    assert main(arguments) == 0
    assert capsys.readouterr().out == f"pacing {pacing.__version__}\n"


@pytest.mark.parametrize("command", COMMANDS)
def test_a_missing_argument_is_one_plain_message(
    command: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main([command]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err == f"pacing: Missing argument '{NEEDED[command]}'. See pacing {command} --help\n"


@pytest.mark.parametrize(
    "arguments",
    [["plan", "race.toml", "--cue", "3"], ["plann"], ["plan", "r.toml", "--cues", "x"], ["--x"]],
)
def test_wrong_usage_is_one_plain_message(
    arguments: list[str], capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(arguments) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert re.fullmatch(r"pacing: [ -~]+ See pacing( plan)? --help\n", err)


def test_no_arguments_give_help_and_status_2(capsys: pytest.CaptureFixture[str]) -> None:
    assert main([]) == 2
    assert capsys.readouterr().err.startswith("Usage: pacing [OPTIONS] COMMAND")


@pytest.fixture
def failing(
    write_race: Callable[..., Path], monkeypatch: pytest.MonkeyPatch
) -> Callable[[BaseException], list[str]]:
    """Arguments of a ``pacing plan`` that meets a given exception."""

    def prepare(problem: BaseException) -> list[str]:
        def fail(_: object) -> None:
            raise problem

        monkeypatch.setattr("pacing.plan.plan_race", fail)
        return ["plan", str(write_race())]

    return prepare


@pytest.mark.parametrize(
    ("problem", "status", "message"),
    [
        (CannotBeRiddenError("The rider stalls at km 3."), 1, "The rider stalls at km 3."),
        (
            OurFaultError("Solver and simulator disagree."),
            3,
            "a fault of this program: Solver and simulator disagree.",
        ),
        (
            ZeroDivisionError("division by zero"),
            3,
            "a fault of this program (ZeroDivisionError: division by zero). "
            "Run it again with --debug to see where, and report that.",
        ),
        (
            MemoryError(),
            3,
            "a fault of this program (MemoryError). "
            "Run it again with --debug to see where, and report that.",
        ),
    ],
)
def test_an_error_is_one_message_and_a_status(
    failing: Callable[[BaseException], list[str]],
    capsys: pytest.CaptureFixture[str],
    problem: Exception,
    status: int,
    message: str,
) -> None:
    assert main(failing(problem)) == status
    assert capsys.readouterr() == ("", f"pacing: {message}\n")


def test_debug_shows_where_an_error_arose(
    failing: Callable[[BaseException], list[str]], capsys: pytest.CaptureFixture[str]
) -> None:
    assert main([*failing(ZeroDivisionError("x")), "--debug"]) == 3
    err = capsys.readouterr().err
    assert err.startswith("Traceback (most recent call last):")
    assert err.endswith("\npacing: a fault of this program (ZeroDivisionError: x).\n")
    assert main([*failing(CannotBeRiddenError("x")), "--debug"]) == 1
    assert "Traceback" in capsys.readouterr().err


def test_an_interrupt_is_quiet_and_leaves_nothing(
    failing: Callable[[BaseException], list[str]],
    capsys: pytest.CaptureFixture[str],
    tmp_path: Path,
) -> None:
    assert main(failing(KeyboardInterrupt())) == 130
    assert capsys.readouterr() == ("", "")
    assert sorted(file.name for file in tmp_path.iterdir()) == ["course.gpx", "race.toml"]


@pytest.mark.skipif(os.name != "posix", reason="signals")
def test_a_real_interrupt_ends_with_130(write_race: Callable[..., Path]) -> None:
    code = (
        "import signal, sys, time\nimport pacing.plan\nfrom pacing.cli.app import main\n"
        # a background shell hands its children a SIGINT that is ignored
        "signal.signal(signal.SIGINT, signal.default_int_handler)\n"
        "def wait(_):\n    print('ready', flush=True)\n    time.sleep(30)\n"
        "pacing.plan.plan_race = wait\n"
        f"sys.exit(main(['plan', {str(write_race())!r}]))"
    )
    process = subprocess.Popen(
        [sys.executable, "-c", code], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    )
    assert process.stdout is not None
    assert process.stdout.readline() == "ready\n"
    process.send_signal(signal.SIGINT)
    _, err = process.communicate(timeout=30)
    assert (process.returncode, err) == (130, "")


@pytest.mark.skipif(os.name != "posix", reason="pipes")
@pytest.mark.parametrize("arguments", [["--help"], ["new", "{}/x", "--json"], ["new", "{}/y"]])
def test_a_closed_pipe_is_silent(arguments: list[str], tmp_path: Path) -> None:
    read, write = os.pipe()
    os.close(read)
    done = subprocess.run(
        [sys.executable, "-m", "pacing.cli.app", *(a.format(tmp_path) for a in arguments)],
        stdout=write,
        stderr=subprocess.PIPE,
        text=True,
        check=False,
    )
    os.close(write)
    assert (done.returncode, done.stderr) == (0, "")


@pytest.mark.skipif(os.name != "posix", reason="pipes")
def test_a_pipe_closed_in_the_middle_is_silent(tmp_path: Path) -> None:
    code = (
        "import sys\nfrom pacing.cli import app\n"
        "@app.app.command()\ndef endless() -> None:\n"
        "    while True:\n        print('line ' * 100)\n"
        "sys.exit(app.main(['endless']))"
    )
    with subprocess.Popen(
        [sys.executable, "-c", code], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    ) as process:
        assert process.stdout is not None
        process.stdout.readline()
        process.stdout.close()
        assert process.stderr is not None
        assert process.stderr.read() == ""
        assert process.wait(timeout=30) == 0


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no such device here")
def test_a_full_disk_behind_standard_output_is_told(tmp_path: Path) -> None:
    with open("/dev/full", "w") as full:  # noqa: PTH123
        done = subprocess.run(
            [sys.executable, "-m", "pacing.cli.app", "--help"],
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            check=False,
        )
    assert done.returncode == 2
    assert done.stderr == ("pacing: standard output: cannot be used (No space left on device).\n")


def test_json_is_one_strict_document(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["new", str(tmp_path / "x"), "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["schema"] == "new/1"


def test_the_script_is_installed(tmp_path: Path) -> None:
    done = pacing_run("plan", str(tmp_path / "race.toml"))
    assert (done.returncode, done.stdout) == (2, "")
    assert done.stderr == (
        f"pacing: {tmp_path / 'race.toml'}: no such file; expected a race file (TOML).\n"
    )


def test_a_terminal_of_few_letters_gets_the_message_all_the_same(tmp_path: Path) -> None:
    file = tmp_path / "race.toml"
    file.write_text("[plan]\nrisk_pct = 1\n")
    done = pacing_run("plan", str(file), env={**os.environ, "PYTHONIOENCODING": "ascii"})
    assert done.returncode == 2
    assert "running out of W\\u2032 is not built" in done.stderr
