"""Invented course files, written point by point."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path

import pytest

Point = tuple[float, float, float | None]


def _gpx(
    *segments: Sequence[Point], kind: str = "trk", name: str | None = None, version: str = "1.1"
) -> str:
    tag = "trkpt" if kind == "trk" else "rtept"
    title = f"<name>{name}</name>" if name else ""
    parts = []
    for points in segments:
        rows = "\n".join(
            f'<{tag} lat="{lat!r}" lon="{lon!r}">'
            + ("" if ele is None else f"<ele>{ele!r}</ele>")
            + f"</{tag}>"
            for lat, lon, ele in points
        )
        parts.append(f"<trkseg>\n{rows}\n</trkseg>" if kind == "trk" else rows)
    body = "\n".join(parts)
    return (
        f'<?xml version="1.0" encoding="UTF-8"?>\n<gpx version="{version}" creator="t" '
        f'xmlns="http://www.topografix.com/GPX/{version.replace(".", "/")}">\n'
        f"<{kind}>{title}\n{body}\n</{kind}>\n</gpx>\n"
    )


@pytest.fixture(scope="session")
def gpx() -> Callable[..., str]:
    """Makes a GPX document with one track of these segments, or one route."""
    return _gpx


@pytest.fixture
def write(tmp_path: Path) -> Callable[..., Path]:
    """Writes text or bytes to a file of a name, and gives its path."""

    def to(content: str | bytes, name: str = "course.gpx") -> Path:
        file = tmp_path / name
        file.write_bytes(content.encode() if isinstance(content, str) else content)
        return file

    return to
