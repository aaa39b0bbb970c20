"""Planning from an earlier plan: never worse, few moves, tolerant of small edits."""

from __future__ import annotations

import dataclasses
import json
import random
import re

import pytest

import placer
from placer.device.model import Device
from placer.device.read import find_device, read_device
from placer.errors import InputError
from placer.halt import Halt
from placer.plan import Plan, to_json
from placer.planner.placement import make_instance
from placer.planner.pool import Pool
from placer.planner.warm import moved_wires, take_over
from placer.planner.work import WORK
from placer.problem import make_problem
from placer.program.read import read_program
from placer.tables import device_tables

HEAD = 'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[7] q;\n'
BODY = [
    "ctrl(4) @ x q[0], q[1], q[2], q[3], q[4];",
    "cx q[5], q[6];",
    "ctrl(3) @ z q[2], q[4], q[5], q[6];",
]


def source(lines: list[str]) -> str:
    return HEAD + "\n".join(lines) + "\n"


def recalibrated(device: Device, seed: int, spread: float) -> Device:
    """Return the device with other error rates and lifetimes, written as a file."""
    draw = random.Random(seed)
    lines = [device.text.rstrip("\n")]
    text = lines[0]
    assert "site_overrides" not in text
    lines.append("site_overrides:")
    for site in device.sites:
        factor = draw.uniform(1 - spread, 1 + spread)
        if site.t1_us is not None and site.t2_us is not None:
            t1 = round(site.t1_us * factor, 3)
            t2 = round(min(site.t2_us * factor, 2 * t1), 3)
            lines.append(f"  {site.id}: {{t1_us: {t1}, t2_us: {t2}}}")
    return read_device("\n".join(lines) + "\n", "again.yaml")


def plain_device() -> Device:
    text = (
        "name: plain\ncalibrated: 2026-01-01\n"
        "lattice: {kind: grid, rows: 4, columns: 4}\n"
        "sites: {t1_us: 80, t2_us: 60, gate_error: 4e-4, gate_time_ns: 30, "
        "readout_error: 1e-2, readout_time_ns: 400}\n"
        "links: {error: 6e-3, time_ns: 60}\n"
        "capabilities: {mid_circuit_measurement: false, reset: false, "
        "conditional_latency_ns: none, level2_sites: none}\n"
    )
    return read_device(text, "plain.yaml")


def rejudged(plan: Plan, text: str, device: Device) -> int:
    """Return the expected error of an earlier plan on a problem, as taken over."""
    problem = make_problem(device, read_program(text, "s.qasm"))
    instance = make_instance(problem, device_tables(device))
    pool = Pool(instance, WORK["quick"], 0, Halt(), lambda _: None)
    start = take_over(pool, placer.api.read_earlier(plan))
    assert start is not None
    assert start.judged is not None
    assert start.kept_route
    return start.judged.figures.costs.total


@pytest.fixture(scope="module")
def plan() -> Plan:
    return placer.plan(read_program(source(BODY), "s.qasm"), "slate-16", effort="quick")


def test_the_same_problem_gives_a_plan_that_is_no_worse_and_moves_nothing(
    plan: Plan,
) -> None:
    program = read_program(source(BODY), "s.qasm")
    assert rejudged(plan, source(BODY), find_device("slate-16")) == (
        plan.figures.costs.total
    )
    again = placer.plan(program, "slate-16", effort="quick", earlier=plan)
    assert again.figures.costs.total <= plan.figures.costs.total
    gain = plan.figures.costs.total - again.figures.costs.total
    if gain < 0.01 * plan.figures.costs.total:
        assert again.wires == plan.wires
    twice = placer.plan(program, "slate-16", effort="quick", earlier=to_json(plan))
    assert to_json(again) == to_json(twice)


@pytest.mark.parametrize("seed", range(2))
def test_a_new_calibration_is_never_worse_than_the_earlier_plan(seed: int) -> None:
    device = plain_device()
    program = read_program(source(BODY), "s.qasm")
    plan = placer.plan(program, device, effort="quick")
    later = recalibrated(device, seed, 0.4)
    kept = rejudged(plan, source(BODY), later)
    again = placer.plan(program, later, effort="quick", earlier=plan)
    assert again.figures.costs.total <= kept * 1.01
    moved = [w for w, site in again.wires.items() if plan.wires[w] != site]
    note = next(n for n in again.notes if "wires moved" in n)
    assert note.startswith(f"{len(moved)} of 7 wires moved")
    if moved:
        assert again.figures.costs.total < kept


@pytest.mark.parametrize(
    ("edit", "new"),
    [
        (lambda lines: [*lines, "ctrl(2) @ x q[1], q[2], q[6];"], 1),
        (lambda lines: lines[:1] + lines[2:], 0),
    ],
)
def test_a_small_edit_keeps_what_is_still_there(plan, edit, new) -> None:  # type: ignore[no-untyped-def]
    device = find_device("slate-16")
    text = source(edit(BODY))
    problem = make_problem(device, read_program(text, "s.qasm"))
    instance = make_instance(problem, device_tables(device))
    pool = Pool(instance, WORK["quick"], 0, Halt(), lambda _: None)
    start = take_over(pool, placer.api.read_earlier(plan))
    assert start is not None
    assert sum(1 for old in start.same if old < 0) == new
    assert start.placement.sites == tuple(plan.wires.values())
    again = placer.plan(
        read_program(text, "s.qasm"), device, effort="quick", earlier=plan
    )
    assert placer.check(to_json(again)).ok
    assert start.judged is not None
    assert again.figures.costs.total <= start.judged.figures.costs.total * 1.01


def test_a_site_out_of_service_moves_only_what_was_there(plan: Plan) -> None:
    device = find_device("slate-16")
    lost = plan.wires["q[0]"]
    sites = tuple(
        dataclasses.replace(s, in_service=s.in_service and s.id != lost)
        for s in device.sites
    )
    smaller = dataclasses.replace(device, sites=sites, hash="other")
    problem = make_problem(smaller, read_program(source(BODY), "s.qasm"))
    instance = make_instance(problem, device_tables(smaller))
    pool = Pool(instance, WORK["quick"], 0, Halt(), lambda _: None)
    start = take_over(pool, placer.api.read_earlier(plan))
    assert start is not None
    earlier = dataclasses.replace(start.placement, sites=tuple(plan.wires.values()))
    assert moved_wires(instance, start.placement, earlier) == [0]


def test_another_program_takes_nothing_over_and_is_still_planned() -> None:
    plan = placer.plan("tide-gate", "slate-16", effort="quick")
    program = read_program(source(BODY), "s.qasm")
    again = placer.plan(program, "slate-16", effort="quick", earlier=plan)
    assert placer.check(to_json(again)).ok
    text = next(n for n in again.notes if "wires moved" in n)
    assert re.search(r"3 of 3 steps are new", text)


def test_what_is_no_plan_is_refused(plan: Plan) -> None:
    program = read_program(source(BODY), "s.qasm")
    data = json.loads(to_json(plan))
    del data["wires"]
    for text in ("{}", json.dumps(data), "not JSON"):
        with pytest.raises(InputError):
            placer.plan(program, "slate-16", effort="quick", earlier=text)
