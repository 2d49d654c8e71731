"""The rider and their positions."""

from __future__ import annotations

import pytest

from pacing.bike import DragArea
from pacing.rider import Position, Rider


def test_a_position_is_found_by_its_name() -> None:
    low = Position("low", DragArea((0.0,), (0.22,)))
    high = Position("high", DragArea((0.0,), (0.30,)), power_share=1.04)
    rider = Rider(mass_kg=70.0, critical_power_w=290.0, w_prime_j=18_000.0, positions=(low, high))
    assert rider.position("high") is high
    with pytest.raises(KeyError):
        rider.position("sideways")
