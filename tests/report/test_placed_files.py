"""Random programs under random legal plans: the placed text is the same function.

The plans here are drawn, not optimised: any recipe, any order that keeps each wire's
own order, leases on spare sites, on sites of wires that have not begun, on idle wires.
"""

from __future__ import annotations

import random

import openqasm3
import pytest

from placer.device.read import find_device
from placer.program.model import Program
from placer.program.read_qasm import read_qasm
from placer.recipes import catalog
from placer.report.qasm import placed_qasm
from tests.replay_reader import same_function

DEVICE = find_device("quartzite-20")
SEEDS = range(60)


def random_source(chance: random.Random) -> str:
    """Return a small program with calls, plain gates, scratch and measurements."""
    version = chance.choice(("2.0", "3.0"))
    width = chance.randint(4, 6)
    wires = [f"q[{i}]" for i in range(width)]
    lines = [f"OPENQASM {version};"]
    if version == "2.0":
        lines += ['include "qelib1.inc";', f"qreg q[{width}];", "qreg s[2];"]
        lines.append("creg in[3];" if chance.random() < 0.5 else "creg c[3];")
    else:
        lines += ['include "stdgates.inc";', "pragma vendor.note 7"]
        lines += [f"qubit[{width}] q;", "qubit[2] s;", "bit[3] c;"]
        if chance.random() < 0.5:
            lines.append("reset s;")
        lines += [f"reset {w};" for w in wires if chance.random() < 0.2]
    bits = "in" if "creg in[3];" in lines else "c"
    for _ in range(chance.randint(3, 9)):
        chosen = chance.sample([*wires, "s[0]", "s[1]"], k=min(width, 5))
        lines.append(random_statement(chance, chosen, version))
    for bit in range(chance.randint(0, 3)):
        if version == "2.0":
            lines.append(f"measure {wires[bit]} -> {bits}[{bit}];")
        else:
            lines.append(f"{bits}[{bit}] = measure {wires[bit]};")
    return "\n".join(lines) + "\n"


def random_statement(chance: random.Random, wires: list[str], version: str) -> str:
    one, two, three = wires[0], ", ".join(wires[:2]), ", ".join(wires[:3])
    angle = repr(chance.uniform(-4, 4))
    plain = [
        f"ccx {three};",
        f"x {one};",
        f"h {one};",
        f"t {one};",
        f"sdg {one};",
        f"rz({angle}) {one};",
        f"ry({angle}) {one};",
        f"cx {two};",
        f"swap {two};",
        f"barrier {two};",
        f"ccx {three};",
    ]
    if version == "2.0":
        plain.append(f"rzz({angle}) {two};")
        return chance.choice(plain)
    count = chance.randint(2, len(wires) - 1)
    many = ", ".join(wires[: count + 1])
    calls = [
        f"ctrl({count}) @ x {many};",
        f"ctrl({count}) @ z {many};",
        f"ctrl({count}) @ p({angle}) {many};",
        f"negctrl @ ctrl({count - 1}) @ x {many};",
    ]
    return chance.choice([*plain, *calls, *calls])


def random_plan(program: Program, chance: random.Random) -> dict:
    """Return the data of a legal plan, as far as the placed text depends on it."""
    names = program.wire_names
    sites = dict(zip(names, chance.sample(range(20), len(names)), strict=True))
    order = random_order(program, chance)
    first: dict[int, int] = {}
    for moment, index in enumerate(order):
        for wire in program.operations[index].wires:
            first.setdefault(wire, moment)
    calls, others = [], []
    for moment, index in enumerate(order):
        op = program.operations[index]
        if not op.is_call:
            others.append([index, moment, moment + 1])
            continue
        angle = op.params[0] if op.params else 0.0
        recipe = chance.choice(catalog.recipe_names(op.kind, op.controls, op.inverse))
        built = catalog.build(recipe, op.kind, op.controls, angle, op.inverse)
        # A wire that starts in |0> and has not begun leaves its site free.
        waiting = {
            sites[names[w]]
            for w in range(len(names))
            if program.register_at(w).start == "zero" and first.get(w, 99) > moment
        }
        free = sorted((set(range(20)) - set(sites.values())) | waiting)
        lenders = {
            sites[names[w]]: names[w]
            for w in range(len(names))
            if w not in op.wires and sites[names[w]] not in waiting
        }
        leases = []
        for slot, kind in enumerate(built.slots):
            is_lent = kind == "borrowed" and lenders and chance.random() < 0.7
            site = chance.choice(sorted(lenders) if is_lent else free)
            lender = lenders.pop(site) if is_lent else None
            if not is_lent:
                free.remove(site)
            leases.append({"slot": slot, "site": site, "kind": kind, "lender": lender})
        calls.append(
            {"index": index, "start": moment, "recipe": recipe, "leases": leases}
        )
    return {"version": "0", "wires": sites, "calls": calls, "others": others}


