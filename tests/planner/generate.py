"""Tiny legal problems, drawn from a seed: what the exhaustive search can exhaust.

Devices are lines, rings, stars and a small grid of three to five sites, uniform or
not, some with level 2, measured cleanup, a price for T gates or a site out of order.
Programs have a few calls, plain gates, barriers, resets and measurements on wires that
start unknown, in |0>, or are workspace.
"""

from __future__ import annotations

import dataclasses
import random
from typing import Any

from placer.device.model import (
    Budget,
    Capabilities,
    Device,
    Level2,
    Link,
    Site,
    SiteId,
    TGate,
)
from placer.errors import NoPlan, Place
from placer.problem import Problem, make_problem
from placer.program.model import Operation, Program, Register, WireId

SHAPES: dict[str, tuple[int, list[tuple[int, int]]]] = {
    "line3": (3, [(0, 1), (1, 2)]),
    "line4": (4, [(0, 1), (1, 2), (2, 3)]),
    "line5": (5, [(0, 1), (1, 2), (2, 3), (3, 4)]),
    "ring4": (4, [(0, 1), (0, 3), (1, 2), (2, 3)]),
    "ring5": (5, [(0, 1), (0, 4), (1, 2), (2, 3), (3, 4)]),
    "star5": (5, [(0, 1), (0, 2), (0, 3), (0, 4)]),
    "tail5": (5, [(0, 1), (0, 3), (1, 2), (2, 3), (3, 4)]),
}


def tiny_device(draw: random.Random) -> Device:
    """Return a small device; half of them have unequal sites and links."""
    count, edges = SHAPES[draw.choice(sorted(SHAPES))]
    is_uneven = draw.random() < 0.5
    has_level2 = draw.random() < 0.4
    measures = draw.random() < 0.4
    broken = draw.randrange(count) if count == 5 and draw.random() < 0.15 else -1
    t_gate = TGate(3e-3, 200) if draw.random() < 0.2 else None

    def about(value: float) -> float:
        return value * (draw.uniform(0.6, 1.6) if is_uneven else 1.0)

    sites = []
    for number in range(count):
        t1 = about(90.0)
        sites.append(
            Site(
                SiteId(number),
                t1,
                min(about(70.0), 1.9 * t1),
                about(4e-4),
                30,
                about(9e-3),
                400,
                about(5e-3),
                300,
                draw.choice((0.0, 0.004)),
                Level2(about(40.0), 2e-3, 40) if has_level2 else None,
                number != broken,
                (float(number), 0.0),
            )
        )
    links = tuple(
        Link(
            SiteId(a),
            SiteId(b),
            about(6e-3),
            round(about(60)),
            about(1e-2) if has_level2 else None,
            110 if has_level2 else None,
        )
        for a, b in edges
    )
    return Device(
        name="tiny",
        note="",
        calibrated="2026-01-01",
        lattice="listed",
        sites=tuple(sites),
        links=links,
        capabilities=Capabilities(measures, 200 if measures else None, True),
        t_gate=t_gate,
        budget=Budget(),
        text="",
        path="tiny",
        hash=repr((sites, links, t_gate)),
        link_at={(k.a, k.b): k for k in links},
    )


