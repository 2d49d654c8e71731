"""JSON that any reader accepts: NaN and infinity are null, numpy's numbers are numbers."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from pathlib import PurePath
from typing import Any


def json_text(document: Mapping[str, Any]) -> str:
    """One strict JSON document, two spaces a level, with a line end."""
    return json.dumps(plain(document), indent=2, allow_nan=False, ensure_ascii=False) + "\n"


def plain(value: Any) -> Any:
    """``value`` in what JSON knows; not-finite numbers become None."""
    if value is None or isinstance(value, bool | str):
        return value
    if isinstance(value, int):
        return int(value)
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else None
    if isinstance(value, Mapping):
        return {str(key): plain(inner) for key, inner in value.items()}
    if isinstance(value, list | tuple):
        return [plain(inner) for inner in value]
    if isinstance(value, PurePath):
        return str(value)
    if hasattr(value, "tolist"):
        return plain(value.tolist())
    raise TypeError(f"{type(value).__name__} has no place in JSON")
