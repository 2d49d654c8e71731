"""Measured recovery of W′, as published: group means, read at second hand but for chidnok-2012."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class MeasuredRecovery:
    """W′ found again (% of W′) after exhausting effort and ``time_s`` at ``recovery_w``.

    ``effort_s`` is how long the exhausting effort lasted, None where it makes no difference to
    the table.
    """

    source: str
    critical_power_w: float
    w_prime_j: float
    recovery_w: float
    effort_s: float | None
    time_s: tuple[float, ...]
    recovered_pct: tuple[float, ...]


@dataclass(frozen=True)
class MeasuredIntermittent:
    """Work bouts and easy bouts in turn until exhaustion, which came after ``exhausted_s``."""

    source: str
    critical_power_w: float
    w_prime_j: float
    work_w: float
    work_s: float
    recovery_w: float
    recovery_s: float
    exhausted_s: float


def _caen_2019(share: float, effort_s: float, recovered_pct: tuple[float, ...]) -> MeasuredRecovery:
    return MeasuredRecovery(
        "caen-2019", 248.0, 18_200.0, share * 248.0, effort_s, (120.0, 240.0, 360.0), recovered_pct
    )


MEASURED: tuple[MeasuredRecovery, ...] = (
    MeasuredRecovery(
        "ferguson-2010", 212.0, 21_600.0, 20.0, None, (120.0, 360.0, 900.0), (37.0, 65.0, 86.0)
    ),
    MeasuredRecovery(
        "caen-2021",
        269.0,
        19_200.0,
        161.0,
        None,
        (30.0, 60.0, 120.0, 180.0, 240.0, 300.0, 600.0, 900.0),
        (28.6, 34.8, 44.2, 50.5, 55.1, 56.8, 73.7, 71.3),
    ),
    _caen_2019(0.33, 240.0, (55.0, 61.0, 70.5)),
    _caen_2019(0.33, 480.0, (42.0, 52.0, 59.5)),
    _caen_2019(0.66, 240.0, (49.0, 55.0, 58.5)),
    _caen_2019(0.66, 480.0, (38.0, 37.5, 50.0)),
)
"""After exhaustion. The Caen 2019 pairs differ at equal power only by the effort before, so no
law in power and W′ alone can come nearer than about 6 points to both."""

INTERMITTENT: tuple[MeasuredIntermittent, ...] = tuple(
    MeasuredIntermittent(
        "chidnok-2012", 241.0, 21_100.0, 329.0, 60.0, recovery_w, 30.0, exhausted_s
    )
    for recovery_w, exhausted_s in ((173.0, 564.0), (95.0, 768.0), (20.0, 1225.0))
)
