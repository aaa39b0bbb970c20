"""Every gate of the tables, plain and under modifiers, against matrices."""

from __future__ import annotations

import numpy as np
import pytest
from program_matrices import (
    REFERENCE,
    X,
    embedded,
    phase,
    program_matrix,
    same_up_to_phase,
    under_controls,
)

from placer.program.gatetable import ALWAYS, GATES
from placer.program.model import PLAIN_GATES
from placer.program.read import read_program

VALUES = (0.7, -1.9, 2.4, 0.3)
BY_PHASE_ONLY = {"rccx": 3, "rc3x": 4}


def read(body, qubits):
    header = 'OPENQASM 3.0;\ninclude "stdgates.inc";\n'
    return read_program(f"{header}qubit[{qubits}] q;\n{body}\n", "a.qasm")


def call(name, params, qubits, modifiers=""):
    values = ",".join(repr(v) for v in VALUES[:params])
    arguments = f"({values})" if params else ""
    wires = ",".join(f"q[{i}]" for i in range(qubits))
    return f"{modifiers}{name}{arguments} {wires};"


def test_reference_covers_the_tables():
    assert set(REFERENCE) | set(BY_PHASE_ONLY) == set(ALWAYS) | set(GATES)


@pytest.mark.parametrize("controls", [0, 1, 2, 3])
@pytest.mark.parametrize("name", sorted(REFERENCE))
def test_gate_under_controls(name, controls):
    qubits, params, matrix = REFERENCE[name]
    total = qubits + controls
    if total > 7:
        controls, total = 2, qubits + 2
    modifiers = f"ctrl({controls}) @ " if controls else ""
    program = read(call(name, params, total, modifiers), total)
    expected = under_controls(matrix(*VALUES[:params]), controls)
    assert same_up_to_phase(program_matrix(program), expected)
    for op in program.operations:
        if op.kind == "gate":
            assert PLAIN_GATES[op.name] == (len(op.wires), len(op.params))
        else:
            assert op.controls >= 2


@pytest.mark.parametrize("modifier", ["inv @ ", "inv @ ctrl @ ", "ctrl @ inv @ "])
@pytest.mark.parametrize("name", sorted(REFERENCE))
def test_inverse(name, modifier):
    qubits, params, matrix = REFERENCE[name]
    controls = modifier.count("ctrl")
    program = read(call(name, params, qubits + controls, modifier), qubits + controls)
    expected = under_controls(matrix(*VALUES[:params]).conj().T, controls)
    assert same_up_to_phase(program_matrix(program), expected)


@pytest.mark.parametrize("exponent", [-2, 0, 1, 3])
@pytest.mark.parametrize("name", sorted(REFERENCE))
def test_power_under_one_control(name, exponent):
    qubits, params, matrix = REFERENCE[name]
    text = call(name, params, qubits + 1, f"ctrl @ pow({exponent}) @ ")
    power = np.linalg.matrix_power(matrix(*VALUES[:params]), exponent)
    result = program_matrix(read(text, qubits + 1))
    assert same_up_to_phase(result, under_controls(power, 1))


@pytest.mark.parametrize("name", sorted(BY_PHASE_ONLY))
def test_relative_phase_gates_are_flips_with_phases(name):
    qubits = BY_PHASE_ONLY[name]
    result = program_matrix(read(call(name, 0, qubits), qubits))
    expected = under_controls(X, qubits - 1)
    assert np.allclose(abs(result), expected)
    inverse = program_matrix(read(call(name, 0, qubits, "inv @ "), qubits))
    assert same_up_to_phase(inverse @ result, np.eye(1 << qubits))
    controlled = call(name, 0, qubits + 1, "ctrl @ ")
    assert same_up_to_phase(
        program_matrix(read(controlled, qubits + 1)), under_controls(result, 1)
    )


