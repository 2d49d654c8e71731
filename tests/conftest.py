"""Fixtures that any test may use."""

from __future__ import annotations

import os
from pathlib import Path

import pytest


def _recorded_folder() -> Path:
    named = os.environ.get("PACING_RECORDED")
    if named:
        return Path(named)
    return Path(__file__).resolve().parents[2] / "shared" / "recorded"


def _part(name: str) -> Path:
    folder = _recorded_folder() / name
    if not folder.is_dir():
        pytest.skip(
            "no recorded files: name their folder in the environment variable PACING_RECORDED"
        )
    return folder


@pytest.fixture(scope="session")
def recorded_courses() -> Path:
    """The folder of recorded course files, or a skip that says how to name it."""
    return _part("courses")


@pytest.fixture(scope="session")
def recorded_rides() -> Path:
    """The folder of recorded rides, or a skip that says how to name it."""
    return _part("rides")
