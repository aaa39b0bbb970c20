"""What plain gates mean, as small matrices; and their spelled-out forms, verified.

Conventions of OpenQASM 3 (stdgates.inc); the first wire is the more significant.
"""

from __future__ import annotations

import cmath
import math
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from placer.recipes.circuit import Op

    Matrix = NDArray[np.complex128]

_HALF = math.sqrt(0.5)
_EIGHTH = cmath.exp(0.25j * math.pi)
_FIXED: dict[str, list[list[complex]]] = {
    "id": [[1, 0], [0, 1]],
    "x": [[0, 1], [1, 0]],
    "y": [[0, -1j], [1j, 0]],
    "z": [[1, 0], [0, -1]],
    "h": [[_HALF, _HALF], [_HALF, -_HALF]],
    "s": [[1, 0], [0, 1j]],
    "sdg": [[1, 0], [0, -1j]],
    "t": [[1, 0], [0, _EIGHTH]],
    "tdg": [[1, 0], [0, _EIGHTH.conjugate()]],
    "sx": [[(1 + 1j) / 2, (1 - 1j) / 2], [(1 - 1j) / 2, (1 + 1j) / 2]],
    "sxdg": [[(1 - 1j) / 2, (1 + 1j) / 2], [(1 + 1j) / 2, (1 - 1j) / 2]],
}


def one_qubit(name: str, params: tuple[float, ...] = ()) -> list[list[complex]]:
    """Return the matrix of a one-qubit gate."""
    if name in _FIXED:
        return _FIXED[name]
    turn = params[0]
    c, s = math.cos(turn / 2), math.sin(turn / 2)
    if name == "p":
        return [[1, 0], [0, cmath.exp(1j * turn)]]
    if name == "rz":
        return [[cmath.exp(-0.5j * turn), 0], [0, cmath.exp(0.5j * turn)]]
    if name == "rx":
        return [[c, -1j * s], [-1j * s, c]]
    if name == "ry":
        return [[c, -s], [s, c]]
    if name == "u":
        phi, lam = cmath.exp(1j * params[1]), cmath.exp(1j * params[2])
        return [[c, -lam * s], [phi * s, phi * lam * c]]
    raise KeyError(name)


def two_qubit(name: str, params: tuple[float, ...] = ()) -> Matrix:
    """Return the matrix of a two-qubit gate."""
    if name == "swap":
        return np.eye(4, dtype=np.complex128)[[0, 2, 1, 3]]
    if name == "rzz":
        low, high = cmath.exp(-0.5j * params[0]), cmath.exp(0.5j * params[0])
        return np.diag(np.array([low, high, high, low], dtype=np.complex128))
    if name == "rxx":
        c, s = math.cos(params[0] / 2), math.sin(params[0] / 2)
        same = np.eye(4, dtype=np.complex128)
        return np.array(c * same - 1j * s * same[::-1], dtype=np.complex128)
    matrix: Matrix = np.eye(4, dtype=np.complex128)
    matrix[2:, 2:] = one_qubit(name[1:], params)
    return matrix


def _on_two(op: Op) -> Matrix:
    """Return a fine gate on the wires 0 and 1 as a matrix."""
    if len(op.wires) == 1:
        small = np.array(one_qubit(op.name, op.params), dtype=np.complex128)
        same = np.eye(2, dtype=np.complex128)
        pair = (small, same) if op.wires[0] == 0 else (same, small)
        return np.asarray(np.kron(*pair), dtype=np.complex128)
    matrix = two_qubit(op.name, op.params)
    return matrix if op.wires == (0, 1) else matrix[[0, 2, 1, 3]][:, [0, 2, 1, 3]]


@lru_cache(maxsize=4096)
def spelled_wrong(name: str, params: tuple[float, ...], ops: tuple[Op, ...]) -> bool:
    """Whether fine gates differ from the plain gate they spell out."""
    if len(ops) == 1 and (ops[0].name, ops[0].params) == (name, params):
        return ops[0].wires != tuple(range(len(ops[0].wires)))
    try:
        wanted = two_qubit(name, params)
    except KeyError:
        return True
    made = np.eye(4, dtype=np.complex128)
    for op in ops:
        made = _on_two(op) @ made
    overlap = np.trace(wanted.conj().T @ made) / 4
    return bool(abs(abs(overlap) - 1.0) > 1e-9)
