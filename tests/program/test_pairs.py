"""`@placer.compute` and `@placer.uncompute`: scopes in OpenQASM."""

from __future__ import annotations

import pytest

from placer.errors import InputError
from placer.program.model import Program
from placer.program.read import read_program
from placer.program.values import values_of

HEAD = """OPENQASM 3.0;
include "stdgates.inc";
gate and3 a, b, c, w0, w1 { ccx a, b, w0; ccx w0, c, w1; }
qubit[3] a;
qubit t;
@placer.workspace init=zero ends=zero
qubit[2] w;
reset a;
h a;
"""
COMPUTE = "@placer.compute id=k1 scratch=w\nand3 a[0], a[1], a[2], w[0], w[1];\n"
BODY = "cz w[1], t;\n"
UNDO = "@placer.uncompute id=k1\ninv @ and3 a[0], a[1], a[2], w[0], w[1];\n"


def read(body: str) -> Program:
    return read_program(HEAD + body, "pairs.qasm")


def told(body: str) -> str:
    with pytest.raises(InputError) as caught:
        read(body)
    return str(caught.value)


def test_a_pair_is_a_scope_with_values() -> None:
    program = read(COMPUTE + BODY + UNDO)
    (scope,) = program.scopes
    assert scope.name == "k1"
    assert (scope.compute, scope.body, scope.cleanup) == ((3, 5), (5, 6), (6, 8))
    graph = values_of(program)
    assert [v.name for v in graph.values] == ["w[0]", "w[1]"]
    assert [u.needs for u in graph.uses][-1] == (1,)


def test_the_old_language_says_it_in_comments() -> None:
    text = (
        'OPENQASM 2.0;\ninclude "qelib1.inc";\nqreg a[2];\nqreg t[1];\n'
        "// @placer.workspace init=zero ends=zero\nqreg w[1];\nh a;\n"
        "// @placer.compute id=k scratch=w\nccx a[0],a[1],w[0];\n"
        "cx w[0],t[0];\n// @placer.uncompute id=k\nccx a[0],a[1],w[0];\n"
    )
    program = read_program(text, "pairs.qasm")
    assert [s.name for s in program.scopes] == ["k"]
    assert len(values_of(program).values) == 1


def test_pairs_nest_and_share_values() -> None:
    inner = COMPUTE.replace("k1", "k2") + BODY + UNDO.replace("k1", "k2")
    program = read(COMPUTE + BODY + UNDO + "x t;\n" + inner)
    graph = values_of(program)
    # Both pairs compute the same from the same: two values, not four.
    assert len(graph.values) == 2


@pytest.mark.parametrize(
    ("body", "words"),
    [
        (COMPUTE + BODY, "the pair 'k1' is never ended"),
        (UNDO, "'@placer.uncompute id=k1' ends no pair that is open here"),
        (COMPUTE + BODY + UNDO.replace("inv @ ", ""), "step by step"),
        (COMPUTE + BODY + UNDO + BODY, "reads w[1], which line 13 has cleaned up"),
        (COMPUTE + "x a[1];\n" + UNDO, "changes a[1], which the compute part uses"),
        (COMPUTE + BODY + UNDO + COMPUTE, "a pair 'k1' in line 10 already"),
        (COMPUTE.replace("scratch=w", "scratch=a"), "'a' is no workspace"),
        (COMPUTE.replace("scratch=w", "scratch=z"), "'z' is not declared"),
        (COMPUTE.replace("id=k1 ", ""), "lacks id=..."),
        (COMPUTE.replace("id=k1", "id=k1 speed=2"), "does not take 'speed=2'"),
        ("@placer.compute id=q\nqubit z;\n", "belongs on a gate call or a loop"),
    ],
)
def test_what_is_wrong_is_refused(body: str, words: str) -> None:
    assert words in told(body)


def test_both_lines_of_a_conflict_are_named() -> None:
    text = told(COMPUTE + "x a[1];\n" + UNDO)
    assert "pairs.qasm:12" in text
    # The annotated statement begins with its annotation, in line 10.
    assert "line 10" in text


def test_scratch_that_something_else_has_touched_is_not_moved() -> None:
    # w[0] holds a[0] outside of the pair: its content is no value of the pair.
    around = "cx a[0], w[0];\n"
    program = read(around + COMPUTE + BODY + UNDO + around)
    assert values_of(program).values == ()
