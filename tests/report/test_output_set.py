"""Outputs are a set: complete or absent, whatever happens in between."""

from __future__ import annotations

import os
import random
import subprocess
import sys
import textwrap
import time
from pathlib import Path

import pytest

from pacing.errors import OurFaultError, UnusableInputError
from pacing.report.output_set import PLAN_OUTPUT, make_ready, output_set

NAMES = ("plan.json", "cues.csv", "map.png")


def fill(room: Path, version: int) -> None:
    (room / "plan.json").write_text(f'{{"schema": "plan/1", "version": {version}}}')
    for name in NAMES[1:]:
        (room / name).write_text(f"version {version}")


def write(folder: Path, version: int) -> None:
    with output_set(folder) as room:
        fill(room, version)


def versions(folder: Path) -> set[str]:
    """The versions in a folder's files: one, if the set is whole."""
    assert {file.name for file in folder.iterdir()} == set(NAMES)
    texts = [(folder / name).read_text() for name in NAMES]
    return {text.rstrip("}").split()[-1] for text in texts}


def test_a_new_set_takes_the_place_of_the_old(tmp_path: Path) -> None:
    out = tmp_path / "deep" / "out"
    write(out, 1)
    write(out, 2)
    assert versions(out) == {"2"}
    assert list(out.parent.iterdir()) == [out]


def test_an_empty_folder_is_filled(tmp_path: Path) -> None:
    write(tmp_path, 1)
    assert versions(tmp_path) == {"1"}


def test_a_file_of_an_older_set_that_the_new_one_lacks_goes(tmp_path: Path) -> None:
    out = tmp_path / "out"
    with output_set(out) as room:
        fill(room, 1)
        (room / "report.html").write_text("old")
    write(out, 2)
    assert not (out / "report.html").exists()


def test_the_folder_keeps_its_rights(tmp_path: Path) -> None:
    out = tmp_path / "out"
    write(out, 1)
    out.chmod(0o750)
    write(out, 2)
    assert out.stat().st_mode & 0o777 == 0o750


def test_a_link_to_a_folder_stays_a_link(tmp_path: Path) -> None:
    write(tmp_path / "real", 1)
    (tmp_path / "link").symlink_to("real")
    write(tmp_path / "link", 2)
    assert (tmp_path / "link").is_symlink()
    assert versions(tmp_path / "real") == {"2"}


@pytest.mark.parametrize("problem", [ValueError("x"), KeyboardInterrupt(), OSError(28, "No space")])
def test_an_error_on_the_way_leaves_the_old_set_and_nothing_else(
    tmp_path: Path, problem: BaseException
) -> None:
    out = tmp_path / "out"
    write(out, 1)
    expected = UnusableInputError if isinstance(problem, OSError) else type(problem)
    with pytest.raises(expected), output_set(out) as room:
        fill(room, 2)
        raise problem
    assert versions(out) == {"1"}
    assert list(tmp_path.iterdir()) == [out]


def test_an_error_on_the_way_to_a_first_set_leaves_nothing(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="x"), output_set(tmp_path / "a" / "out") as room:
        (room / "cues.csv").write_text("half")
        raise ValueError("x")
    assert list(tmp_path.iterdir()) == []


def test_a_set_that_could_not_be_known_as_ours_again_is_a_fault(tmp_path: Path) -> None:
    for name, text in (("plan.json", '{"schema": "other/1"}'), ("notes.txt", "x")):
        with pytest.raises(OurFaultError), output_set(tmp_path / "out") as room:
            (room / name).write_text(text)
        assert list(tmp_path.iterdir()) == []


def test_a_folder_with_files_that_are_not_ours_is_refused(tmp_path: Path) -> None:
    (tmp_path / "notes.txt").write_text("mine")
    with pytest.raises(UnusableInputError) as refused:
        write(tmp_path, 1)
    assert str(refused.value) == (
        f"{tmp_path}: holds files that are not ours (notes.txt); expected a new or empty folder, "
        "or one from an earlier run. Choose another with -o."
    )
    assert [file.name for file in tmp_path.iterdir()] == ["notes.txt"]


@pytest.mark.parametrize(
    "make",
    [
        lambda out: (out / "b.txt").write_text("beside a set of ours"),
        lambda out: (out / "sub").mkdir(),
        lambda out: (out / "report.html").mkdir(),
        lambda out: (out / "report.html").symlink_to("map.png"),
        lambda out: (out / "plan.json").write_text('{"schema": "another/1"}'),
        lambda out: (out / "plan.json").unlink(),
    ],
    ids=["a file", "a folder", "a folder of our name", "a link", "another's json", "no json"],
)
def test_nothing_is_taken_for_ours_that_is_not(tmp_path: Path, make) -> None:  # type: ignore[no-untyped-def]
    out = tmp_path / "out"
    write(out, 1)
    make(out)
    before = sorted(out.iterdir())
    with pytest.raises(UnusableInputError, match="holds files that are not ours"):
        make_ready(out)
    assert sorted(out.iterdir()) == before


