"""The README's commands are those of continuous integration, and all of them work."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path
from types import ModuleType

import pytest

from pacing.cli.app import app

VENV = "python3 -m venv --without-pip .venv && python3 -m pip --python .venv install -q "
PLAN = f"{VENV}. && .venv/bin/pacing plan demo/race.toml -o demo/out"
TEST = f"{VENV}'.[test,reference]' && .venv/bin/pytest"
BLOCK = re.compile(r"^```(\w*)\n(.*?)^```$", re.DOTALL | re.MULTILINE)


def blocks(readme: str, language: str) -> list[str]:
    """The README's blocks in one language."""
    return [text for kind, text in BLOCK.findall(readme) if kind == language]


def commands(readme: str) -> list[str]:
    """Every line of the README that calls this program, without the virtual environment."""
    lines = [line for block in blocks(readme, "sh") for line in block.splitlines()]
    called = [line.split(" && ")[-1].removeprefix(".venv/bin/") for line in lines]
    return [line for line in called if line.startswith("pacing ")]


def test_the_two_lines_to_paste_come_first_and_are_one_line_each(readme: str) -> None:
    first, second = blocks(readme, "sh")[:2]
    assert (first.strip(), second.strip()) == (PLAN, TEST)


def test_the_job_comes_before_anything_else(readme: str) -> None:
    title, job, *_ = readme.split("\n\n")
    assert title == "# pacing"
    assert len(job.split()) > 80
    assert readme.index(job) < readme.index(PLAN)


def test_continuous_integration_gives_the_same_test_command(root: Path) -> None:
    script = root / ".ci" / "run"
    assert os.access(script, os.X_OK)
    assert TEST in script.read_text(encoding="utf-8").splitlines()


def test_every_command_has_its_line_and_every_line_its_command(readme: str) -> None:
    table = re.findall(r"^\| `pacing ([\w-]+)", readme, re.MULTILINE)
    names = [command.name for command in app.registered_commands]
    assert table == names


@pytest.mark.skipif(os.name != "posix", reason="the README's lines are for a POSIX shell")
def test_every_command_of_the_readme_works_as_it_stands(
    readme: str, newcomer: Path, demo_printed: str, make_shown: ModuleType
) -> None:
    first, *others = commands(readme)
    assert first.split() == ["pacing", *make_shown.COMMAND]
    assert demo_printed
    path = f"{Path(sys.executable).parent}{os.pathsep}{os.environ['PATH']}"
    for line in others:
        done = subprocess.run(
            line,
            shell=True,
            cwd=newcomer,
            env={**os.environ, "PATH": path},
            capture_output=True,
            encoding="utf-8",
            check=False,
        )
        assert (done.returncode, done.stderr) == (0, ""), line
    for block in blocks(readme, "python"):
        _run_python(block, newcomer)


def _run_python(block: str, folder: Path) -> None:
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", block],
        cwd=folder,
        capture_output=True,
        encoding="utf-8",
        check=False,
    )
    assert (done.returncode, done.stderr) == (0, ""), block


def test_every_file_the_readme_shows_or_names_is_there(readme: str, root: Path) -> None:
    for file in re.findall(r"\]\(([\w./-]+)\)", readme):
        assert (root / file).is_file(), file
    for file in re.findall(r"`((?:demo|courses|tests|pacing)/[\w./-]+)`", readme):
        assert (root / file).exists() or file == "demo/out", file
