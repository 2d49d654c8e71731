"""The keys of the race file as Markdown tables, for the README."""

from __future__ import annotations

from pathlib import Path

from pacing.race.keys import LIST_MARK, NOT_YET, Key, sections

START, END = "<!-- keys: start -->", "<!-- keys: end -->"


def markdown() -> str:
    """One table for every section of the race file, and what is refused for now."""
    parts = []
    for section, keys in sections().items():
        own = {name: key for name, key in keys.items() if section != "air.hours[]" or name == "at"}
        title = f"[[{section[:-2]}]]" if section.endswith(LIST_MARK) else f"[{section}]"
        parts.append(f"### `{title}`\n\n| key | may hold | default | meaning |\n|---|---|---|---|")
        parts[-1] += "".join(f"\n{_row(key)}" for key in own.values())
        if section == "air.hours[]":
            parts[-1] += (
                "\n\nThe keys of `[air]` may stand here too; what is absent is taken from there."
            )
    refused = [
        f"- `{key}`{'' if value is None else f' = {value}'}: {reason}"
        for key, value, reason in NOT_YET
    ]
    if refused:
        parts.append("### Refused for now\n\n" + "\n".join(refused))
    return "\n\n".join(parts)


def rewritten(readme: str) -> str:
    """The README's text with the tables between the two marks made anew."""
    before, rest = readme.split(START)
    return f"{before}{START}\n\n{markdown()}\n\n{END}{rest.split(END)[1]}"


def write(readme: Path | str) -> None:
    """Makes the tables of a README file anew."""
    file = Path(readme)
    file.write_text(rewritten(file.read_text(encoding="utf-8")), encoding="utf-8")


def _row(key: Key) -> str:
    default = "**required**" if key.required else key.otherwise or _shown(key.default)
    if key.required and key.otherwise:
        default = f"**required**, or {key.otherwise}"
    return f"| `{key.name}` | {_holds(key)} | {default} | {key.meaning} |"


def _holds(key: Key) -> str:
    words = key.expected.replace("one of ", "").replace(" from ", " ")
    if (key.usual_low, key.usual_high) != (key.low, key.high):
        words += f"; usual {key.usual_low:g} to {key.usual_high:g}"
    return words.replace("|", "\\|")


def _shown(default: object) -> str:
    if isinstance(default, bool):
        return "true" if default else "false"
    if default in ("", []):
        return "none"
    return f"{default:g}" if isinstance(default, int | float) else f'"{default}"'
