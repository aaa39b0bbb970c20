"""Claims about workspace: kept ones pass, broken ones come with an input."""

from __future__ import annotations

import re

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from program_matrices import program_matrix

from placer.errors import InputError
from placer.program.claims import BRANCHING, DIAGONAL
from placer.program.model import PLAIN_GATES
from placer.program.read import read_program

HEAD = (
    'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[3] a;\nqubit t;\n'
    "@placer.workspace init=zero ends=zero\nqubit[2] w;\n"
)


def read(body, **options):
    return read_program(HEAD + body, "p.qasm", **options)


def refusal(body):
    with pytest.raises(InputError) as caught:
        read(body)
    return [fault.what for fault in caught.value.faults]


@pytest.mark.parametrize(
    "body",
    [
        "",
        "ccx a[0], a[1], w[0]; cx w[0], t; ccx a[0], a[1], w[0];",
        # A phase on the workspace changes no value.
        "cx a[0], w[0]; rz(1) w[0]; cz w[0], t; ctrl @ s w[0], t; cx a[0], w[0];",
        # A superposed control returns the value along every path.
        "h a[0]; cx a[0], w[0]; cx w[0], t; cx a[0], w[0]; h a[0];",
        # The swap carries the value back.
        "cx a[0], w[0]; swap w[0], w[1]; cx a[0], w[1];",
        # Two exact half turns.
        "rx(pi) w[0]; ry(-pi) w[0]; cy a[0], w[0]; cx a[0], w[0]; x w[1]; x w[1];",
        "crx(pi) a[0], w[0]; cx a[0], w[0]; U(0, 1, 2) w[0]; rx(2 * pi) w[0];",
        "cx a[0], w[0]; cx a[0], w[0]; measure w[0];",
        "ctrl(2) @ negctrl @ x a[0], a[1], a[2], w[0];"
        "ctrl(2) @ negctrl @ x a[0], a[1], a[2], w[0];",
    ],
)
def test_kept(body):
    program = read(body)
    if "reset" not in body and "measure" not in body:
        # The matrix agrees: from w = 0 nothing reaches w != 0.
        matrix = program_matrix(program)
        low = [i for i in range(64) if i < 16]
        assert np.allclose(matrix[16:, low], 0)


@pytest.mark.parametrize(
    ("body", "words"),
    [
        ("x w[1];", r"but the wire w\[1\] ends in 1"),
        ("cx a[2], w[0];", r"with a = 0b100 the wire w\[0\] ends in 1"),
        ("ccx a[0], a[2], w[0];", "with a = 0b101 the"),
        ("x a[0]; ccx a[0], t, w[0]; cx t, w[0];", "a = 0b001, t = 0b1"),
        ("ccx a[0], a[1], w[0]; x a[0]; ccx a[0], a[1], w[0];", "a = 0b010"),
        ("swap a[0], w[0];", "with a = 0b001 the"),
        ("h t; cx t, w[0];", "along one branch of 'h' in line 7 the wire"),
        ("cx a[0], w[0]; h a[0]; cx a[0], w[0];", "branch of 'h'"),
    ],
)
def test_broken(body, words):
    (what,) = refusal(body)
    assert re.search(words, what)
    assert what.startswith("the workspace declared in line 6 must end in |0>")


@pytest.mark.parametrize(
    "gate",
    ["h", "sx", "sxdg", "rx(0.3)", "ry(0.3)", "U(0.3, 0, 0)", "ch t,", "crx(1) t,"],
)
def test_branching_gate_on_workspace(gate):
    (what,) = refusal(f"{gate} w[1];".replace("sxdg", "inv @ sx"))
    assert "the workspace wire w[1] is the target of" in what
    assert "cannot be verified" in what


def test_each_wire_is_named():
    assert len(refusal("x w;")) == 2


def test_rare_input_is_found_among_few_wires():
    text = (
        "OPENQASM 3.0;\nqubit[12] a;\n@placer.workspace init=zero ends=zero\nqubit w;\n"
        'include "stdgates.inc";\nctrl(12) @ x '
        + ", ".join(f"a[{i}]" for i in range(12))
        + ", w;"
    )
    with pytest.raises(
        InputError, match="with a = 0b111111111111 the wire w ends in 1"
    ):
        read_program(text, "p.qasm")


def test_many_wires_are_sampled():
    text = HEAD + "qubit[60] b;\ncx b[59], w[0];"
    with pytest.raises(InputError, match=r"b = 0b1[01]{59} the wire w"):
        read_program(text, "p.qasm")


@pytest.mark.parametrize("controls", [16, 24])
def test_many_controls_are_hit(controls):
    wires = ", ".join(f"b[{i}]" for i in range(controls))
    for modifier in ("ctrl", "negctrl"):
        body = f"qubit[{controls}] b;\n{modifier}({controls}) @ x {wires}, w[0];"
        digit = "1" if modifier == "ctrl" else "0"
        with pytest.raises(InputError, match=f"b = 0b{digit * controls} the wire"):
            read(body)


def test_known_zero_inputs_count():
    body = "reset a; ccx a[0], a[1], w[0];"
    assert read(body).registers[0].start == "zero"
    with pytest.raises(InputError, match="a = 0b011"):
        read(body.removeprefix("reset a;"))


def test_answer_is_the_same_every_time():
    text = "h t; cx t, w[0]; cx a[1], w[1];"
    assert refusal(text) == refusal(text)


def test_every_gate_has_a_class():
    classical = {"x", "y", "cx", "cy", "swap"}
    named = DIAGONAL | BRANCHING | classical | {"mcx", "and", "reset"}
    assert set(PLAIN_GATES) <= named
    assert not DIAGONAL & BRANCHING


WIRES = ["a[0]", "a[1]", "a[2]", "t", "w[0]", "w[1]"]
CLASSICAL = {"x": 1, "cx": 2, "ccx": 3, "swap": 2, "z": 1, "cz": 2, "s": 1}


@st.composite
def circuits(draw, gates):
    """Return gates on the wires of the header, often with their mirror behind them."""
    steps = []
    for _ in range(draw(st.integers(1, 6))):
        name = draw(st.sampled_from(sorted(gates)))
        # Branching gates stay away from the workspace, where they are refused at once.
        wires = WIRES if name in CLASSICAL else WIRES[:4]
        chosen = draw(st.permutations(wires))[: gates[name]]
        steps.append(f"{name} {', '.join(chosen)};")
    if draw(st.booleans()):
        mirror = [f"inv @ {step}" for step in reversed(steps)]
        steps += draw(st.sampled_from([[], ["cx w[0], t;"]])) + mirror
    return " ".join(steps)


def clean_by_matrix(body):
    """Whether the workspace of a circuit ends in |0> by its whole unitary."""
    # The same text without the claim, so that nothing is refused.
    text = HEAD.replace("@placer.workspace init=zero ends=zero\n", "") + body
    matrix = program_matrix(read_program(text, "p.qasm"))
    return bool(np.allclose(matrix[16:, :16], 0))


def is_kept(body):
    try:
        read(body)
    except InputError:
        return False
    return True


@settings(max_examples=150, deadline=None, derandomize=True)
@given(circuits(CLASSICAL))
def test_classical_circuits_are_judged_exactly(body):
    assert is_kept(body) == clean_by_matrix(body)


@settings(max_examples=150, deadline=None, derandomize=True)
@given(circuits({**CLASSICAL, "h": 1, "ch": 2, "rx(0.4)": 1, "U(0.3,1,2)": 1}))
def test_no_broken_claim_passes(body):
    if is_kept(body):
        assert clean_by_matrix(body)
