"""Early ends: what was found is checked and said, and nothing else changes."""

from __future__ import annotations

import json
import os
import re
import signal
import subprocess
import sys
import threading
import time
from pathlib import Path

import pytest

import placer
from placer.device.read import find_device
from placer.errors import OutOfTime
from placer.halt import Halt, Interrupted, watched
from placer.interrupts import stoppable
from placer.plan import to_json
from placer.program.read import read_program

SOURCE = (
    'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[8] q;\n'
    "ctrl(4) @ x q[0], q[1], q[2], q[3], q[4];\n"
    "ctrl(5) @ x q[3], q[4], q[5], q[6], q[7], q[0];\n"
)


class _After(Halt):
    """A halt that is due when a stage begins, whatever the clock says."""

    def __init__(self, stage: str) -> None:
        super().__init__()
        self.wanted = stage

    def is_due(self) -> bool:
        if self.stage.startswith(self.wanted):
            self.interrupt()
        return super().is_due()


@pytest.mark.parametrize("stage", ["policy: none", "search", "joint", "routes"])
def test_an_end_at_any_stage_gives_a_checked_plan_that_says_so(stage: str) -> None:
    program = read_program(SOURCE, "two.qasm")
    plan = placer.plan(program, "slate-16", effort="quick", halt=_After(stage))
    assert placer.check(to_json(plan)).ok
    assert any(f"interrupted at stage '{stage}" in note for note in plan.notes)


def test_an_end_before_any_plan_gives_none() -> None:
    halt = Halt()
    halt.interrupt()
    program = read_program(SOURCE, "two.qasm")
    with pytest.raises(Interrupted):
        placer.plan(program, "slate-16", effort="quick", halt=halt)
    with pytest.raises(OutOfTime, match=r"wall-clock limit of 0\.001 s"):
        placer.plan(program, "slate-16", effort="quick", wall_limit=0.001)


def test_a_limit_that_is_not_hit_changes_nothing() -> None:
    plain = placer.plan("tide-gate", "slate-16", effort="quick")
    limited = placer.plan("tide-gate", "slate-16", effort="quick", wall_limit=600)
    assert to_json(plain) == to_json(limited)


def test_what_knows_no_halt_is_stopped_and_its_faults_come_out() -> None:
    halt = Halt(0.05)
    ended = threading.Event()
    begin = time.monotonic()
    watched(halt, lambda: ended.wait(20), ended.set)
    assert time.monotonic() - begin < 10
    assert halt.why

    def fail() -> None:
        raise ValueError("from inside")

    with pytest.raises(ValueError, match="from inside"):
        watched(Halt(), fail, lambda: None)


def test_signals_end_the_work_in_order_then_at_once() -> None:
    halt = Halt()
    said: list[str] = []
    with stoppable(halt, said.append):
        os.kill(os.getpid(), signal.SIGINT)
        assert halt.is_due()
        assert said
        with pytest.raises(KeyboardInterrupt):
            os.kill(os.getpid(), signal.SIGINT)
    assert signal.getsignal(signal.SIGINT) is signal.default_int_handler


def test_work_that_does_not_end_is_given_up() -> None:
    halt = Halt(0.2)
    begin = time.monotonic()

    def spin() -> None:
        while time.monotonic() - begin < 20:
            pass

    with stoppable(halt, print), pytest.raises(OutOfTime, match=r"limit of 0\.2 s"):
        spin()
    assert time.monotonic() - begin < 5


def large_source(calls: int) -> str:
    lines = ["OPENQASM 3.0;", 'include "stdgates.inc";', "qubit[400] q;"]
    for k in range(calls):
        wires = ", ".join(f"q[{(7 * k + 31 * j * (k + 1)) % 400}]" for j in range(6))
        if len(set(wires.split(", "))) == 6:
            lines.append(f"ctrl(5) @ x {wires};")
    return "\n".join(lines) + "\n"


@pytest.mark.slow
@pytest.mark.parametrize("limit", [6, 20])
def test_a_problem_far_too_large_ends_within_its_limit(
    limit: int, tmp_path: Path
) -> None:
    source = tmp_path / "large.qasm"
    source.write_text(large_source(6000))
    target = tmp_path / "plan.json"
    words = ["plan", str(source), "-d", "basalt-433", "--wall-limit", str(limit)]
    begin = time.monotonic()
    done = subprocess.run(
        [sys.executable, "-m", "placer.cli", *words, "-q", "--plan", str(target)],
        capture_output=True,
        text=True,
        check=False,
    )
    # The interpreter's own start and end, about a second, come on top.
    assert time.monotonic() - begin < 1.1 * limit + 3
    assert done.returncode in (0, 1, 3), done.stderr
    assert (done.returncode == 3) == (not target.exists())
    if target.exists():
        assert placer.check(target.read_text()).ok
        notes = json.loads(target.read_text())["notes"]
        assert any("limit" in note for note in notes)


def test_progress_says_best_bound_and_gap() -> None:
    said: list[str] = []
    device = find_device("slate-16")
    program = read_program(SOURCE.split("ctrl(5)")[0], "one.qasm")
    placer.plan(program, device, effort="quick", progress=said.append)
    last = next(line for line in said if line.startswith("routes"))
    assert re.search(r"best error [\d.]+; cost [\d.]+, bound [\d.]+, gap \d+%", last)