def random_order(program: Program, chance: random.Random) -> list[int]:
    """Return an order of the steps that keeps the order on every wire."""
    left = [op.index for op in program.operations]
    order = []
    while left:
        busy: set[int] = set()
        ready = []
        for index in left:
            wires = set(program.operations[index].wires)
            if not wires & busy:
                ready.append(index)
            busy |= wires
        order.append(chance.choice(ready))
        left.remove(order[-1])
    return order


@pytest.mark.parametrize("seed", SEEDS)
def test_placed_text_is_the_same_function(seed):
    chance = random.Random(seed)
    source = random_source(chance)
    open_inputs = chance.random() < 0.3
    program = read_qasm(source, "random.qasm", open_inputs=open_inputs)
    data = random_plan(program, chance)
    for gates in ("toffoli", "clifford-t"):
        text = placed_qasm(data, program, DEVICE, gates=gates)
        openqasm3.parse(text)
        found = same_function(
            source, text, samples=3, seed=seed, open_inputs=open_inputs
        )
        assert found == [], f"{source}\n{text}"


def test_the_draws_reach_every_kind_of_lease():
    seen: set[str] = set()
    for seed in SEEDS:
        chance = random.Random(seed)
        source = random_source(chance)
        open_inputs = chance.random() < 0.3
        program = read_qasm(source, "random.qasm", open_inputs=open_inputs)
        data = random_plan(program, chance)
        text = placed_qasm(data, program, DEVICE)
        held = set(data["wires"].values())
        for lease in (x for call in data["calls"] for x in call["leases"]):
            seen.add(f"{lease['kind']} {lease['lender'] is not None}")
            if lease["kind"] == "clean" and lease["site"] in held:
                seen.add("clean on the site of a later wire")
        seen |= {
            word
            for word in ("measure", "placer.level2", "placer.renamed", "ctrl(", "if (")
            if word in text
        }
    assert seen == {
        "clean False",
        "borrowed True",
        "borrowed False",
        "clean on the site of a later wire",
        "measure",
        "placer.level2",
        "placer.renamed",
        "ctrl(",
        "if (",
    }


def test_a_wrong_lease_is_seen():
    """A clean slot on a wire in use must break the function: the test can fail."""
    source = (
        'OPENQASM 3.0; include "stdgates.inc"; qubit[5] q; qubit m; '
        "ctrl(4) @ x q[0], q[1], q[2], q[3], q[4]; x m;"
    )
    program = read_qasm(source, "x.qasm", open_inputs=True)
    sites = {name: site for site, name in enumerate(program.wire_names)}
    leases = [
        {"slot": n, "site": site, "kind": "clean", "lender": None}
        for n, site in enumerate((5, 9))
    ]
    call = {"index": 0, "start": 0, "recipe": "clean-ladder", "leases": leases}
    data = {"version": "0", "wires": sites, "calls": [call], "others": [[1, 1, 2]]}
    assert same_function(source, placed_qasm(data, program, DEVICE))
    leases[0]["site"] = 8
    assert same_function(source, placed_qasm(data, program, DEVICE)) == []
