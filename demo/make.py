"""Make anew whatever is shown: ``.venv/bin/python demo/make.py``.

Plans the demo race into ``demo/out`` as the README's command does, keeps what was printed and the
pictures, smaller, in ``demo/shown``, and makes the README's marked parts anew: the demo's output,
the keys of the race file, the sources. ``tests/house`` fails while any of it is out of date.
"""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

from PIL import Image

from pacing.race import key_table
from pacing.sources import SOURCES

ROOT = Path(__file__).resolve().parents[1]
SHOWN = ROOT / "demo" / "shown"
README = ROOT / "README.md"
COMMAND = ("plan", "demo/race.toml", "-o", "demo/out")
PICTURES = ("cue-sheet.png", "profile.png", "map.png")
GREYS_AND_COLOURS = 48
BLOCKS_IN_README = 3


def main() -> None:
    """Everything shown, one after the other."""
    SHOWN.mkdir(exist_ok=True)
    printed = plan_demo(ROOT)
    (SHOWN / "plan.txt").write_text(printed, encoding="utf-8", newline="\n")
    for name in PICTURES:
        smaller(ROOT / "demo" / "out" / name).save(SHOWN / name, optimize=True)
    text = README.read_text(encoding="utf-8")
    README.write_text(renewed(text, printed), encoding="utf-8", newline="\n")


def plan_demo(folder: Path) -> str:
    """What the README's command prints when given in ``folder``."""
    environment = {**os.environ, "PYTHONUTF8": "1"}
    done = subprocess.run(
        [sys.executable, "-m", "pacing.cli.app", *COMMAND],
        cwd=folder,
        env=environment,
        capture_output=True,
        encoding="utf-8",
        check=False,
    )
    if done.returncode != 0:
        raise RuntimeError(done.stderr)
    return done.stdout


def smaller(picture: Path) -> Image.Image:
    """The picture with few colours: as it looks, in a quarter of the bytes."""
    with Image.open(picture) as image:
        return image.convert("RGB").quantize(GREYS_AND_COLOURS, dither=Image.Dither.NONE)


def renewed(readme: str, printed: str) -> str:
    """The README's text with its marked parts made anew."""
    blocks = printed.strip("\n").split("\n\n")[:BLOCKS_IN_README]
    shown = "\n\n".join(["```", *blocks])
    shown = shown.replace("```\n\n", "```text\n", 1) + "\n```"
    readme = between(readme, "demo", shown)
    readme = between(readme, "sources", source_list())
    return key_table.rewritten(readme)


def between(text: str, mark: str, new: str) -> str:
    """``text`` with what stands between the two marks replaced."""
    start, end = f"<!-- {mark}: start -->", f"<!-- {mark}: end -->"
    before, rest = text.split(start)
    return f"{before}{start}\n\n{new}\n\n{end}{rest.split(end)[1]}"


def source_list() -> str:
    """Every source in one line, by author."""
    lines = (
        f"- {source.authors} ({source.year}). {source.title}. {source.where}."
        for source in SOURCES.values()
    )
    return "\n".join(sorted(lines, key=str.casefold))


if __name__ == "__main__":
    main()
