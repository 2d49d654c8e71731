"""Places for labels so that they hide neither each other nor what they name."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.report import style

Array = NDArray[np.float64]


def lanes(middle_pt: Array, wide_pt: Array, count: int) -> Array:
    """A lane (0 at the bottom) for each label so that labels in one lane keep apart.

    Labels come left to right; where every lane is taken, the one that frees first is used.
    """
    free = np.full(count, -np.inf)
    chosen = np.zeros(middle_pt.size)
    for i in range(middle_pt.size):
        left = middle_pt[i] - 0.5 * wide_pt[i]
        lane = int(np.argmax(free <= left)) if (free <= left).any() else int(np.argmin(free))
        chosen[i] = lane
        free[lane] = middle_pt[i] + 0.5 * wide_pt[i]
    return chosen


class Taken:
    """Where the course and the labels already are, so that the next label finds a free place."""

    def __init__(self, road: Array, room_pt: tuple[float, float, float, float]) -> None:
        self.road = road
        self.room = room_pt
        self.boxes: list[tuple[float, float, float, float]] = []

    def cost(self, box: tuple[float, float, float, float]) -> float:
        """How much of the road and of other labels a box would hide, or leave the paper."""
        left, low, right, high = box
        x, y = self.road[:, 0], self.road[:, 1]
        hidden = ((x > left - 3) & (x < right + 3) & (y > low - 3) & (y < high + 3)).sum()
        over = sum(left < b[2] and right > b[0] and low < b[3] and high > b[1] for b in self.boxes)
        outside = (
            left < self.room[0] or low < self.room[1] or right > self.room[2] or high > self.room[3]
        )
        return float(hidden) + 1e4 * over + 1e4 * outside

    def place(self, at: Array, text: str, size: float, side: Array) -> tuple[float, float, float]:
        """Left, baseline and cost of the best place around ``at``, best on ``side``; now taken."""
        wide = style.text_width_mm(text, style.capitals(size)) / 25.4 * 72
        high = 0.75 * size
        best: tuple[float, tuple[float, float, float, float]] | None = None
        for away in (0.7 * size + 3.5 + extra for extra in (0.0, 5.0, 11.0, 19.0)):
            for turn in np.arange(12) * np.pi / 6:
                way = np.array([np.cos(turn), np.sin(turn)])
                x, y = at + way * (away + 0.5 * np.array([wide, high]))
                box = (x - wide / 2, y - high / 2, x + wide / 2, y + high / 2)
                cost = self.cost(box) + 0.05 * away - 2.0 * float(way @ side)
                if best is None or cost < best[0]:
                    best = (cost, box)
        assert best is not None
        cost, box = best
        if cost < 1e4:
            left, low, right, top = box
            self.boxes.append((left - 2, low - 2, right + 2, top + 2))
        return box[0], box[1], cost
