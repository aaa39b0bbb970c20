"""One small program with a hand-made plan, for everything that shows plans."""

from __future__ import annotations

from dataclasses import replace

from placer.device.model import Budget
from placer.errors import Place
from placer.plan import (
    Bound,
    Costs,
    Figures,
    Lease,
    Limit,
    Plan,
    PolicyRow,
    Route,
    Source,
    Step,
    Verdict,
)
from placer.program.model import Operation, Program, Register, WireId

SOURCE = """OPENQASM 3.0;
include "stdgates.inc";
qubit[5] c;
qubit t;
qubit[2] m;
bit[2] r;
h m[0];
ctrl(5) @ x c[0], c[1], c[2], c[3], c[4], t;
cx t, m[0];
ctrl(4) @ z c[0], c[1], c[2], c[3], t;
r[0] = measure t;
r[1] = measure m[0];
"""
NAMES = ("c[0]", "c[1]", "c[2]", "c[3]", "c[4]", "t", "m[0]", "m[1]")


def program() -> Program:
    """Return the program of SOURCE as a reader would give it."""

    def register(name: str, width: int, first: int) -> Register:
        return Register(
            name,
            width,
            width == 1,
            "unknown",
            workspace=False,
            lendable=name != "t",
            first=WireId(first),
            place=Place("small.qasm", 3),
        )

    def op(index: int, kind: str, name: str, *wires: int, bit=None) -> Operation:
        place = Place("small.qasm", index + 7, 1)
        ids = tuple(WireId(w) for w in wires)
        return Operation(index, kind, name, ids, bit=bit, place=place)  # type: ignore[arg-type]

    operations = (
        op(0, "gate", "h", 6),
        op(1, "mcx", "mcx", 0, 1, 2, 3, 4, 5),
        op(2, "gate", "cx", 5, 6),
        op(3, "mcz", "mcz", 0, 1, 2, 3, 5),
        op(4, "measure", "measure", 5, bit="r[0]"),
        op(5, "measure", "measure", 6, bit="r[1]"),
    )
    return Program(
        name="small",
        syntax="openqasm3",
        registers=(register("c", 5, 0), register("t", 1, 5), register("m", 2, 6)),
        wire_names=NAMES,
        operations=operations,
        scopes=(),
        bits=(("r", 2),),
        kept=(),
        assumed="every wire is unknown until it is reset",
        open_inputs=False,
        text=SOURCE,
        path="small.qasm",
        hash="abc",
        register_of=(0, 0, 0, 0, 0, 1, 2, 2),
    )


FIGURES = Figures(
    sites=11,
    swaps=9,
    time_ns=12_340,
    two_qubit_gates=48,
    one_qubit_gates=61,
    t_gates=28,
    measurements=5,
    level2_gates=0,
    costs=Costs(
        two_qubit=96_000_000_000,
        one_qubit=8_000_000_000,
        swaps=54_000_000_000,
        decay=61_000_000_000,
        measurement=17_500_000_000,
    ),
    success=0.789,
    worst_share=0.173,
    worst_value="slot 1 of call 1 (mcx)",
)


def plan() -> Plan:
    """Return a plan for `program` on slate-16; its figures are made up."""
    mcx = Step(
        1,
        "mcx",
        "mcx",
        8,
        "clean-ladder",
        "clean",
        25,
        6_200,
        tuple(Lease(n, 12 + n, "clean", 25, 6_200, None) for n in range(3)),
        (("borrowed-v-chain", "costs 0.04 nats more"),),
    )
    mcz = Step(
        3,
        "mcz",
        "mcz",
        10,
        "borrowed-v-chain",
        "borrowed",
        6_240,
        11_000,
        (
            Lease(0, 9, "borrowed", 6_240, 11_000, "m[1]"),
            Lease(1, 15, "borrowed", 6_240, 11_000, None),
        ),
    )
    plain = [
        Step(index, kind, name, line, "as-written", "none", start, end, ())
        for index, kind, name, line, start, end in (
            (0, "gate", "h", 7, 0, 25),
            (2, "gate", "cx", 9, 6_200, 6_240),
            (4, "measure", "measure", 11, 11_000, 11_200),
            (5, "measure", "measure", 12, 6_240, 6_440),
        )
    ]
    steps = tuple(sorted((mcx, mcz, *plain), key=lambda s: s.index))
    worse = replace(FIGURES, swaps=17, time_ns=31_000, success=0.61, worst_share=0.52)
    return Plan(
        version="0.1.0",
        program=Source("small", "small.qasm", "openqasm3", "abc", SOURCE),
        device=Source("slate-16", "slate-16", "yaml", "def", "name: slate-16\n"),
        calibrated="2026-03-02",
        open_inputs=False,
        assumed="every wire is unknown until it is reset",
        budget=Budget(),
        goal="error",
        only=(),
        seed=0,
        effort="normal",
        wires=dict(zip(NAMES, (0, 1, 2, 4, 5, 6, 8, 9), strict=True)),
        steps=steps,
        route=Route((((0, 40),), ((41, 47),)), ((1, 2),), 8, 10.5),
        figures=FIGURES,
        bound=Bound(
            211_000_000_000,
            205_000_000_000,
            "CP-SAT 9.15 (2 seeds agree)",
            False,
            104_000_000_000,
            "gates alone, on the best links",
        ),
        policies=(
            PolicyRow("clean", True, "", True, FIGURES, 214_000_000_000),
            PolicyRow("borrowed", True, "", False, worse, 300_000_000_000),
            PolicyRow(
                "level2",
                False,
                "no link of the device has a level-2 gate",
                False,
                None,
                None,
            ),
            PolicyRow("none", True, "", False, worse, 400_000_000_000),
        ),
        verdict=Verdict(
            True,
            "the longest-lived value spends 17.3 % of its lifetime, 50 % is allowed",
            (
                Limit("life of a value", 0.173, 0.5, True, "share", "slot 1 of call 1"),
                Limit("run time", 12_340, None, True, "ns"),
                Limit("sites", 11, 16, True, "sites"),
            ),
            "life of a value is nearest to its limit",
        ),
        notes=("the route was repeated with 8 seeds",),
    )
