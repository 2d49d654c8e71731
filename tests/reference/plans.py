"""Plans made once a test run, with the numbers they export: what the comparisons share."""

from __future__ import annotations

import tempfile
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import exported
import numpy as np
import races

import pacing
from pacing.motion.road import road_for


@dataclass(frozen=True)
class Made:
    """A plan and what the peers may know of it.

    ``road`` is the trace's. A plan may lower the trace's limits where it freewheels into slow
    places; ``free_road`` has the limits of the course alone, so that a peer is not held to that.
    """

    plan: pacing.Plan
    road: exported.Exported
    free_road: exported.Exported

    @property
    def unrounded_s(self) -> float:
        """Time of the pieces as solved, before placing and rounding."""
        return float(self.plan.solver["unrounded_time_s"])

    @property
    def starts(self) -> np.ndarray:
        """First cells of the pieces as solved."""
        nodes = self.plan.trace["from_m"].to_numpy()
        return np.searchsorted(nodes + 1e-6, self.plan.pieces["from_m"].to_numpy())

    def column(self, name: str) -> np.ndarray:
        """One column of the trace."""
        return self.plan.trace[name].to_numpy(dtype=float)


@cache
def made(
    case: races.Case, *, recorded: Path | None = None, law: str = "skiba-2015", cues: int = 24
) -> Made:
    """The plan of ``case``; the same one for every test that asks."""
    with tempfile.TemporaryDirectory() as folder:
        race = case.race(Path(folder), recorded=recorded, law=law, cues=cues)
        plan = pacing.plan_race(race)
    road = exported.read_exported(plan.trace, plan.inputs["model"])
    return Made(plan, road, road.under(limit_m_s=road_for(race).limit_m_s))
