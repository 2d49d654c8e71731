"""Constants and conversions: all is SI inside, and converted on reading and on printing."""

from __future__ import annotations

GRAVITY_M_S2 = 9.80665
"""Standard gravity (ISO 80000-3)."""

KMH_PER_M_S = 3.6
ZERO_CELSIUS_K = 273.15
KM_PER_MILE = 1.609344


def clock_text(seconds: float) -> str:
    """Elapsed seconds as ``h:mm:ss``, rounded to the nearest second."""
    whole = round(seconds)
    return f"{whole // 3600}:{whole // 60 % 60:02d}:{whole % 60:02d}"
