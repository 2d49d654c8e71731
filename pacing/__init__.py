"""Pacing plans for cycling time trials, from a course file and a rider to a cue sheet."""

from __future__ import annotations

__version__ = "0.1.0"
