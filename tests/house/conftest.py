"""The project's own files, for checks of the house."""

from __future__ import annotations

import ast
import importlib.util
import shutil
from dataclasses import dataclass
from fnmatch import fnmatch
from pathlib import Path
from types import ModuleType

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


def _ignored(file: Path, patterns: list[str]) -> bool:
    """Whether git is told to leave ``file`` out: by a name, or by a path with a slash inside."""
    whole = file.as_posix()
    return any(
        whole.startswith(f"{pattern}/")
        if "/" in pattern
        else any(fnmatch(part, pattern) for part in file.parts)
        for pattern in patterns
    )


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
    patterns = [".git", *(line.strip("/") for line in lines)]
    found = (file.relative_to(ROOT) for file in ROOT.rglob("*") if file.is_file())
    return tuple(sorted(file for file in found if not _ignored(file, patterns)))


@pytest.fixture(scope="session")
def readme() -> str:
    """The README as it is."""
    return (ROOT / "README.md").read_text(encoding="utf-8")


@pytest.fixture(scope="session")
def make_shown() -> ModuleType:
    """The script that makes anew what is shown, ``demo/make.py``."""
    spec = importlib.util.spec_from_file_location("demo_make", ROOT / "demo" / "make.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def newcomer(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder that holds of the project only the demo race and the courses."""
    folder = tmp_path_factory.mktemp("newcomer")
    (folder / "demo").mkdir()
    shutil.copy(ROOT / "demo" / "race.toml", folder / "demo")
    shutil.copytree(ROOT / "courses", folder / "courses")
    return folder


@pytest.fixture(scope="session")
def demo_printed(make_shown: ModuleType, newcomer: Path) -> str:
    """What the demo prints today; its output folder is ``demo/out`` of `newcomer`."""
    printed = make_shown.plan_demo(newcomer)
    assert isinstance(printed, str)
    return printed
