"""What is known of chains and bearings: the defaults lie inside it.

Best chain efficiency 98.6 % (Spicer et al. 2001, J Mech Des 123:598), worst 80.9 % (same, from
memory); solo chain loss 2.1 ± 1.5 % at 100-400 W (Smit 2023, Sports Eng); never above 0.99.
"""

from __future__ import annotations

from pacing.bike import Bike

DEFAULT = Bike(mass_kg=8.0, crr=0.004).drivetrain_efficiency


def test_the_default_efficiency_lies_between_the_worst_and_the_best_chain() -> None:
    assert 0.809 <= DEFAULT <= 0.986 < 0.99


def test_the_default_loss_is_within_the_spread_of_measured_chains() -> None:
    assert abs((1.0 - DEFAULT) * 100.0 - 2.1) <= 1.5
