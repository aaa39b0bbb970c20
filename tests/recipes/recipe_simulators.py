"""Simulators for the tests of the recipes: bits, matrices, sparse paths, trits.

They share no code with the package beyond the `Op` that they read.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Iterable, Sequence

import numpy as np

from placer.recipes.circuit import Circuit, Op

HALF = 1 / math.sqrt(2)
PAULI_X = np.array([[0, 1], [1, 0]], dtype=complex)


def turn(axis: str, angle: float) -> np.ndarray:
    """Return exp(-i angle/2 P) for the Pauli matrix of an axis."""
    pauli = {
        "rx": PAULI_X,
        "ry": np.array([[0, -1j], [1j, 0]]),
        "rz": np.diag([1.0 + 0j, -1]),
    }[axis]
    return math.cos(angle / 2) * np.eye(2) - 1j * math.sin(angle / 2) * pauli


def matrix(op: Op) -> np.ndarray:
    """Return the 2x2 matrix of a one-qubit gate (OpenQASM 3 convention)."""
    phases = {"z": 4, "s": 2, "sdg": -2, "t": 1, "tdg": -1, "id": 0}
    if op.name in phases:
        return np.diag([1, cmath.exp(1j * math.pi / 4 * phases[op.name])])
    if op.name == "p":
        return np.diag([1, cmath.exp(1j * op.params[0])])
    if op.name in ("rx", "ry", "rz"):
        return turn(op.name, op.params[0])
    if op.name == "u":
        theta, phi, lam = op.params
        c, s = math.cos(theta / 2), math.sin(theta / 2)
        return np.array(
            [
                [c, -cmath.exp(1j * lam) * s],
                [cmath.exp(1j * phi) * s, cmath.exp(1j * (phi + lam)) * c],
            ]
        )
    return {
        "x": PAULI_X,
        "y": np.array([[0, -1j], [1j, 0]]),
        "h": np.array([[HALF, HALF], [HALF, -HALF]], dtype=complex),
        "sx": np.array([[1 + 1j, 1 - 1j], [1 - 1j, 1 + 1j]]) / 2,
        "sxdg": np.array([[1 - 1j, 1 + 1j], [1 + 1j, 1 - 1j]]) / 2,
    }[op.name]


# ---------------------------------------------------------------- bits
def replay_bits(ops: Iterable[Op], rows: np.ndarray) -> np.ndarray:
    """Return the wires (first axis) of many classical inputs after X-type gates."""
    rows = rows.copy()
    for op in ops:
        if op.name not in ("x", "cx", "ccx", "mcx") or op.condition is not None:
            raise ValueError(op.name)
        rows[op.wires[-1]] ^= rows[list(op.wires[:-1])].all(axis=0)
    return rows


def all_bits(width: int) -> np.ndarray:
    """Return every classical input, one a column; wire 0 is the lowest bit."""
    return (np.arange(2**width) >> np.arange(width)[:, None] & 1).astype(bool)


def telling_bits(width: int, controls: int, seed: int, count: int) -> np.ndarray:
    """Return random inputs, half of them with at most three controls at 0."""
    rng = np.random.default_rng(seed)
    rows = rng.random((width, count)) < rng.random(count)
    for column in range(0, count, 2):
        rows[:controls, column] = True
        zeros = rng.integers(0, controls, size=rng.integers(0, 4))
        rows[zeros, column] = False
    return rows


# ---------------------------------------------------------------- matrices
def unitary(circuit: Circuit) -> np.ndarray:
    """Return the matrix of a circuit without measurement; wire 0 is the lowest bit."""
    size = 2**circuit.width
    result = np.eye(size, dtype=complex)
    index = np.arange(size)
    for op in circuit.ops:
        controls, gate = controlled(op)
        on = np.ones(size, dtype=bool)
        for wire in controls:
            on &= (index >> wire & 1).astype(bool)
        low = index[on & ~(index >> op.wires[-1] & 1).astype(bool)]
        high = low | 1 << op.wires[-1]
        upper, lower = result[low], result[high]
        result[low] = gate[0, 0] * upper + gate[0, 1] * lower
        result[high] = gate[1, 0] * upper + gate[1, 1] * lower
    return result


def controlled(op: Op) -> tuple[Sequence[int], np.ndarray]:
    """Return the controls of a gate and what it does to its last wire."""
    if op.condition is not None or op.bit is not None:
        raise ValueError(op.name)
    if len(op.wires) == 1:
        return (), matrix(op)
    gate = {
        "cx": PAULI_X,
        "ccx": PAULI_X,
        "mcx": PAULI_X,
        "cz": np.diag([1, -1]),
        "mcz": np.diag([1, -1]),
    }.get(op.name)
    if gate is None:
        if op.name not in ("cp", "mcp"):
            raise ValueError(op.name)
        gate = np.diag([1, cmath.exp(1j * op.params[0])])
    return op.wires[:-1], gate


# ---------------------------------------------------------------- sparse paths
Sparse = tuple[np.ndarray, np.ndarray]
"""Basis labels and amplitudes; bits above the circuit belong to a spectator."""


def follow(circuit: Circuit, state: Sparse, outcomes: Iterable[int] = ()) -> Sparse:
    """Return a sparse state after a circuit with the given measurement outcomes.

    An outcome that has not probability 1/2 shows as a norm other than 1.
    """
    keys, amps = state
    drawn, bits = iter(outcomes), dict[int, int]()
    for op in circuit.ops:
        if op.condition is not None and not bits[op.condition]:
            continue
        if op.name == "measure":
            assert op.bit is not None
            bits[op.bit] = next(drawn)
            kept = (keys >> op.wires[0] & 1) == bits[op.bit]
            keys, amps = keys[kept], amps[kept] * math.sqrt(2)
            continue
        plain = Op(op.name, op.wires, op.params)
        controls, gate = controlled(plain)
        keys, amps = _apply(keys, amps, controls, op.wires[-1], gate)
    return keys, amps


def _apply(
    keys: np.ndarray,
    amps: np.ndarray,
    controls: Sequence[int],
    target: int,
    gate: np.ndarray,
) -> Sparse:
    on = np.ones(len(keys), dtype=bool)
    for wire in controls:
        on &= (keys >> wire & 1).astype(bool)
    bit = keys >> target & 1
    if gate[0, 1] == 0:
        return keys, np.where(on, amps * np.where(bit, gate[1, 1], gate[0, 0]), amps)
    if gate[0, 0] == 0:
        swapped = np.where(on, keys ^ 1 << target, keys)
        return swapped, np.where(on, amps * np.where(bit, gate[0, 1], gate[1, 0]), amps)
    assert not controls
    stay = amps * np.where(bit, gate[1, 1], gate[0, 0])
    move = amps * np.where(bit, gate[0, 1], gate[1, 0])
    both = np.concatenate([keys, keys ^ 1 << target])
    found, place = np.unique(both, return_inverse=True)
    total = np.zeros(len(found), dtype=complex)
    np.add.at(total, place, np.concatenate([stay, move]))
    alive = np.abs(total) > 1e-12
    return found[alive], total[alive]


def mismatch(first: Sparse, second: Sparse) -> float:
    """Return the distance of two states, a global phase apart."""
    keys = np.union1d(first[0], second[0])
    vectors = np.zeros((2, len(keys)), dtype=complex)
    for row, (labels, amps) in enumerate((first, second)):
        vectors[row, np.searchsorted(keys, labels)] = amps
    overlap = np.vdot(vectors[0], vectors[1])
    if abs(overlap) < 1e-9:
        return 1.0
    return float(np.abs(vectors[0] * overlap / abs(overlap) - vectors[1]).max())


# ---------------------------------------------------------------- trits
def replay_trits(
    ops: Iterable[Op], rows: np.ndarray
) -> tuple[np.ndarray, np.ndarray, set[int]]:
    """Return wires and phases after level-2 gates, and the wires that were in |2>.

    Raises
    ------
    AssertionError
        If a wire is in |2> outside the stretch that the marks declare.
    """
    rows = rows.astype(np.int8)
    phases = np.zeros(rows.shape[1])
    declared, seen = set[int](), set[int]()
    for op in ops:
        assert op.name == "level2"
        assert op.condition is None
        declared |= set(op.enters)
        control, target = op.wires
        on = rows[control] == op.level
        if op.action == "p1":
            phases[on & (rows[target] == 1)] += op.params[0]
        else:
            low = {"x01": 0, "x12": 1}[op.action or ""]
            moved = on & ((rows[target] == low) | (rows[target] == low + 1))
            rows[target] = np.where(moved, 2 * low + 1 - rows[target], rows[target])
        declared -= set(op.leaves)
        high = {int(wire) for wire in np.flatnonzero((rows == 2).any(axis=1))}
        assert high <= declared, (op, high, declared)
        seen |= high
    assert not declared
    return rows, phases, seen
