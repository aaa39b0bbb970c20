"""The whole chain on demo and generated programs: plan, check, placed file, replay."""

from __future__ import annotations

import json
import os
import random
import subprocess
import sys
from pathlib import Path

import pytest

import placer
from placer.device.read import find_device
from placer.planner.verdict import overrun
from placer.program.read import read_program
from placer.report.qasm import placed_qasm
from placer.report.sorts import demo_programs
from tests.replay_reader import same_function

WINNERS = {
    ("tide-gate", "slate-16"): "clean",
    ("full-berths", "tuff-10"): "borrowed",
    ("deep-channel", "quartzite-20"): "level2",
}


def multi_controlled(seed: int, wires: int, gates: int, most: int) -> str:
    """Return a random program of `gates` gates with 1 to `most` controls."""
    draw = random.Random(seed)
    lines = ["OPENQASM 3.0;", 'include "stdgates.inc";', f"qubit[{wires}] q;"]
    branching = 0
    for _ in range(gates):
        controls = min(draw.choice((1, 1, 2, 2, 3, draw.randint(1, most))), wires - 1)
        chosen = draw.sample(range(wires), controls + 1)
        operands = ", ".join(f"q[{w}]" for w in chosen)
        lines.append(f"ctrl({controls}) @ x {operands};")
        # The reader follows every branch, so only a few gates may branch.
        if branching < 8 and draw.random() < 0.2:
            branching += 1
            lines.append(f"h q[{draw.randrange(wires)}];")
    return "\n".join(lines) + "\n"


def assert_good(plan: placer.Plan, source: str, samples: int = 3) -> None:
    """Require a passed check, the same function, and no better single policy."""
    result = placer.check(placer.to_json(plan))
    assert result.ok, result.findings
    program = read_program(source, plan.program.path)
    device = find_device(plan.device.name)
    placed = placed_qasm(plan, program, device, gates="toffoli")
    if plan.program.syntax != "yaml":
        assert same_function(source, placed, samples=samples, seed=7) == []
    own = plan.figures.costs.total
    for row in plan.policies:
        if row.figures is not None and (row.fits or not plan.verdict.fits):
            assert own <= row.figures.costs.total, row.policy
    assert plan.bound.floor <= own
    assert plan.bound.least is not None
    assert plan.bound.least <= plan.bound.estimate
    assert plan.verdict.fits == (overrun(plan.figures, plan.budget) == 0)


@pytest.mark.parametrize(("program", "device"), sorted(WINNERS))
def test_three_demos_have_three_different_best_answers(
    program: str, device: str
) -> None:
    plan = placer.plan(program, device)
    assert plan.verdict.fits
    kinds = {step.workspace for step in plan.calls if step.recipe != "toffoli"}
    assert kinds == {WINNERS[program, device]}
    possible = [row for row in plan.policies if row.figures is not None]
    best = min(possible, key=lambda row: row.figures.costs.total)
    assert best.policy == WINNERS[program, device]
    assert_good(plan, demo_programs()[program].read_text())


def test_the_fourth_demo_does_not_fit_and_says_what_would() -> None:
    plan = placer.plan("night-watch", "shale-12", cleanup="as-written")
    assert not plan.verdict.fits
    assert "ready" in plan.verdict.sentence
    assert "--budget" in plan.verdict.nearest
    share = float(plan.verdict.nearest.split("--budget ")[1].split(")")[0])
    again = placer.plan("night-watch", "shale-12", budget=share, cleanup="as-written")
    assert again.verdict.fits


def test_the_fourth_demo_fits_when_its_value_is_returned() -> None:
    plan = placer.plan("night-watch", "shale-12", effort="quick")
    assert plan.verdict.fits
    assert plan.cleanup is not None
    assert plan.cleanup.chosen == "at once"
    (value,) = plan.cleanup.values
    assert (value.treatment, value.computed) == ("again", 12)


@pytest.mark.parametrize(
    ("device", "wires", "gates", "most"),
    [("chert-27", 5, 10, 4), ("chert-27", 14, 40, 8), ("gneiss-127", 20, 60, 10)],
)
def test_generated_programs_are_planned_checked_and_compute_the_same(
    device: str, wires: int, gates: int, most: int
) -> None:
    source = multi_controlled(wires, wires, gates, most)
    plan = placer.plan(read_program(source, "generated.qasm"), device)
    assert_good(plan, source)


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize(
    ("device", "wires", "gates", "most"),
    [
        ("chert-27", 8, 100, 7),
        ("chert-27", 22, 60, 15),
        ("gneiss-127", 40, 100, 15),
        ("gneiss-127", 40, 400, 15),
        ("gneiss-127", 16, 400, 12),
    ],
)
def test_more_generated_programs(
    device: str, wires: int, gates: int, most: int, seed: int
) -> None:
    source = multi_controlled(100 + seed, wires, gates, most)
    plan = placer.plan(read_program(source, "generated.qasm"), device)
    assert_good(plan, source, samples=2)


def test_hash_seed_and_repetition_do_not_change_a_byte(tmp_path: Path) -> None:
    texts = []
    for hash_seed in ("1", "2"):
        target = tmp_path / f"{hash_seed}.json"
        command = [
            sys.executable,
            "-m",
            "placer.cli",
            "plan",
            "full-berths",
            "-d",
            "tuff-10",
            "-q",
            "--plan",
            str(target),
        ]
        environment = {**os.environ, "PYTHONHASHSEED": hash_seed}
        done = subprocess.run(
            command, env=environment, capture_output=True, text=True, check=False
        )
        assert done.returncode == 0, done.stderr
        texts.append((target.read_bytes(), done.stdout))
    assert texts[0] == texts[1]
    assert json.loads(texts[0][0])["format"] == 1
