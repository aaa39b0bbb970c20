"""Spoil a good plan by what it is judged against: its texts, or a recipe's circuits.

A device or program text is changed together with its hash, so that the plan still says
which texts it is for.  What a recipe computes cannot be broken from the file alone,
since the check builds recipes again: those breakers spoil what it builds.
"""

from __future__ import annotations

import copy
import dataclasses
import random
import re
from collections.abc import Callable
from typing import Any

from placer.device.read import read_device
from placer.program.model import Program
from placer.program.read import read_program
from placer.recipes.circuit import Built, Circuit, Op

Data = dict[str, Any]


def program_of(data: Data) -> Program:
    """Return the program of a plan, read again."""
    source = data["program"]
    return read_program(source["text"], source["path"], open_inputs=data["open_inputs"])


def kept_wires(data: Data) -> list[str]:
    """Return the wires that have steps and are no workspace: they stay to the end."""
    program = program_of(data)
    used = {wire for op in program.operations for wire in op.wires}
    return [
        program.wire_names[wire]
        for wire in sorted(used)
        if not program.register_at(wire).workspace
    ]


def unknown_wires(data: Data) -> list[str]:
    """Return the wires that may hold anything all the time: no |0>, no reset."""
    program = program_of(data)
    wiped = {w for op in program.operations if op.kind == "reset" for w in op.wires}
    return [
        name
        for wire, name in enumerate(program.wire_names)
        if program.register_at(wire).start == "unknown"
        and not program.register_at(wire).workspace
        and wire not in wiped
    ]


def calls_with(data: Data, kind: str) -> list[Data]:
    """Return the calls that lease a slot of a kind."""
    return [c for c in data["calls"] if any(x["kind"] == kind for x in c["leases"])]


def lent_leases(data: Data) -> list[tuple[Data, Data]]:
    """Return (call, lease) of every lease with a lender."""
    return [(c, x) for c in data["calls"] for x in c["leases"] if x["lender"]]


def _with_device(data: Data, text: str) -> Data:
    """Return the plan with another device text and the hash that fits it."""
    spoiled = copy.deepcopy(data)
    device = read_device(text, data["device"]["path"])
    spoiled["device"]["text"] = text
    spoiled["device"]["hash"] = device.hash
    return spoiled


def operands_of(data: Data, call: Data) -> list[str]:
    """Return the names of a call's operand wires."""
    program = program_of(data)
    return [program.wire_names[w] for w in program.operations[call["index"]].wires]


def _level2_sites(data: Data) -> list[int]:
    text = data["device"]["text"].split("level2_sites: [")[1].split("]")[0]
    return [int(site) for site in text.split(",")]


def _only_level2(text: str, kept: list[int]) -> str:
    """Return a device text in which only some sites keep their third level."""
    lines = []
    for line in text.splitlines():
        site = re.match(r"  (\d+): ", line)
        if line.lstrip().startswith("level2_sites:"):
            lines.append(f"  level2_sites: [{', '.join(map(str, kept))}]")
        elif site and int(site[1]) not in kept:
            lines.append(re.sub(r", level2: \{[^}]*\}", "", line))
        else:
            lines.append(line)
    return "\n".join(lines) + "\n"


def site_out_of_service(data: Data, draw: random.Random) -> Data | None:
    if "out_of_order: [" not in data["device"]["text"]:
        return None
    text = data["device"]["text"].split("out_of_order: [")[1].split("]")[0]
    spoiled = copy.deepcopy(data)
    name = draw.choice(sorted(spoiled["wires"]))
    spoiled["wires"][name] = int(draw.choice(text.split(",")))
    return spoiled


def capability_missing(data: Data, draw: random.Random) -> Data | None:
    text = data["device"]["text"]
    kinds = {op.kind for op in program_of(data).operations}
    latency = re.search(r"conditional_latency_ns: \d+", text)
    lost: list[tuple[str, str]] = []
    if latency and any("measured" in call["recipe"] for call in data["calls"]):
        lost.append((latency[0], "conditional_latency_ns: none"))
    if "reset" in kinds:
        lost.append(("reset: true", "reset: false"))
    usable = [row for row in lost if text.count(row[0]) == 1]
    if not usable:
        return None
    return _with_device(data, text.replace(*draw.choice(usable)))


