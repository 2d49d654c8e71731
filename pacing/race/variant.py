"""From one race to another with some values replaced, reading the course only if need be."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from pacing.race.build import build
from pacing.race.options import landing, overrides_in, replaced
from pacing.race.origin import Origins
from pacing.race.race import Race


def vary(race: Race, overrides: Mapping[str, Any]) -> Race:
    """The same race with ``overrides`` applied.

    ``overrides`` maps dotted names to values, ``{"bike.crr": "-3 %"}``, or holds tables as an
    option of the race file does (``race.options[0]``). Defaults that follow from other keys
    follow them again. The result has no options.
    Raises as `pacing.race.load_race` does, naming the key of the override.
    """
    asked = overrides_in(overrides)
    table = replaced(race.given, asked, filled=race.inputs)
    landed = {landing(override, race.inputs)[0]: override.origin for override in asked}
    touched = any(override.path[0] == "course" for override in asked)
    course = None if touched else race.course
    return build(table, Origins(None, landed), file=race.file, course=course)
