"""Stretches over which energy is balanced: pieces of a ride, steady runs, parts of coast-downs."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from pacing.field.drag_session import Session

Array = NDArray[np.float64]
Flags = NDArray[np.bool_]
Index = NDArray[np.intp]


@dataclass(frozen=True)
class Segments:
    """K stretches between boundaries of steps (``start`` and ``end``, (K,)).

    Boundary b lies before step b. Values at a boundary are means over ``reach`` boundaries to
    either side, so that one noisy height or speed does not decide. Stretches of one unbroken
    ``run`` (K,) share the error of the boundary where one ends and the next begins.
    ``node_weight`` (K, 2) is how large the error at each end is against that of the others.
    """

    start: Index
    end: Index
    run: Index
    reach: int
    node_weight: Array

    def __len__(self) -> int:
        """Number of stretches."""
        return self.start.size

    def kept(self, keep: Flags) -> Segments:
        """Only some of the stretches, by a mask (K,)."""
        return replace(
            self,
            start=self.start[keep],
            end=self.end[keep],
            run=self.run[keep],
            node_weight=self.node_weight[keep],
        )

    def shared(self) -> Flags:
        """Which stretches begin where the one before ends, but for the first (K−1,)."""
        return np.asarray((self.end[:-1] == self.start[1:]) & (self.run[:-1] == self.run[1:]))

    def sums(self, steps: Array) -> Array:
        """Sums of quantities of the steps (S,) or (c, S) over each stretch: (K,) or (c, K)."""
        total = np.zeros((*steps.shape[:-1], steps.shape[-1] + 1))
        np.cumsum(steps, axis=-1, out=total[..., 1:])
        if self.reach == 0:
            return np.asarray(total[..., self.end] - total[..., self.start])
        # A mean over neighbouring boundaries is a difference of the running sum's running sum.
        running = np.zeros((*steps.shape[:-1], steps.shape[-1] + 2))
        np.cumsum(total, axis=-1, out=running[..., 1:])
        high, low = self.reach + 1, self.reach
        ends = running[..., self.end + high] - running[..., self.end - low]
        starts = running[..., self.start + high] - running[..., self.start - low]
        return np.asarray((ends - starts) / (high + low))


def chains(usable: Flags, first: Index) -> tuple[Index, Index]:
    """First and last-but-one boundary of each unbroken run of usable steps (S,).

    A run never reaches from one ride into the next; ``first`` are the rides' first steps.
    """
    padded = np.concatenate([[False], usable, [False]])
    begins = usable & ~padded[:-2]
    begins[first] = usable[first]
    ends = usable & ~padded[2:]
    before_next = first[1:] - 1
    ends[before_next] = usable[before_next]
    return np.flatnonzero(begins), np.flatnonzero(ends) + 1


def even_segments(
    session: Session, usable: Flags, *, length_s: float, least_s: float, reach: int
) -> Segments:
    """Unbroken runs cut into equal stretches of about ``length_s``; shorter runs are left out."""
    times = np.concatenate([[0.0], np.cumsum(session.dt_s)])
    starts, ends = [], []
    for a, b in zip(*chains(usable, session.first), strict=True):
        a, b = a + reach, b - reach
        if b <= a or times[b] - times[a] < least_s:
            continue
        count = max(1, round((times[b] - times[a]) / length_s))
        cuts = np.linspace(times[a], times[b], count + 1)
        nodes = a + np.searchsorted(times[a : b + 1], cuts - 1e-9)
        nodes = np.unique(np.clip(nodes, a, b))
        starts.append(nodes[:-1])
        ends.append(nodes[1:])
    return segments_between(starts, ends, reach)


def segments_between(starts: list[Index], ends: list[Index], reach: int) -> Segments:
    """Stretches from the boundaries of each unbroken run, equally sure at their ends."""
    none = np.empty(0, dtype=np.intp)
    start = np.concatenate([none, *starts]).astype(np.intp)
    end = np.concatenate([none, *ends]).astype(np.intp)
    run = np.repeat(np.arange(len(starts)), [part.size for part in starts]).astype(np.intp)
    return Segments(start, end, run, reach, np.ones((start.size, 2)))
