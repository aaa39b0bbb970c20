"""Real plans of the demo programs: schema, text, and the placed file's function."""

from __future__ import annotations

import json

import openqasm3
import pytest

from placer.device.read import find_device
from placer.plan import to_json
from placer.planner.assemble import plan_of
from placer.planner.loop import run
from placer.problem import make_problem
from placer.program.read import read_program
from placer.report.qasm import GATE_LEVELS, placed_qasm
from placer.report.schema import faults_of
from placer.report.sorts import demo_programs
from placer.report.text import plan_text
from tests.replay_reader import same_function

CASES = [
    ("deep-channel", "slate-16"),
    ("deep-channel", "marl-32"),
    ("full-berths", "quartzite-20"),
    ("full-berths", "chert-27"),
]


@pytest.mark.slow
@pytest.mark.parametrize(("demo", "name"), CASES)
def test_a_real_plan_says_the_same_everywhere(demo, name):
    source = demo_programs()[demo].read_text()
    program, device = read_program(source, f"{demo}.qasm"), find_device(name)
    outcome = run(
        make_problem(device, program),
        effort="quick",
        seed=0,
        progress=lambda _: None,
    )
    plan = plan_of(outcome, version="0", seed=0, effort="quick", notes=())
    data = json.loads(to_json(plan))
    assert faults_of("plan", data) == []
    assert max(map(len, plan_text(plan).splitlines())) <= 80
    for gates in GATE_LEVELS:
        text = placed_qasm(plan, program, device, gates=gates)
        assert text == placed_qasm(data, program, device, gates=gates)
        openqasm3.parse(text)
        assert same_function(source, text, samples=4) == []