def test_what_a_file_viewer_leaves_does_not_matter(tmp_path: Path) -> None:
    write(tmp_path / "out", 1)
    (tmp_path / "out" / ".DS_Store").write_text("")
    write(tmp_path / "out", 2)
    assert versions(tmp_path / "out") == {"2"}


def test_a_file_is_no_folder(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("x")
    with pytest.raises(UnusableInputError) as refused:
        make_ready(tmp_path / "out")
    assert str(refused.value) == (
        f"{tmp_path / 'out'}: a file, not a folder. Choose another folder with -o."
    )


def test_the_folder_one_is_in_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    with pytest.raises(UnusableInputError) as refused:
        make_ready(".")
    assert str(refused.value) == (
        ".: the folder you are in; expected a folder of its own for the output."
    )


@pytest.mark.skipif(not Path("/proc/version").is_file(), reason="needs a place nobody may write")
@pytest.mark.parametrize("place", ["/proc/out", "/proc/version/out", "a\0b", "x" * 300])
def test_a_place_that_cannot_be_written_is_told_before_the_work(place: str) -> None:
    with pytest.raises(UnusableInputError, match=r"cannot be written \(.+\); expected a folder"):
        make_ready(place)


CRASH = """
import os, sys, pathlib
from pacing.report.output_set import output_set
count, limit = 0, int(sys.argv[2])
def dying(real):
    def call(*arguments, **names):
        global count
        count += 1
        if count > limit:
            os._exit(9)
        return real(*arguments, **names)
    return call
for name in ("rename", "unlink", "rmdir", "mkdir"):
    setattr(pathlib.Path, name, dying(getattr(pathlib.Path, name)))
with output_set(sys.argv[1]) as room:
    (room / "plan.json").write_text('{"schema": "plan/1", "version": 2}')
    for name in ("cues.csv", "map.png"):
        (room / name).write_text("version 2")
"""


def test_a_crash_at_any_step_leaves_one_whole_set_after_the_next_run(tmp_path: Path) -> None:
    seen = set()
    for limit in range(20):
        out = tmp_path / str(limit) / "out"
        write(out, 1)
        ended = subprocess.run(
            [sys.executable, "-c", CRASH, str(out), str(limit)], check=False
        ).returncode
        place = out if out.exists() else out.with_name(".out.pacing-old")
        (kept,) = versions(place)
        make_ready(out)
        assert versions(out) == {kept}
        assert list(out.parent.iterdir()) == [out]
        seen.add((ended, kept))
        if ended == 0:
            break
    assert seen == {(9, "1"), (9, "2"), (0, "2")}


WRITER = textwrap.dedent(
    """
    import itertools, sys
    from pacing.report.output_set import output_set
    for version in itertools.count(2):
        with output_set(sys.argv[1]) as room:
            (room / "plan.json").write_text('{"schema": "plan/1", "version": %d}' % version)
            for name in ("cues.csv", "map.png"):
                (room / name).write_text(f"version {version}")
        print(version, flush=True)
    """
)


def test_a_kill_at_any_moment_leaves_one_whole_set_after_the_next_run(tmp_path: Path) -> None:
    moments = random.Random(5)
    out = tmp_path / "out"
    write(out, 1)
    for _ in range(8):
        process = subprocess.Popen(
            [sys.executable, "-c", WRITER, str(out)], stdout=subprocess.PIPE, text=True
        )
        assert process.stdout is not None
        process.stdout.readline()
        time.sleep(moments.uniform(0.0, 0.03))
        process.kill()
        process.communicate()
        make_ready(out)
        assert len(versions(out)) == 1
        assert list(tmp_path.iterdir()) == [out]


def test_a_running_neighbour_is_left_alone(tmp_path: Path) -> None:
    busy = tmp_path / f".out.pacing-new-{os.getpid()}-00000000"
    busy.mkdir()
    make_ready(tmp_path / "out")
    assert busy.is_dir()


def test_every_output_of_the_interface_is_known() -> None:
    assert PLAN_OUTPUT.names == {
        "plan.json",
        "cues.csv",
        "trace.csv",
        "cue-sheet.pdf",
        "cue-sheet.png",
        "profile.png",
        "map.png",
        "cues.gpx",
        "positions.png",
        "report.html",
    }