def level2_missing(data: Data, _: random.Random) -> Data | None:
    if not any(c["workspace"] == "level2" for c in data["calls"]):
        return None
    out = []
    for line in data["device"]["text"].splitlines():
        kept = line
        if line.lstrip().startswith("level2_sites:"):
            kept = line[: line.index("level2_sites:")] + "level2_sites: none"
        out.append(kept)
    return _with_device(data, "\n".join(out) + "\n")


def level2_off_link(data: Data, draw: random.Random) -> Data | None:
    # A site that a chain passes through loses its third level: its gates then find
    # no fitting link, at home and on the route.
    used = [c for c in data["calls"] if c["workspace"] == "level2"]
    if not used:
        return None
    inner = operands_of(data, draw.choice(used))[1:-1]
    site = data["wires"][draw.choice(inner)]
    left = [kept for kept in _level2_sites(data) if kept != site]
    return _with_device(data, _only_level2(data["device"]["text"], left))


def link_out_of_reach(data: Data, draw: random.Random) -> Data | None:
    # One site alone keeps its third level: two wires that both need it cannot meet.
    if not any(c["workspace"] == "level2" for c in data["calls"]):
        return None
    kept = draw.choice(_level2_sites(data))
    return _with_device(data, _only_level2(data["device"]["text"], [kept]))


def lender_unlendable(data: Data, draw: random.Random) -> Data | None:
    lent = lent_leases(data)
    if not lent or data["program"]["syntax"] != "openqasm3":
        return None
    _, lease = draw.choice(lent)
    register = lease["lender"].split("[")[0]
    lines = []
    for line in data["program"]["text"].splitlines():
        if line.startswith("qubit") and line.rstrip(";").split()[-1] == register:
            lines.append("@placer.keep")
        lines.append(line)
    spoiled = copy.deepcopy(data)
    text = "\n".join(lines) + "\n"
    program = read_program(text, data["program"]["path"])
    spoiled["program"]["text"] = text
    spoiled["program"]["hash"] = program.hash
    for call in spoiled["calls"]:
        call["line"] = program.operations[call["index"]].place.line
    return spoiled


def _edited(built: Built, change: Callable[[Circuit], Circuit]) -> Built:
    return dataclasses.replace(
        built, coarse=change(built.coarse), fine=change(built.fine)
    )


def _with_flip(built: Built, wire: int) -> Built:
    """Return the recipe with a wire flipped once too often, at the end."""
    flip = Op("x", (wire,))
    return _edited(built, lambda c: dataclasses.replace(c, ops=(*c.ops, flip)))


def leave_slot_set(built: Built, draw: random.Random) -> Built | None:
    clean = [s for s, kind in enumerate(built.slots) if kind == "clean"]
    return (
        _with_flip(built, built.fine.operands + draw.choice(clean)) if clean else None
    )


def leave_borrowed_changed(built: Built, draw: random.Random) -> Built | None:
    lent = [s for s, kind in enumerate(built.slots) if kind == "borrowed"]
    return _with_flip(built, built.fine.operands + draw.choice(lent)) if lent else None


def wrong_gate(built: Built, draw: random.Random) -> Built | None:
    """Return the recipe without one gate, or with one turned the other way."""
    level = draw.choice(["fine", "coarse"])
    circuit = getattr(built, level)
    at = draw.randrange(len(circuit.ops))
    op = circuit.ops[at]
    mirrors = {"t": "tdg", "tdg": "t", "s": "sdg", "sdg": "s"}
    other: tuple[Op, ...] = ()
    if op.name in mirrors and draw.random() < 0.5:
        other = (dataclasses.replace(op, name=mirrors[op.name]),)
    ops = (*circuit.ops[:at], *other, *circuit.ops[at + 1 :])
    made = dataclasses.replace(circuit, ops=ops)
    return dataclasses.replace(built, **{level: made})


RECIPE_BREAKERS: dict[str, Callable[[Built, random.Random], Built | None]] = {
    "slot-not-returned": leave_slot_set,
    "borrowed-changed": leave_borrowed_changed,
    "recipe-wrong": wrong_gate,
}
