"""Where on the course the rider braked, rolled up to a stop, or stood."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.field.debrief_ridden import Ridden
from pacing.field.recording import Masked

Flags = NDArray[np.bool_]

SLOWING = ("braking", "slowing down", "walking pace", "stop", "stop, recorder paused")


def slowed_nodes(ridden: Ridden, masked: tuple[Masked, ...]) -> Flags:
    """Nodes (M+1,) passed while slowing, by what the ride's reading and fitting found."""
    clock = ridden.clock_s
    slowed = np.zeros(clock.size, dtype=bool)
    for mask in masked:
        if mask.why in SLOWING:
            low, high = np.searchsorted(clock, [mask.from_s - 0.5, mask.to_s + 0.5])
            slowed[max(int(low) - 1, 0) : int(high) + 1] = True
    stood = np.flatnonzero(ridden.stop_s > 0.0)
    slowed[stood] = True
    slowed[stood + 1] = True
    return slowed
