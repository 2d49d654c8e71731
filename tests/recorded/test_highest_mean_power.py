"""Highest mean power of real rides, gaps and missing power included."""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

from pacing.field.highest_mean import highest_mean_power, is_recording, read_power


@pytest.mark.parametrize(
    "name", ["lake_flat_out_back_31km", "city_paths_67km", "river_city_flat_79km"]
)
def test_a_real_ride_gives_plausible_means(recorded_rides: Path, name: str) -> None:
    file = recorded_rides / f"{name}.csv"
    assert is_recording(file)
    time, power = read_power(file)
    means = highest_mean_power(time, power)
    assert means.duration_s.size >= 10
    assert means.power_w.max() <= np.nanmax(power)
    # Twice as long is never more, up to rounding.
    held = dict(zip(means.duration_s.tolist(), means.power_w.tolist(), strict=True))
    doubled = [(held[d], held[2 * d]) for d in held if 2 * d in held]
    assert all(shorter >= longer - 1e-9 for shorter, longer in doubled)
    assert all(a < b for a, b in pairwise(means.duration_s.tolist()))
