"""Small devices, circuits and programs by hand, for the tests of tables and routes."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

from placer.device.model import Budget, Capabilities, Device, Link, Site, TGate
from placer.errors import Place
from placer.problem import Problem
from placer.program.model import Operation, Program, Register
from placer.recipes.circuit import Built, Circuit, Op


def make_site(number: int, **figures: Any) -> Site:
    given = {
        "t1_us": 100.0,
        "t2_us": 80.0,
        "gate_error": 1e-4,
        "gate_ns": 20,
        "readout_error": 1e-2,
        "readout_ns": 500,
        "reset_error": 2e-3,
        "reset_ns": 300,
        "prep_error": 1e-3,
        "level2": None,
        "in_service": True,
        "xy": (0.0, 0.0),
        **figures,
    }
    return Site(id=number, **given)


def make_link(a: int, b: int, **figures: Any) -> Link:
    given = {
        "error": 5e-3,
        "time_ns": 100,
        "level2_error": None,
        "level2_ns": None,
        **figures,
    }
    return Link(min(a, b), max(a, b), **given)


def make_device(
    sites: Sequence[Site],
    links: Iterable[Link],
    *,
    conditional_ns: int | None = 50,
    t_gate: TGate | None = None,
) -> Device:
    ranked = tuple(sorted(links, key=lambda k: (k.a, k.b)))
    return Device(
        name="sample",
        note="",
        calibrated="",
        lattice="",
        sites=tuple(sites),
        links=ranked,
        capabilities=Capabilities(True, conditional_ns, True),
        t_gate=t_gate,
        budget=Budget(),
        text="",
        path="sample.yaml",
        hash="0",
        link_at={(k.a, k.b): k for k in ranked},
    )


def grid(rows: int, columns: int) -> list[tuple[int, int]]:
    edges = []
    for p in range(rows * columns):
        if p % columns + 1 < columns:
            edges.append((p, p + 1))
        if p + columns < rows * columns:
            edges.append((p, p + columns))
    return edges


def plain_device(
    count: int, edges: Iterable[tuple[int, int]], **figures: Any
) -> Device:
    return make_device(
        [make_site(p) for p in range(count)],
        [make_link(a, b, **figures) for a, b in edges],
    )


def make_built(
    ops: Sequence[Op],
    operands: int,
    *,
    slots: tuple[Any, ...] = (),
    level2_wires: tuple[int, ...] = (),
    kind: str = "mcx",
) -> Built:
    bits = 1 + max((op.bit for op in ops if op.bit is not None), default=-1)
    fine = Circuit(operands, slots, tuple(ops), bits)
    return Built(
        "by-hand", kind, max(0, operands - 1), "none", False, fine, fine, level2_wires
    )


def make_register(name: str, width: int, first: int, **about: Any) -> Register:
    given = {
        "start": "unknown",
        "workspace": False,
        "lendable": True,
        **about,
    }
    return Register(name, width, width == 1, first=first, place=Place(""), **given)


def make_problem(
    device: Device,
    registers: Sequence[Register],
    steps: Sequence[tuple[Sequence[int], Built]],
) -> Problem:
    """A problem whose steps have one recipe each: (wires, built)."""
    names = [
        r.name if r.is_single else f"{r.name}[{i}]"
        for r in registers
        for i in range(r.width)
    ]
    owner = [n for n, r in enumerate(registers) for _ in range(r.width)]
    program = Program(
        name="sample",
        syntax="yaml",
        registers=tuple(registers),
        wire_names=tuple(names),
        operations=tuple(
            Operation(n, built.kind, built.kind, tuple(wires))
            for n, (wires, built) in enumerate(steps)
        ),
        scopes=(),
        bits=(),
        kept=(),
        assumed="",
        open_inputs=False,
        text="",
        path="sample",
        hash="0",
        register_of=tuple(owner),
    )
    choices = tuple((built,) for _, built in steps)
    return Problem(device, program, Budget(), "error", (), choices, "0")
