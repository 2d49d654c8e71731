"""Planned against ridden, cue by cue and kilometre by kilometre."""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from pacing.field.debrief_parts import PARTS, Basis, Parts
from pacing.field.debrief_ridden import Ridden
from pacing.plan import Plan
from pacing.units import KMH_PER_M_S

Array = NDArray[np.float64]
Index = NDArray[np.intp]


def cue_table(plan: Plan, basis: Basis, ridden: Ridden, parts: Parts) -> pd.DataFrame:
    """One row a cue that was ridden, or the part of it that was."""
    node_m = plan.race.course.distance_m
    nodes = np.searchsorted(node_m, plan.cues["from_m"].to_numpy(dtype=float) - 1e-6)
    edges = _edges(np.append(nodes, node_m.size - 1), basis)
    table = _table(plan, basis, ridden, parts, edges)
    which = np.searchsorted(nodes, edges[:-1] + basis.cells.start, side="right") - 1
    named = plan.cues.iloc[which]
    table.insert(2, "landmark", named["landmark"].to_numpy())
    table.insert(3, "position", named["position"].to_numpy())
    table.insert(4, "target_w", named["power_w"].to_numpy(dtype=float))
    return table


def split_table(plan: Plan, basis: Basis, ridden: Ridden, parts: Parts) -> pd.DataFrame:
    """One row a whole kilometre that was ridden, and what is left at the end."""
    node_m = plan.race.course.distance_m
    marks = np.arange(0.0, float(node_m[-1]) - 1.0, 1000.0)
    nodes = np.searchsorted(node_m, marks - 0.5 * (node_m[1] - node_m[0]))
    return _table(plan, basis, ridden, parts, _edges(np.append(nodes, node_m.size - 1), basis))


def _edges(nodes: Index, basis: Basis) -> Index:
    """Nodes of the course as boundaries within the ridden part, its ends included."""
    first, last = basis.cells.start, basis.cells.stop
    inside = nodes[(nodes > first) & (nodes < last)]
    edges = np.unique(np.concatenate([[first], inside, [last]]))
    return np.asarray(edges - first, dtype=np.intp)


def _table(plan: Plan, basis: Basis, ridden: Ridden, parts: Parts, edges: Index) -> pd.DataFrame:
    node_m = plan.race.course.distance_m[basis.cells.start : basis.cells.stop + 1]
    shown = 1.0 / plan.race.rider.power_meter_factor
    length = np.diff(node_m[edges])

    def sums(values: Array) -> Array:
        return np.add.reduceat(values, edges[:-1])

    moving = ridden.time_s - ridden.stop_s
    planned_s, ridden_s = sums(basis.time_s), sums(ridden.time_s)
    columns = {
        "from_km": node_m[edges[:-1]] / 1000.0,
        "to_km": node_m[edges[1:]] / 1000.0,
        "planned_s": planned_s,
        "ridden_s": ridden_s,
        "difference_s": ridden_s - planned_s,
        "planned_w": shown * sums(basis.power_w * basis.time_s) / planned_s,
        "ridden_w": shown * sums(ridden.power_w * moving) / np.maximum(sums(moving), 1e-9),
        "planned_kmh": KMH_PER_M_S * length / planned_s,
        "ridden_kmh": KMH_PER_M_S * length / ridden_s,
        "planned_elapsed_s": np.cumsum(planned_s),
        "ridden_elapsed_s": np.cumsum(ridden_s),
        "planned_w_balance_kj": basis.balance_j[edges[1:]] / 1000.0,
        "ridden_w_balance_kj": ridden.balance_j[edges[1:]] / 1000.0,
    }
    for name, row in zip(PARTS, parts.seconds, strict=True):
        columns[f"{name}_s"] = sums(row)
    return pd.DataFrame(columns)
