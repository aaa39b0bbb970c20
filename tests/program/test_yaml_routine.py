"""Routines: arguments, fresh scratch, nesting, and claims that are verified."""

from __future__ import annotations

import pytest

import placer
from placer.errors import InputError
from placer.program.model import Program
from placer.program.read import read_program

ROUTINES = """routines:
  half:
    arguments: {a: , b: , into: }
    steps:
      - mcx: {controls: [a, b], target: into}
  adder:
    arguments: {x: 2, y: 2}
    scratch: {w: 1}
    computes: {add: {value: x, into: y}}
    steps:
      - call: {routine: half, with: {a: x.0, b: y.0, into: w}}
      - cx: w, y[1]
      - call: {routine: half, with: {a: x.0, b: y.0, into: w}}
      - cx: x, y
  keep:
    arguments: {t: 2, f: }
    scratch: {v: 1}
    steps:
      - scope:
          compute: [{and: {controls: t, into: v}}]
          body: [{cx: "v, f"}]
registers: {a: 2, b: 2, f: }
steps:
"""


def read(steps: str, old: str = "", new: str = "") -> Program:
    assert old in ROUTINES
    return read_program(ROUTINES.replace(old, new, 1) + steps, "routines.yaml")


def kinds(program: Program) -> list[str]:
    return [op.name for op in program.operations]


def test_a_verified_claim_becomes_one_call() -> None:
    program = read("  - call: {routine: adder, with: {x: a, y: b}}\n")
    (op,) = program.operations
    assert op.kind == "add"
    assert [program.wire_names[w] for w in op.wires] == ["a[0]", "a[1]", "b[0]", "b[1]"]


def test_without_a_claim_the_steps_are_written_out_with_fresh_scratch() -> None:
    program = read(
        "  - call: {routine: keep, with: {t: a, f: f}}\n"
        "  - call: {routine: keep, with: {t: b, f: f}}\n"
    )
    assert kinds(program) == ["and", "cx", "and"] * 2
    scratch = [name for name in program.wire_names if "keep" in name]
    assert len(scratch) == 2
    assert program.operations[0].wires[-1] != program.operations[3].wires[-1]


def test_a_call_inside_a_compute_part_is_taken_back() -> None:
    program = read(
        """  - scope:
      workspace: {g: 1}
      compute:
        - call: {routine: keep, with: {t: a, f: g}}
      body:
        - cx: g, f
"""
    )
    assert kinds(program) == ["and", "cx", "and", "cx", "and", "cx", "and"]
    plan = placer.plan(program, "slate-16", effort="quick")
    assert plan.figures.two_qubit_gates > 0


@pytest.mark.parametrize(
    ("old", "new", "message", "line"),
    [
        ("      - cx: x, y\n", "", "does not compute 'add'", 9),
        (
            "      - cx: x, y\n",
            "      - cx: x, y\n      - z: x\n",
            "no permutation",
            15,
        ),
        ("- cx: w, y[1]", "- cx: w, y[0]", "must end in |0>, but with", 8),
        (
            "{a: x.0, b: y.0, into: w}",
            "{a: x, b: y.0, into: w}",
            "width 1, found 2",
            11,
        ),
        ("routine: half,", "routine: halve,", "'halve' is not declared", 11),
        ("scratch: {v: 1}", "scrach: {v: 1}", "scrach", 17),
        ("{add: {value: x, into: y}}", "{cx: 'x, y'}", "one arithmetic step", 9),
    ],
)
def test_faults_of_routines_are_found_where_they_stand(
    old: str, new: str, message: str, line: int
) -> None:
    with pytest.raises(InputError) as caught:
        read("  - h: f\n", old, new)
    assert message in str(caught.value)
    assert any(fault.place.line == line for fault in caught.value.faults)


def test_a_routine_cannot_call_itself() -> None:
    with pytest.raises(InputError, match="'half' is not declared before its use"):
        read(
            "  - h: f\n",
            "      - mcx: {controls: [a, b], target: into}\n",
            "      - call: {routine: half, with: {a: a, b: b, into: into}}\n",
        )


def test_a_false_claim_shows_an_input() -> None:
    with pytest.raises(InputError, match=r"it makes \(\d, \d\) of \(\d, \d\)"):
        read("  - h: f\n", "      - cx: x, y\n", "")


BORROWING = """routines:
  four:
    arguments: {a: 3, t: }
    borrowed: {d: 1}
    steps:
      - mcx: {controls: [a.2, d.0], target: t}
      - mcx: {controls: [a.0, a.1], target: d.0}
      - mcx: {controls: [a.2, d.0], target: t}
      - mcx: {controls: [a.0, a.1], target: d.0}
registers: {q: 3, r: }
steps:
  - call: {routine: four, with: {a: q, t: r}}
"""


def test_borrowed_scratch_is_verified_and_given_fresh_workspace() -> None:
    program = read_program(BORROWING, "borrowing.yaml")
    assert kinds(program) == ["mcx"] * 4
    assert [r.workspace for r in program.registers] == [False, False, True]


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("      - mcx: {controls: [a.0, a.1], target: d.0}\nreg", "reg", "come back"),
        ("      - mcx: {controls: [a.2, d.0], target: t}\n", "", "depends on"),
        ("registers", "      - h: d\nregisters", "cannot be verified"),
    ],
)
def test_borrowed_scratch_that_is_not_given_back_is_refused(
    old: str, new: str, message: str
) -> None:
    assert old in BORROWING
    with pytest.raises(InputError, match=message):
        read_program(BORROWING.replace(old, new, 1), "borrowing.yaml")
