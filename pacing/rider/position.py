"""A way of sitting on the bicycle: what it costs in power and saves in drag."""

from __future__ import annotations

from dataclasses import dataclass

from pacing.bike.drag_area import DragArea


@dataclass(frozen=True)
class Position:
    """One position of one rider.

    Power over ``power_share`` is what is held against critical power and W′ (1 in the position
    of the test, below 1 where the same effort gives less power). Usable between
    ``min_speed_m_s`` and ``max_speed_m_s`` and for ``longest_s`` at a time, where given.
    """

    name: str
    drag_area: DragArea
    power_share: float = 1.0
    min_speed_m_s: float | None = None
    max_speed_m_s: float | None = None
    longest_s: float | None = None
