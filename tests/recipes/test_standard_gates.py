"""Every plain gate, spelled out, has the matrix that the open standard gives it."""

from __future__ import annotations

import cmath
import math

import numpy as np
import pytest
from recipe_simulators import matrix, turn, unitary

from placer.program.model import PLAIN_GATES
from placer.recipes.circuit import Op
from placer.recipes.standard import lower

ANGLES = [0.0, 0.3, -2.2, math.pi, 5.9]
PAULI_X = np.array([[0, 1], [1, 0]], dtype=complex)


def defined(name: str, params: tuple[float, ...]) -> np.ndarray:
    """Return the matrix of a gate by definition; wire 0 (control) is the lowest bit."""
    wires, _ = PLAIN_GATES[name]
    if wires == 1:
        return matrix(Op(name, (0,), params))
    if name == "swap":
        return np.eye(4)[[0, 2, 1, 3]]
    if name == "rzz":
        low, high = (cmath.exp(sign * 0.5j * params[0]) for sign in (-1, 1))
        return np.diag([low, high, high, low])
    if name == "rxx":
        both = np.kron(PAULI_X, PAULI_X)
        return math.cos(params[0] / 2) * np.eye(4) - 1j * math.sin(params[0] / 2) * both
    inner = {
        "cx": lambda: matrix(Op("x", (0,))),
        "cy": lambda: matrix(Op("y", (0,))),
        "cz": lambda: matrix(Op("z", (0,))),
        "ch": lambda: matrix(Op("h", (0,))),
        "cp": lambda: matrix(Op("p", (0,), params)),
        "crx": lambda: turn("rx", params[0]),
        "cry": lambda: turn("ry", params[0]),
        "crz": lambda: turn("rz", params[0]),
    }[name]()
    result = np.eye(4, dtype=complex)
    result[np.ix_([1, 3], [1, 3])] = inner
    return result


@pytest.mark.parametrize("name", sorted(PLAIN_GATES))
def test_matrix(name: str) -> None:
    count = PLAIN_GATES[name][1]
    for first in ANGLES if count else [0.0]:
        params = (first, 0.7, -1.3)[:count]
        circuit = lower(name, params)
        assert all(op.name in ("cx", "cz") or len(op.wires) == 1 for op in circuit.ops)
        reached, wanted = unitary(circuit), defined(name, params)
        overlap = np.trace(wanted.conj().T @ reached) / len(wanted)
        assert abs(abs(overlap) - 1) < 1e-12
        assert np.abs(reached - overlap * wanted).max() < 1e-12


def test_refusals() -> None:
    with pytest.raises(ValueError, match="no plain gate 'ccx'"):
        lower("ccx", ())
    with pytest.raises(ValueError, match="cp takes 1 finite angles"):
        lower("cp", ())
    with pytest.raises(ValueError, match="rz takes 1 finite angles"):
        lower("rz", (math.inf,))
