"""What a device and a program contain: maps, ranges, idle wires, check results."""

from __future__ import annotations

import dataclasses
import re

import pytest

from placer.device.read import find_device, shipped_devices
from placer.program.read_qasm import read_qasm
from placer.report.show import (
    device_map,
    device_text,
    idle_windows,
    program_data,
    program_text,
)


@pytest.mark.parametrize("name", shipped_devices())
def test_every_shipped_device_is_shown(name):
    device = find_device(name)
    for width in (50, 80):
        lines = device_text(device, width=width).splitlines()
        assert max(map(len, lines)) <= width
    assert "calibrated 2026-" in device_text(device)


@pytest.mark.parametrize("name", ["slate-16", "chert-27", "breccia-27", "shale-12"])
def test_a_map_shows_every_site_and_link(name):
    device = find_device(name)
    drawing = "\n".join(device_map(device, 80))
    marks = drawing.replace("-", " ").replace("|", " ").split()
    broken = [s.id for s in device.sites if not s.in_service]
    working = [str(s.id) for s in device.sites if s.in_service]
    assert sorted(marks) == sorted([*working, *("x" for _ in broken)])
    lines = drawing.splitlines()
    vertical = sum(line.count("|") for line in lines)
    across = sum(
        1
        for link in device.links
        if device.is_usable(link)
        and device.sites[link.a].xy[1] == device.sites[link.b].xy[1]
    )
    usable = sum(1 for link in device.links if device.is_usable(link))
    # Between two marks on a line there are dashes exactly where there is a link.
    assert sum(len(re.findall("-+", line)) for line in lines) == across
    assert vertical == usable - across


def test_no_map_where_none_can_be_drawn():
    assert device_map(find_device("tuff-10"), 80) == []
    assert device_map(find_device("marl-32"), 80) == []
    assert device_map(find_device("schist-1121"), 80) == []
    assert device_map(find_device("slate-16"), 12) == []


SOURCE = """OPENQASM 2.0;
include "qelib1.inc";
qreg a[3];
qreg b[2];
x a[0];
ccx a[0], a[1], a[2];
x b[0];
ccx a[0], b[0], a[2];
"""


def test_idle_windows_follow_program_order():
    program = read_qasm(SOURCE, "small.qasm")
    first, second = idle_windows(program)
    # b has not begun at the first call; at the second one a[1] holds a value.
    assert (first.lendable, first.clean, first.kept) == (0, 2, 0)
    assert (second.lendable, second.clean, second.kept) == (1, 1, 0)
    assert program_data(program)["calls"][1]["in_zero"] == 1
    text = program_text(program)
    assert "mcx, 2 controls" in text
    assert "|0>" in text


def test_registers_that_must_not_be_lent():
    program = read_qasm(SOURCE, "small.qasm", open_inputs=True)
    kept = tuple(dataclasses.replace(r, lendable=False) for r in program.registers)
    program = dataclasses.replace(program, registers=kept)
    assert [w.kept for w in idle_windows(program)] == [2, 2]
    assert "never lent" in program_text(program)


def test_long_programs_stay_short():
    lines = ["OPENQASM 3.0;", 'include "stdgates.inc";', "qubit[40] q;"]
    for count in range(2, 30):
        wires = ", ".join(f"q[{i}]" for i in range(count + 1))
        lines.append(f"ctrl({count}) @ x {wires};")
    text = program_text(read_qasm("\n".join(lines), "long.qasm"))
    assert "and 20 smaller sorts" in text
    assert len(text.splitlines()) < 40
    assert max(map(len, text.splitlines())) <= 80
