"""The project's own files, for checks of the house."""

from __future__ import annotations

import ast
from dataclasses import dataclass
from fnmatch import fnmatch
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]


@dataclass(frozen=True)
class Module:
    """One module of the package, as written."""

    name: str
    file: Path
    tree: ast.Module

    @property
    def package(self) -> str:
        """The folder under ``pacing`` it lies in, or its own name where it lies in none."""
        parts = self.name.split(".")
        return parts[1] if len(parts) > 1 else "pacing"


def _module(file: Path) -> Module:
    parts = file.relative_to(ROOT).with_suffix("").parts
    name = ".".join(parts[:-1] if parts[-1] == "__init__" else parts)
    return Module(name, file, ast.parse(file.read_text(encoding="utf-8")))


def _ignored(path: Path, patterns: list[str]) -> bool:
    return any(fnmatch(part, pattern) for part in path.parts for pattern in patterns)


@pytest.fixture(scope="session")
def root() -> Path:
    """The folder of the project."""
    return ROOT


@pytest.fixture(scope="session")
def modules() -> tuple[Module, ...]:
    """Every module of the package, parsed but not imported."""
    return tuple(_module(file) for file in sorted((ROOT / "pacing").rglob("*.py")))


@pytest.fixture(scope="session")
def own_files() -> tuple[Path, ...]:
    """Every file of the project, relative to its folder; without what git is told to ignore."""
    lines = (ROOT / ".gitignore").read_text(encoding="utf-8").split()
    patterns = [line.strip("/").rsplit("/", 1)[-1] for line in lines]
    found = (file.relative_to(ROOT) for file in ROOT.rglob("*") if file.is_file())
    return tuple(sorted(file for file in found if not _ignored(file, [".git", *patterns])))
