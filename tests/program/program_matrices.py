"""Unitaries of gates and flat programs, written down without the package's tables.

Qubit 0 is the least significant bit of a basis state.  Matrices of several qubits take
their first qubit as the least significant bit as well.
"""

from __future__ import annotations

import cmath
import math

import numpy as np

I2 = np.eye(2, dtype=complex)
X = np.array([[0, 1], [1, 0]], dtype=complex)
Y = np.array([[0, -1j], [1j, 0]], dtype=complex)
Z = np.diag([1, -1]).astype(complex)
H = np.array([[1, 1], [1, -1]], dtype=complex) / math.sqrt(2)
SX = np.array([[1 + 1j, 1 - 1j], [1 - 1j, 1 + 1j]]) / 2


def phase(angle):
    return np.diag([1, cmath.exp(1j * angle)])


def rotation(pauli, angle):
    size = len(pauli)
    return math.cos(angle / 2) * np.eye(size) - 1j * math.sin(angle / 2) * pauli


def real_corner(theta, phi, lam):
    """The matrix with cos(theta/2) in its upper left corner."""
    c, s = math.cos(theta / 2), math.sin(theta / 2)
    return np.array(
        [
            [c, -cmath.exp(1j * lam) * s],
            [cmath.exp(1j * phi) * s, cmath.exp(1j * (phi + lam)) * c],
        ]
    )


def language_u(theta, phi, lam):
    """U as in the OpenQASM 3 specification, section 'Built-in gates'."""
    e = cmath.exp
    return 0.5 * np.array(
        [
            [1 + e(1j * theta), -1j * e(1j * lam) * (1 - e(1j * theta))],
            [
                1j * e(1j * phi) * (1 - e(1j * theta)),
                e(1j * (phi + lam)) * (1 + e(1j * theta)),
            ],
        ]
    )


def under_controls(matrix, count):
    """Controls come first, so they are the low bits."""
    size = len(matrix)
    result = np.eye(size << count, dtype=complex)
    ones = (1 << count) - 1
    places = [(i << count) | ones for i in range(size)]
    result[np.ix_(places, places)] = matrix
    return result


SWAP = np.eye(4)[[0, 2, 1, 3]].astype(complex)
ZZ = np.kron(Z, Z)
XX = np.kron(X, X)


def _u3(theta, phi, lam):
    # stdgates.inc: gphase(-(phi + lambda + theta)/2); U(theta, phi, lambda) q;
    return cmath.exp(-0.5j * (phi + lam + theta)) * language_u(theta, phi, lam)


def _cu(theta, phi, lam, gamma):
    # stdgates.inc: p(gamma - theta/2) c; ctrl @ U(theta, phi, lambda) c, t;
    return under_controls(language_u(theta, phi, lam), 1) @ np.kron(
        I2, phase(gamma - theta / 2)
    )


# name -> (qubits, parameters, matrix)
REFERENCE = {
    "id": (1, 0, lambda: I2),
    "x": (1, 0, lambda: X),
    "y": (1, 0, lambda: Y),
    "z": (1, 0, lambda: Z),
    "h": (1, 0, lambda: H),
    "s": (1, 0, lambda: np.diag([1, 1j])),
    "sdg": (1, 0, lambda: np.diag([1, -1j])),
    "t": (1, 0, lambda: phase(math.pi / 4)),
    "tdg": (1, 0, lambda: phase(-math.pi / 4)),
    "sx": (1, 0, lambda: SX),
    "sxdg": (1, 0, lambda: SX.conj().T),
    "rx": (1, 1, lambda a: rotation(X, a)),
    "ry": (1, 1, lambda a: rotation(Y, a)),
    "rz": (1, 1, lambda a: rotation(Z, a)),
    "p": (1, 1, phase),
    "phase": (1, 1, phase),
    "u1": (1, 1, lambda a: language_u(0, 0, a)),
    "u2": (1, 2, lambda a, b: _u3(math.pi / 2, a, b)),
    "u3": (1, 3, _u3),
    "u": (1, 3, language_u),
    "U": (1, 3, language_u),
    "u0": (1, 1, lambda _: I2),
    "CX": (2, 0, lambda: under_controls(X, 1)),
    "cx": (2, 0, lambda: under_controls(X, 1)),
    "cy": (2, 0, lambda: under_controls(Y, 1)),
    "cz": (2, 0, lambda: under_controls(Z, 1)),
    "ch": (2, 0, lambda: under_controls(H, 1)),
    "csx": (2, 0, lambda: under_controls(SX, 1)),
    "cp": (2, 1, lambda a: under_controls(phase(a), 1)),
    "cphase": (2, 1, lambda a: under_controls(phase(a), 1)),
    "cu1": (2, 1, lambda a: under_controls(phase(a), 1)),
    "crx": (2, 1, lambda a: under_controls(rotation(X, a), 1)),
    "cry": (2, 1, lambda a: under_controls(rotation(Y, a), 1)),
    "crz": (2, 1, lambda a: under_controls(rotation(Z, a), 1)),
    "cu3": (2, 3, lambda *v: under_controls(real_corner(*v), 1)),
    "cu": (2, 4, _cu),
    "swap": (2, 0, lambda: SWAP),
    "rzz": (2, 1, lambda a: rotation(ZZ, a)),
    "rxx": (2, 1, lambda a: rotation(XX, a)),
    "ccx": (3, 0, lambda: under_controls(X, 2)),
    "ccz": (3, 0, lambda: under_controls(Z, 2)),
    "cswap": (3, 0, lambda: under_controls(SWAP, 1)),
    "c3x": (4, 0, lambda: under_controls(X, 3)),
    "c4x": (5, 0, lambda: under_controls(X, 4)),
    "c3sqrtx": (4, 0, lambda: under_controls(SX, 3)),
}


def embedded(matrix, wires, count):
    """Return a matrix on some wires as a matrix on all wires."""
    size = 1 << count
    result = np.zeros((size, size), dtype=complex)
    others = [w for w in range(count) if w not in wires]
    for rest in range(1 << len(others)):
        base = sum(((rest >> i) & 1) << w for i, w in enumerate(others))
        places = [
            base | sum(((k >> i) & 1) << w for i, w in enumerate(wires))
            for k in range(1 << len(wires))
        ]
        result[np.ix_(places, places)] = matrix
    return result


def operation_matrix(op):
    """Return the matrix of a flat operation on its own wires."""
    if op.kind == "mcx":
        return under_controls(X, op.controls)
    if op.kind == "mcz":
        return under_controls(Z, op.controls)
    if op.kind == "mcp":
        return under_controls(phase(op.params[0]), op.controls)
    assert op.kind == "gate"
    if op.name == "u":
        return real_corner(*op.params)
    return REFERENCE[op.name][2](*op.params)


def program_matrix(program):
    """Return the unitary of a program, up to a global phase."""
    count = len(program.wire_names)
    result = np.eye(1 << count, dtype=complex)
    for op in program.operations:
        if op.kind != "barrier":
            result = embedded(operation_matrix(op), op.wires, count) @ result
    return result


def same_up_to_phase(left, right):
    overlap = np.vdot(left, right) / len(left)
    return abs(abs(overlap) - 1) < 1e-9
