"""The linter and the type checker have nothing to say."""

from __future__ import annotations

import importlib.util
import subprocess
import sys
from pathlib import Path

import pytest

CHECKED = ("pacing", "tests", "courses", "demo")


def _run(root: Path, *arguments: str) -> None:
    if importlib.util.find_spec(arguments[0]) is None:
        pytest.skip(f"{arguments[0]} is not installed: it comes with the extra named test")
    done = subprocess.run(
        [sys.executable, "-m", *arguments],
        cwd=root,
        capture_output=True,
        encoding="utf-8",
        check=False,
    )
    assert done.returncode == 0, f"{done.stdout}{done.stderr}"


def test_the_linter_is_content(root: Path) -> None:
    _run(root, "ruff", "check", *CHECKED)


def test_the_layout_is_the_formatter_s(root: Path) -> None:
    _run(root, "ruff", "format", "--check", *CHECKED)


def test_the_package_is_typed_throughout(root: Path) -> None:
    _run(root, "mypy")


def test_others_can_use_the_types(root: Path) -> None:
    assert (root / "pacing" / "py.typed").is_file()
