"""The race file's ``[[options]]``: each must give a race whose keys can be used."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from pacing.errors import CannotBeRiddenError, UnusableInputError
from pacing.race.check import Checked
from pacing.race.complete import completed
from pacing.race.keys import sections
from pacing.race.lines import Path
from pacing.race.options import landing, overrides_in, replaced
from pacing.race.origin import Origins, quoted, shown
from pacing.race.value import checked_value

MOST_OPTIONS = 500


def checked_options(
    given: Mapping[str, Any], origins: Origins, *, filled: Mapping[str, Any]
) -> tuple[dict[str, Any], ...]:
    """The options as written, after trying each on the race.

    Raises `UnusableInputError` naming the option's key. An option whose race could not be
    ridden is left for the comparison to say.
    """
    options = given.get("options", [])
    if not isinstance(options, list) or len(options) > MOST_OPTIONS:
        expected = f"tables, each under [[options]], at most {MOST_OPTIONS}"
        raise origins.error(("options",), shown(options), expected=expected)
    names: list[str] = []
    for number, option in enumerate(options):
        path: Path = ("options", number)
        if not isinstance(option, dict):
            raise origins.error(path, shown(option), expected="a table under [[options]]")
        name = _name(option, path, origins)
        if name in names:
            raise origins.error(
                (*path, "name"), f"{quoted(name)} a second time", expected="a name of its own"
            )
        names.append(name)
        _try(given, option, path, origins, filled)
    return tuple(options)


def _name(option: Mapping[str, Any], path: Path, origins: Origins) -> str:
    key = sections()["options[]"]["name"]
    if "name" not in option:
        raise origins.error((*path, "name"), "missing", expected=key.expected)
    text = checked_value(key, option["name"], (*path, "name"), origins, lambda *_: None)
    return str(text)


def _try(
    given: Mapping[str, Any],
    option: Mapping[str, Any],
    path: Path,
    origins: Origins,
    filled: Mapping[str, Any],
) -> None:
    overrides = overrides_in(option, start=path, origins=origins)
    if not overrides:
        raise origins.error(path, "changes nothing", expected="a key of the race, such as bike.crr")
    table = replaced(given, overrides, filled=filled)
    landed = {landing(override, filled)[0]: override.origin for override in overrides}
    checked = Checked(table, Origins(origins.race, {**origins.others, **landed}))
    try:
        completed(checked.table(), checked)
    except CannotBeRiddenError:
        return
    except UnusableInputError as problem:
        if problem.key and problem.key.startswith("options["):
            raise
        raise origins.error(
            path,
            f"the race would have {problem.key}: {problem.found}",
            expected=problem.expected,
            mend=problem.mend,
        ) from None
