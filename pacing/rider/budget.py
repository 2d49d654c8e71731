"""The recovery laws by name, and W′ left along a ride."""

from __future__ import annotations

from pacing.errors import UnusableInputError
from pacing.rider.recovery import Advance, RecoveryLaw
from pacing.rider.recovery_one_pool import NoRecovery, OnePool
from pacing.rider.recovery_two_phase import TwoPhase
from pacing.rider.time_constants import BARTRAM_2018, SKIBA_2012, WEIGEND_2022, skiba_2015

__all__ = ["DEFAULT_LAW", "RECOVERY_LAWS", "Advance", "RecoveryLaw", "recovery_law"]

DEFAULT_LAW = "two-phase"

_LAWS: dict[str, RecoveryLaw] = {
    law.name: law
    for law in (
        NoRecovery(),
        TwoPhase(),
        OnePool(
            "skiba-2012",
            lambda _: SKIBA_2012,
            {
                "height_s": SKIBA_2012.height_s,
                "per_w": SKIBA_2012.per_w,
                "floor_s": SKIBA_2012.floor_s,
            },
        ),
        OnePool("skiba-2015", skiba_2015),
        OnePool(
            "bartram-2018",
            lambda _: BARTRAM_2018,
            {"scale": BARTRAM_2018.scale, "exponent": BARTRAM_2018.exponent},
        ),
        OnePool(
            "weigend-2022",
            lambda _: WEIGEND_2022,
            {
                "scale": WEIGEND_2022.scale,
                "exponent": WEIGEND_2022.exponent,
                "offset_s": WEIGEND_2022.offset_s,
            },
        ),
    )
}

RECOVERY_LAWS: tuple[str, ...] = tuple(_LAWS)


def recovery_law(name: str) -> RecoveryLaw:
    """The recovery law of that name (`RECOVERY_LAWS`).

    Raises `UnusableInputError` for any other.

    Source: caen-2021, skiba-2012, skiba-2015, bartram-2018, weigend-2022.
    """
    try:
        return _LAWS[name]
    except KeyError:
        raise UnusableInputError(
            f"{name!r} is no recovery law", expected=" or ".join(RECOVERY_LAWS)
        ) from None