def tiny_program(draw: random.Random, sites: int) -> Program:
    """Return a small program for a device of so many sites."""
    is_full = sites == 5 and draw.random() < 0.4
    wires = 5 if is_full else draw.randint(3, min(4, sites))
    kinds = [draw.choice(("unknown", "unknown", "zero")) for _ in range(wires)]
    if is_full:
        # Every site is held: a wide call must borrow from the wire it leaves out.
        kinds = ["unknown"] * wires
    registers, names, register_of = [], [], []
    for number, kind in enumerate(kinds):
        lendable = draw.random() > 0.2
        register = Register(
            f"q{number}", 1, True, kind, False, lendable, WireId(number), Place("")
        )
        registers.append(register)
        names.append(f"q{number}")
        register_of.append(number)
    has_scratch = draw.random() < 0.35 and not is_full
    if has_scratch:
        for _ in range(draw.randint(1, 2) if wires == 3 else 1):
            number = len(names)
            registers.append(
                Register(
                    f"w{number}", 1, True, "zero", True, True, WireId(number), Place("")
                )
            )
            names.append(f"w{number}")
            register_of.append(number)
    operations: list[Operation] = []

    def add(kind: str, name: str, on: list[int], **more: Any) -> None:
        operations.append(
            Operation(len(operations), kind, name, tuple(WireId(w) for w in on), **more)
        )

    for _ in range(draw.randint(1, 2 if has_scratch or is_full else 3)):
        what = draw.random()
        if what < 0.7:
            size = 4 if wires >= 4 and draw.random() < 0.3 else 3
            add(draw.choice(("mcx", "mcz")), "call", draw.sample(range(wires), size))
        elif what < 0.85:
            add("gate", "cx", draw.sample(range(wires), 2))
        elif what < 0.9:
            add("barrier", "barrier", draw.sample(range(wires), 2))
        elif what < 0.94:
            add("reset", "reset", [draw.randrange(wires)])
        else:
            add("gate", draw.choice(("h", "t")), [draw.randrange(wires)])
    for scratch in range(wires, len(names)):
        pair = draw.sample(range(wires), 2)
        add("and", "and", [*pair, scratch])
        if draw.random() < 0.5:
            left = [w for w in range(wires) if w not in pair] or [pair[0]]
            add("gate", "cx", [scratch, draw.choice(left)])
        add("and", "and", [*pair, scratch], inverse=True)
    if draw.random() < 0.2:
        add("measure", "measure", [draw.randrange(wires)], bit="c[0]")
    if len(operations) > 6:
        operations = [op for op in operations if op.kind != "gate"]
        operations = [
            dataclasses.replace(op, index=i) for i, op in enumerate(operations)
        ]
    return Program(
        name="tiny",
        syntax="openqasm3",
        registers=tuple(registers),
        wire_names=tuple(names),
        operations=tuple(operations),
        scopes=(),
        bits=(),
        kept=(),
        assumed="",
        open_inputs=False,
        text="",
        path="tiny.qasm",
        hash=repr(operations),
        register_of=tuple(register_of),
    )


def widened(draw: random.Random, program: Program, sites: int) -> Program:
    """Return the program with one call made wider where the device has room."""
    ops = list(program.operations)
    calls = [op for op in ops if op.kind == "mcx"]
    permanent = [w for w, name in enumerate(program.wire_names) if name[0] == "q"]
    if not calls or len(permanent) < 4 or sites < 5 or draw.random() < 0.3:
        return program
    op = draw.choice(calls)
    ops[op.index] = dataclasses.replace(
        op, wires=tuple(WireId(w) for w in draw.sample(permanent, 4))
    )
    return dataclasses.replace(program, operations=tuple(ops), hash=repr(ops))


def tiny_problem(seed: int) -> Problem | None:
    """Return the problem of a seed, `None` where a call has no recipe at all."""
    draw = random.Random(seed)
    device = tiny_device(draw)
    working = sum(site.in_service for site in device.sites)
    program = widened(draw, tiny_program(draw, working), working)
    budget = Budget()
    if draw.random() < 0.2:
        budget = Budget(most_sites=draw.randint(3, working))
    elif draw.random() < 0.15:
        budget = Budget(longest_ns=draw.randint(1_500, 6_000))
    try:
        problem = make_problem(device, program, budget=budget, goal="estimate")
    except NoPlan:
        return None
    taste = draw.choice(("any", "any", "any", "clean", "borrowed"))
    choices = []
    for row in problem.choices:
        small = [b for b in row if len(b.slots) <= 2]
        wanted = [b for b in small if taste in b.slots]
        if wanted:
            choices.append(tuple(draw.sample(wanted, min(len(wanted), 2))))
            continue
        choices.append(tuple(draw.sample(small, min(len(small), 2)) or row[:1]))
    return dataclasses.replace(problem, choices=tuple(choices))
