"""The routed file: its swaps, its links, and that it is the same function."""

from __future__ import annotations

import json
import random
import re
from typing import Any

import openqasm3
import pytest
from click.testing import CliRunner

import placer
from placer.cli import main
from placer.device.model import Device
from placer.device.read import find_device
from placer.errors import InputError
from placer.plan import to_json
from placer.program.read import read_program
from placer.report.routed import routed_qasm
from tests.replay_reader import read, same_function
from tests.report.test_placed_files import random_source

TWO_LEVELS = ["clean", "borrowed", "none"]


def two_qubit_sites(text: str) -> list[tuple[int, int]]:
    """Return the sites of every statement on two physical qubits, barriers apart."""
    found = []
    for line in text.splitlines():
        sites = [int(n) for n in re.findall(r"\$(\d+)", line)]
        if len(sites) > 1 and not line.startswith(("pragma", "barrier", "//", "@")):
            assert len(sites) == 2, line
            found.append((sites[0], sites[1]))
    return found


def swaps_of(text: str) -> list[tuple[int, int]]:
    return [
        (int(a), int(b))
        for a, b in re.findall(r"^swap \$(\d+), \$(\d+);$", text, re.MULTILINE)
    ]


def brought_home(text: str) -> str:
    """Return the text with its swaps undone at the end, as the layout names sites."""
    undone = [f"swap ${a}, ${b};" for a, b in reversed(swaps_of(text))]
    return text + "\n".join(undone) + "\n"


def final_sites(text: str) -> dict[str, int]:
    line = next(x for x in text.splitlines() if x.startswith("pragma placer.final"))
    return {
        name: int(site)
        for name, site in (word.split("=$") for word in line.split()[2:])
    }


def followed(text: str) -> dict[str, int]:
    """Return where the wires of the layout are after all swaps, by the swaps alone."""
    place = dict(read(text).layout)
    for a, b in swaps_of(text):
        for name, site in place.items():
            place[name] = b if site == a else a if site == b else site
    return place


def is_sound(text: str, plan: placer.Plan, device: Device) -> None:
    openqasm3.parse(text)
    assert len(swaps_of(text)) == plan.figures.swaps
    for a, b in two_qubit_sites(text):
        link = device.link(a, b)
        assert link is not None, (a, b)
        assert device.is_usable(link)
    gates = [pair for pair in two_qubit_sites(text) if pair]
    assert len(gates) == plan.figures.two_qubit_gates + plan.figures.swaps
    ends = final_sites(text)
    assert {name: ends[name] for name in followed(text)} == followed(text)


@pytest.mark.parametrize("seed", [0, 2, 4, 6])
def test_random_programs_are_routed_to_the_same_function(seed: int) -> None:
    chance = random.Random(f"routed {seed}")
    source = random_source(chance)
    device = find_device("quartzite-20")
    program = read_program(source, "random.qasm")
    plan = placer.plan(program, device, effort="quick", only=TWO_LEVELS)
    text = routed_qasm(plan, program, device)
    is_sound(text, plan, device)
    assert same_function(source, brought_home(text), samples=4) == []


MEASURED = """OPENQASM 3.0;
include "stdgates.inc";
qubit[6] q;
bit[2] c;
bit d;
ctrl(4) @ x q[0], q[1], q[2], q[3], q[4];
h q[5];
c[0] = measure q[5];
reset q[5];
ctrl(3) @ z q[5], q[0], q[2], q[4];
d = measure q[3];
ctrl(4) @ x q[0], q[1], q[2], q[4], q[5];
d = measure q[5];
"""


@pytest.mark.parametrize("device", ["quartzite-20", "slate-16"])
def test_measured_cleanup_and_measurements_keep_their_bits(device: str) -> None:
    chosen = find_device(device)
    program = read_program(MEASURED, "measured.qasm")
    plan = placer.plan(program, chosen, effort="quick", only=TWO_LEVELS)
    text = routed_qasm(plan, program, chosen)
    is_sound(text, plan, chosen)
    assert same_function(MEASURED, brought_home(text), samples=6) == []


OVERTAKEN = """OPENQASM 3.0;
include "stdgates.inc";
qubit[3] q;
bit c;
cx q[0], q[1];
c = measure q[1];
c = measure q[2];
"""


def test_a_measurement_that_is_overtaken_gets_a_bit_of_its_own() -> None:
    # On the line 0-1-2-3 q[1] has a swap and a gate to wait for before it is measured;
    # q[2] is measured at once, and the program's last word about c is q[2].
    device = find_device("tuff-10")
    program = read_program(OVERTAKEN, "overtaken.qasm")
    data = {
        "version": "0",
        "wires": {"q[0]": 0, "q[1]": 2, "q[2]": 4},
        "calls": [],
        "others": [[0, 0, 1], [1, 1, 2], [2, 2, 3]],
        "route": {"gaps": [[], [[0, 0]]], "swaps": [[1, 2]]},
    }
    text = routed_qasm(data, program, device)
    assert "cleanup[0] = measure $1;" in text
    assert "\nc = measure $4;" in text
    assert "bit[1] cleanup;" in text
    at_once = {**data, "wires": {"q[0]": 0, "q[1]": 1, "q[2]": 4}}
    at_once["route"] = {"gaps": [[[0, 0]]], "swaps": []}
    plain = routed_qasm(at_once, program, device)
    # The second measurement needs nothing before it and still comes first.
    assert plain.index("c = measure $4") < plain.index("cleanup[0] = measure $1")


def test_level2_is_refused_by_name() -> None:
    device = find_device("quartzite-20")
    source = (
        'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[5] q;\n'
        "ctrl(4) @ x q[0], q[1], q[2], q[3], q[4];\n"
    )
    program = read_program(source, "level2.qasm")
    plan = placer.plan(program, device, effort="quick", only=["level2"])
    with pytest.raises(InputError, match="level2-not-routed"):
        routed_qasm(plan, program, device)


def damaged(plan: placer.Plan, how: str) -> dict[str, Any]:
    data = json.loads(to_json(plan))
    route = data["route"]
    if how == "swap off link":
        route["swaps"][0] = [0, 15]
    elif how == "no swaps":
        every = sorted(run for runs in route["gaps"] for run in runs)
        route["gaps"], route["swaps"] = [every], []
    elif how == "gate left out":
        route["gaps"][-1] = route["gaps"][-1][:-1]
    else:
        route["gaps"][0], route["gaps"][-1] = route["gaps"][-1], route["gaps"][0]
    return data


@pytest.mark.parametrize(
    "how", ["swap off link", "no swaps", "gate left out", "other order"]
)
def test_a_broken_route_is_not_written(how: str) -> None:
    device = find_device("slate-16")
    plan = placer.plan("tide-gate", device, effort="quick")
    program = placer.api.find_program("tide-gate")
    assert plan.figures.swaps > 0
    with pytest.raises(InputError, match="route-broken"):
        routed_qasm(damaged(plan, how), program, device)


def test_the_command_writes_it(tmp_path: Any) -> None:
    target = tmp_path / "routed.qasm"
    words = ["plan", "tide-gate", "-d", "slate-16", "--effort", "quick", "-q"]
    done = CliRunner().invoke(main, [*words, "--routed", str(target)])
    assert done.exit_code == 0, done.output
    plan = placer.plan("tide-gate", "slate-16", effort="quick")
    is_sound(target.read_text(), plan, find_device("slate-16"))
