"""Arithmetic steps of program YAML: wires in order, inverses, promises, faults."""

from __future__ import annotations

import pytest

from placer.errors import InputError
from placer.program.model import Program
from placer.program.read import read_program
from placer.program.signature import Signature

HEAD = """registers:
  a: {width: 3}
  b: {width: 3}
  s: {width: 3, start: zero}
  c:
  z:
steps:
"""


def read(steps: str) -> Program:
    return read_program(HEAD + steps, "arithmetic.yaml")


@pytest.mark.parametrize(
    ("step", "signature", "wires"),
    [
        ("add: {value: a, into: b}", Signature("add", (3, 3)), "a0 a1 a2 b0 b1 b2"),
        (
            "subtract: {value: a, into: b, carry: z, controls: c}",
            Signature("subtract", (3, 3), 1, carry=True),
            "c a0 a1 a2 b0 b1 b2 z",
        ),
        (
            "add: {value: 5, into: b}",
            Signature("add_constant", (3,), constant=5),
            "b0 b1 b2",
        ),
        (
            "subtract: {value: 5, into: b}",
            Signature("add_constant", (3,), constant=5, inverse=True),
            "b0 b1 b2",
        ),
        (
            "sum: {left: a, right: b, into: s}",
            Signature("sum", (3, 3, 3)),
            "a0 a1 a2 b0 b1 b2 s0 s1 s2",
        ),
        (
            "less_than: {left: a, right: b, into: z}",
            Signature("less_than", (3, 3)),
            "a0 a1 a2 b0 b1 b2 z",
        ),
        (
            "equal: {left: a, right: 6, into: z}",
            Signature("equal", (3,), constant=6),
            "a0 a1 a2 z",
        ),
        ("increment: b", Signature("increment", (3,)), "b0 b1 b2"),
        (
            "decrement: {target: b, controls: c}",
            Signature("decrement", (3,), 1),
            "c b0 b1 b2",
        ),
        (
            "lookup: {address: 'a[0:1]', into: b, table: [3, 1, 7, 2]}",
            Signature("lookup", (2, 3), table=(3, 1, 7, 2)),
            "a0 a1 b0 b1 b2",
        ),
        (
            "multiply_add: {left: 'a[0:1]', right: 'b[0:1]', into: s}",
            Signature("multiply_add", (2, 2, 3)),
            "a0 a1 b0 b1 s0 s1 s2",
        ),
    ],
)
def test_wires_come_in_the_order_of_the_signature(
    step: str, signature: Signature, wires: str
) -> None:
    program = read(f"  - {step}\n")
    (op,) = program.operations
    assert op.is_call
    assert op.signature == signature
    assert op.controls == signature.controls
    names = [program.wire_names[w].replace("[", "").replace("]", "") for w in op.wires]
    assert " ".join(names) == wires


def test_controls_on_zero_are_framed_by_x() -> None:
    program = read("  - increment: {target: b, controls: not c}\n")
    assert [op.name for op in program.operations] == ["x", "increment", "x"]


def test_a_scope_takes_arithmetic_back() -> None:
    program = read(
        """  - scope:
      workspace: {w: 3, flag: 1}
      compute:
        - sum: {left: a, right: b, into: w}
        - less_than: {left: w, right: 5, into: flag}
      body:
        - cx: flag, z
"""
    )
    kinds = [
        (op.kind, op.signature and op.signature.inverse) for op in program.operations
    ]
    assert kinds == [
        ("sum", False),
        ("less_than", False),
        ("gate", None),
        ("less_than", True),
        ("sum", True),
    ]


@pytest.mark.parametrize(
    ("step", "message"),
    [
        ("add: {value: 'a[0:1]', into: b}", "two registers of one width"),
        ("add: {value: 9, into: b}", "constant 9 is not in 0..7"),
        ("add: {value: a}", "needs the key 'into'"),
        ("add: {value: a, into: b, carry: a}", "must be one qubit"),
        ("add: {value: a, into: a}", "same qubit twice"),
        ("lookup: {address: a, into: z, table: [0, 2]}", "do not fit 1 wires"),
        ("lookup: {address: 'a[0]', into: z, table: [0, 1, 1]}", "3 entries"),
        ("lookup: {address: 'a[0:1]', into: z, table: [0, 1, 1]}", "beyond the table"),
        ("sum: {left: a, right: b, into: c}", "three registers of one width"),
        ("less_than: {left: a, rigth: b, into: z}", "rigth"),
        ("increment: nothing", "not declared"),
    ],
)
def test_wrong_arithmetic_is_refused_with_its_line(step: str, message: str) -> None:
    with pytest.raises(InputError) as caught:
        read(f"  - {step}\n")
    assert message in str(caught.value)
    assert caught.value.faults[0].place.line == 8


def test_a_sum_into_a_register_that_holds_something_is_refused() -> None:
    with pytest.raises(InputError, match="not in"):
        read("  - x: 's[0]'\n  - sum: {left: a, right: b, into: s}\n")


def test_a_body_may_not_change_what_the_compute_part_read() -> None:
    with pytest.raises(InputError, match="changes a\\[0\\]"):
        read(
            """  - scope:
      workspace: {w: 3}
      compute:
        - sum: {left: a, right: b, into: w}
      body:
        - increment: a
"""
        )
