"""One table of what each part of the main job takes, beside two other ways of solving it.

Printed, never asserted. Run it with ``pytest -m speed tests/speed -s``. Wall time, the best of a
few runs, and the processor's time beside it, which other work on the machine disturbs less. The
peers, in tests/reference, solve the same exported numbers in the same run: CasADi with IPOPT
(expressions built beforehand, not counted), and SLSQP with finite differences over an adaptive
ODE integrator, extrapolated from part of one gradient.
"""

from __future__ import annotations

import subprocess
import sys
import sysconfig
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from races import INVENTED

import pacing

pytest.importorskip("casadi", reason="CasADi is not installed: pip install '.[reference]'")
import exported
import first_evening
import ipopt_peer

from pacing.plan.frames import model_inputs, trace_frame
from pacing.plan.prepare import Prepared, prepare
from pacing.plan.problem import Ride, ride
from pacing.plan.solve import Solution, solve

pytestmark = pytest.mark.speed

PIECES = 80
USUAL_ITERATIONS = 40  # of a well scaled SLSQP; with finite differences rather more
ROLLING = next(case for case in INVENTED if case.name == "rolling loop")


@dataclass
class Sheet:
    """Rows of the table as they come."""

    rows: list[tuple[str, str, float, float]] = field(default_factory=list)

    def time(self, what: str, size: str, work: Callable[[], Any], *, times: int = 3) -> Any:
        """Run ``work`` a few times and note the best; gives its last result."""
        wall, cpu, result = [], [], None
        for _ in range(times):
            at, cpu_at = time.perf_counter(), time.process_time()
            result = work()
            wall.append(time.perf_counter() - at)
            cpu.append(time.process_time() - cpu_at)
        self.note(what, size, min(wall), min(cpu))
        return result

    def note(self, what: str, size: str, wall_s: float, cpu_s: float) -> None:
        """A row measured elsewhere."""
        self.rows.append((what, size, wall_s, cpu_s))

    def seconds(self, what: str) -> float:
        """The processor's time of one row."""
        return next(cpu for name, _, _, cpu in self.rows if name == what)

    def text(self) -> str:
        """The table, with ratios to our own solve."""
        own = self.seconds("solve")
        head = f"{'':44s} {'size':34s} {'wall s':>10s} {'cpu s':>10s} {'cpu/solve':>10s}"
        body = [
            f"{what:44s} {size:34s} {wall:10.4f} {cpu:10.4f} {cpu / own:10.3g}"
            for what, size, wall, cpu in self.rows
        ]
        return "\n".join(["", head, *body, ""])


def _equal_starts(cells: int) -> np.ndarray:
    return (np.arange(PIECES) * cells // PIECES).astype(np.intp)


def _everything(ridden: Ride, changed_w: np.ndarray) -> Ride:
    """One evaluation with all slopes, as the solver asks for it."""
    again = ride(ridden.problem, ridden.starts, changed_w, guess_m_s=ridden.motion.speed_m_s)
    assert again.time_slopes.size == changed_w.size
    assert again.lowest.lowest_j.size == changed_w.size
    assert again.lowest_slopes is not None
    return again


def _ours(sheet: Sheet, race_file: Path) -> tuple[Prepared, Solution]:
    race = sheet.time("reading the race and its course", "", lambda: pacing.load_race(race_file))
    prepared = sheet.time("best constant target, weather, CP", "", lambda: prepare(race), times=1)
    problem, constant = prepared.problem, prepared.constant
    starts = _equal_starts(problem.cells)
    size = f"{race.course.length_m / 1000:.1f} km, {problem.cells} cells"
    sheet.rows = [(what, size, wall, cpu) for what, _, wall, cpu in sheet.rows]
    power = np.full(PIECES, float(constant.power_w[0]))
    speed = constant.motion.speed_m_s
    first = ride(problem, starts, power, guess_m_s=speed)
    changed = power + np.linspace(-5.0, 5.0, PIECES)
    sheet.time(
        "one simulation", size, lambda: ride(problem, starts, changed, guess_m_s=speed), times=10
    )
    with_pieces = f"{size}, {PIECES} pieces"
    sheet.time(
        "one simulation with every slope",
        with_pieces,
        lambda: _everything(first, changed),
        times=10,
    )
    solution = sheet.time(
        "solve", with_pieces, lambda: solve(problem, starts, power, guess_m_s=speed), times=2
    )
    return prepared, solution


def _peers(sheet: Sheet, prepared: Prepared, solution: Solution) -> list[str]:
    race, ridden = prepared.race, solution.ride
    road = exported.read_exported(trace_frame(race, ridden), model_inputs(race, ridden))
    size = f"{road.cells} cells, {PIECES} pieces"
    peer = ipopt_peer.solve(road, starts=ridden.starts)
    sheet.note("(b) CasADi with IPOPT", size, peer.solve_s, peer.solve_cpu_s)
    free = ipopt_peer.solve(road)
    sheet.note("(b) the same, power free in every cell", size[:10], free.solve_s, free.solve_cpu_s)
    evening = first_evening.FirstEvening(road, np.asarray(ridden.starts))
    started = time.process_time()
    one = evening.gradient_seconds(np.full(PIECES, 300.0), columns=4)
    share = (time.process_time() - started) / max(one * 5.0 / (PIECES + 1), 1e-9)
    whole = one * USUAL_ITERATIONS
    sheet.note("(a) one finite-difference gradient over ODE", size, one, one * share)
    sheet.note("(a) a solve, extrapolated", size, whole, whole * share)
    return [
        f"ours {ridden.motion.total_s:.3f} s in {solution.iterations} iterations; IPOPT "
        f"{peer.time_s:.3f} s in {peer.iterations} ({peer.status}), free {free.time_s:.3f} s in "
        f"{free.iterations} ({free.status})",
        f"(a) is extrapolated from 4 columns of one gradient and {USUAL_ITERATIONS} iterations",
    ]


def _whole(sheet: Sheet, race_file: Path) -> None:
    race = pacing.load_race(race_file)
    plan = sheet.time("the whole optimum (plan_race)", "24 cues", lambda: pacing.plan_race(race))
    sheet.note("  of it, from loaded race to cues", "24 cues", float(plan.solver["seconds"]), 0.0)
    command = Path(sysconfig.get_path("scripts")) / "pacing"
    for what, words in (
        ("pacing --help", ["--help"]),
        ("pacing plan, the whole command", ["plan", str(race_file), "-o", "out"]),
    ):
        began = time.perf_counter()
        subprocess.run(
            [str(command), *words], cwd=race_file.parent, check=True, capture_output=True
        )
        sheet.note(what, "", time.perf_counter() - began, 0.0)


def test_what_each_part_takes_and_what_two_peers_take(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    sheet = Sheet()
    race_file = ROLLING.write(tmp_path, law="skiba-2015")
    prepared, solution = _ours(sheet, race_file)
    notes = _peers(sheet, prepared, solution)
    _whole(sheet, race_file)
    with capsys.disabled():
        print(sheet.text() + "\n".join(notes))
        print(f"Python {sys.version.split()[0]}; cpu 0: in another process or counted above")