@pytest.mark.parametrize(
    ("modifiers", "zeros"),
    [
        ("negctrl @ ", (0,)),
        ("negctrl @ ctrl @ ", (0,)),
        ("ctrl @ negctrl @ ", (1,)),
        ("negctrl(2) @ ", (0, 1)),
        ("ctrl(2) @ negctrl @ ", (2,)),
    ],
)
@pytest.mark.parametrize("name", ["x", "h", "u", "rz", "swap"])
def test_negative_controls(name, modifiers, zeros):
    qubits, params, matrix = REFERENCE[name]
    controls = (
        len(zeros) if "(2)" in modifiers and "ctrl(2) @ n" not in modifiers else 0
    )
    controls = controls or modifiers.count("ctrl") + (modifiers[:7] == "ctrl(2)")
    total = qubits + controls
    result = program_matrix(read(call(name, params, total, modifiers), total))
    expected = under_controls(matrix(*VALUES[:params]), controls)
    for wire in zeros:
        flip = embedded(X, (wire,), total)
        expected = flip @ expected @ flip
    assert same_up_to_phase(result, expected)


@pytest.mark.parametrize("controls", [0, 1, 2, 3])
def test_global_phase_under_controls_is_a_phase(controls):
    modifiers = f"ctrl({controls}) @ " if controls else ""
    wires = ",".join(f"q[{i}]" for i in range(controls))
    program = read(f"{modifiers}gphase(0.7) {wires};", 4)
    assert len(program.operations) == (1 if controls else 0)
    expected = under_controls(np.eye(1) * np.exp(0.7j), controls)
    expected = embedded(expected, tuple(range(controls)), 4)
    assert same_up_to_phase(program_matrix(program), expected)


@pytest.mark.parametrize("modifiers", ["", "ctrl @ ", "ctrl(2) @ ", "inv @ ctrl @ "])
def test_own_gate_keeps_its_phase_under_control(modifiers):
    text = (
        "gate inner(a) x, y { gphase(a); cx x, y; rz(2*a) y; }\n"
        "gate outer(a, b) x, y { inner(a/2) y, x; inv @ inner(b) x, y;"
        " pow(2) @ inner(b) x, y; }\n"
    )
    controls = {"": 0, "ctrl(2) @ ": 2}.get(modifiers, 1)
    wires = ",".join(f"q[{i}]" for i in range(controls + 2))
    program = read(f"{text}{modifiers}outer(0.7, 0.4) {wires};", controls + 2)

    def inner(a, wires):
        flip = embedded(under_controls(X, 1), wires, 2)
        turn = phase(2 * a) * np.exp(-1j * a)
        return np.exp(1j * a) * embedded(turn, wires[1:], 2) @ flip

    forward = inner(0.4, (0, 1))
    expected = forward @ forward @ forward.conj().T @ inner(0.35, (1, 0))
    if modifiers.startswith("inv"):
        expected = expected.conj().T
    result = program_matrix(program)
    assert same_up_to_phase(result, under_controls(expected, controls))


def test_short_forms():
    """Where no frame is needed, none is written."""
    kinds = {
        "ctrl(3) @ z": ["mcz"],
        "ctrl(3) @ s": ["mcp"],
        "ctrl(3) @ x": ["mcx"],
        "ctrl(3) @ rz(0.5)": ["gate", "mcx", "gate", "mcx"],
        "ctrl(3) @ ry(0.5)": ["gate", "mcx", "gate", "mcx"],
        "ctrl(3) @ rx(0.5)": ["gate", "mcz", "gate", "mcz"],
        "ctrl(3) @ y": ["gate", "mcx", "gate"],
        "ctrl(3) @ h": ["gate", "mcz", "gate"],
        "ctrl(3) @ sx": ["gate", "mcp", "gate"],
    }
    for text, expected in kinds.items():
        program = read(f"{text} q[0], q[1], q[2], q[3];", 4)
        assert [op.kind for op in program.operations] == expected, text
    swap = read("cswap q[0], q[1], q[2];", 3)
    assert [op.name for op in swap.operations] == ["cx", "mcx", "cx"]
