"""The built wheel is all a newcomer needs: in a new virtual environment, far from any checkout."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest

pytestmark = pytest.mark.slow

NOT_COPIED = shutil.ignore_patterns(".*", "build", "dist", "*.egg-info", "__pycache__", "out")
PLAN_FILES = {
    "plan.json", "cues.csv", "trace.csv", "cue-sheet.pdf", "cue-sheet.png", "profile.png",
    "map.png", "cues.gpx",
}  # fmt: skip


def _run(*command: str | Path, cwd: Path) -> str:
    clean = {name: value for name, value in os.environ.items() if not name.startswith("PYTHON")}
    done = subprocess.run(
        [str(part) for part in command],
        cwd=cwd,
        env=clean,
        capture_output=True,
        encoding="utf-8",
        check=False,
    )
    assert done.returncode == 0, f"{done.stdout}{done.stderr}"
    return done.stdout


@pytest.fixture(scope="module")
def pip() -> list[str]:
    """A pip that installs into other environments: this one's, or that of the Python it is of."""
    for python in (sys.executable, getattr(sys, "_base_executable", sys.executable)):
        asked = [python, "-m", "pip", "--version"]
        if subprocess.run(asked, capture_output=True, check=False).returncode == 0:
            return [python, "-m", "pip", "--disable-pip-version-check"]
    pytest.skip("no pip here, neither in this environment nor in the Python it was made from")


@pytest.fixture(scope="module")
def wheel(pip: list[str], root: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The wheel, built from a copy, so that nothing built before gets into it."""
    folder = tmp_path_factory.mktemp("wheel")
    shutil.copytree(root, folder / "source", ignore=NOT_COPIED)
    _run(*pip, "wheel", "-q", "--no-deps", "-w", folder, folder / "source", cwd=folder)
    (built,) = folder.glob("*.whl")
    return built


@pytest.fixture(scope="module")
def call(
    pip: list[str], wheel: Path, tmp_path_factory: pytest.TempPathFactory
) -> Callable[..., str]:
    """Calls the installed `pacing` with its own dependencies only, in a folder of its own."""
    folder = tmp_path_factory.mktemp("far away, näher")
    _run(sys.executable, "-m", "venv", "--without-pip", "venv", cwd=folder)
    _run(*pip, "--python", folder / "venv", "install", "-q", wheel, cwd=folder)
    scripts = folder / "venv" / ("Scripts" if os.name == "nt" else "bin")
    return lambda *arguments: _run(scripts / "pacing", *arguments, cwd=folder)


def test_the_wheel_holds_the_package_its_data_and_nothing_else(wheel: Path, root: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        inside = set(archive.namelist())
    package = {
        file.relative_to(root).as_posix()
        for file in (root / "pacing").rglob("*")
        if file.is_file() and "__pycache__" not in file.parts
    }
    assert {name for name in inside if ".dist-info/" not in name} == package
    assert "pacing/py.typed" in inside
    assert "pacing/race/starter/course.gpx" in inside
    assert any(name.endswith("/licenses/LICENSE") for name in inside)


def test_a_new_folder_plans_at_once(call: Callable[..., str], tmp_path: Path) -> None:
    race, out = tmp_path / "sunday" / "race.toml", tmp_path / "out"
    call("new", race.parent)
    printed = call("plan", race, "-o", out)
    assert "Finish in 0:1" in printed
    assert {file.name for file in out.iterdir()} == PLAN_FILES


def test_it_knows_its_version(call: Callable[..., str], wheel: Path) -> None:
    assert call("--version").strip() == "pacing " + wheel.name.split("-")[1]
