"""Six demo programs of arithmetic on three devices: planned, checked, written."""

from __future__ import annotations

import openqasm3
import pytest

import placer
from placer.api import find_program
from placer.device.read import find_device
from placer.report.qasm import placed_qasm

DEMOS = (
    "ballast-mix",
    "beacon-table",
    "cargo-weights",
    "highest-mast",
    "quay-limit",
    "tide-clock",
)


@pytest.mark.parametrize("device", ["slate-16", "quartzite-20", "marl-32"])
@pytest.mark.parametrize("name", DEMOS)
def test_demo_is_planned_checked_and_written(name: str, device: str) -> None:
    plan = placer.plan(name, device, effort="quick")
    assert placer.check(placer.to_json(plan)).ok
    own = plan.figures.costs.total
    for row in plan.policies:
        if row.figures is not None and (row.fits or not plan.verdict.fits):
            assert own <= row.figures.costs.total, row.policy
    program = find_program(name)
    for gates in ("toffoli", "clifford-t"):
        text = placed_qasm(plan, program, find_device(device), gates=gates)
        openqasm3.parse(text)
