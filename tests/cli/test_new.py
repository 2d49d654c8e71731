"""``pacing new``: a starter folder, never over an existing file."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from pacing.cli.app import main
from pacing.race import load_race

FILES = {"race.toml", "course.gpx", "efforts.csv"}


def names(folder: Path) -> set[str]:
    return {file.name for file in folder.iterdir()}


def test_the_folder_holds_a_race_that_can_be_read(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = tmp_path / "a" / "race"
    assert main(["new", str(folder)]) == 0
    assert names(folder) == FILES
    assert capsys.readouterr() == (
        f"{folder} holds race.toml, course.gpx, efforts.csv.\n"
        f"Put in your own course and numbers, then: pacing plan {folder / 'race.toml'}\n",
        "",
    )
    race = load_race(folder / "race.toml")
    assert race.course.length_m > 10_000.0
    assert race.cautions == ()


def test_an_existing_folder_keeps_what_it_holds(tmp_path: Path) -> None:
    (tmp_path / "notes.txt").write_text("mine")
    assert main(["new", str(tmp_path)]) == 0
    assert names(tmp_path) == FILES | {"notes.txt"}


@pytest.mark.parametrize("name", sorted(FILES))
def test_an_existing_file_is_never_written_over(
    tmp_path: Path, name: str, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / name).write_text("mine")
    assert main(["new", str(tmp_path)]) == 2
    assert (tmp_path / name).read_text() == "mine"
    assert names(tmp_path) == {name}
    assert capsys.readouterr().err == (
        f"pacing: {tmp_path}: there already: {name}; expected a folder without these. "
        "Choose another folder; nothing was written.\n"
    )


def test_a_link_to_nowhere_counts_as_a_file(tmp_path: Path) -> None:
    (tmp_path / "race.toml").symlink_to("elsewhere.toml")
    assert main(["new", str(tmp_path)]) == 2
    assert names(tmp_path) == {"race.toml"}


def test_what_cannot_be_finished_is_taken_back(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    real = Path.open

    def full(self: Path, mode: str = "r", *rest: object, **named: object) -> object:
        if self.name == "efforts.csv" and "x" in mode:
            raise OSError(28, os.strerror(28))
        return real(self, mode, *rest, **named)  # type: ignore[call-overload]

    monkeypatch.setattr(Path, "open", full)
    folder = tmp_path / "a" / "race"
    assert main(["new", str(folder)]) == 2
    assert names(tmp_path) == set()
    assert capsys.readouterr().err == (
        f"pacing: {folder}: cannot be written (No space left on device); "
        "expected a folder that can be written.\n"
    )


def test_a_file_is_no_folder(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "x").write_text("mine")
    assert main(["new", str(tmp_path / "x")]) == 2
    assert capsys.readouterr().err == (
        f"pacing: {tmp_path / 'x'}: cannot be written (Not a directory); "
        "expected a folder that can be written.\n"
    )
