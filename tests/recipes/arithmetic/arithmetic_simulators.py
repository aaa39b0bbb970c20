"""Simulators for the tests of arithmetic recipes: bit-sliced replay, sparse states.

They share no code with the package beyond the `Op` that they read.
"""

from __future__ import annotations

import cmath
import math
from collections.abc import Iterable, Sequence

import numpy as np

from placer.recipes.circuit import Circuit, Op

BITWISE = frozenset({"x", "cx", "ccx", "mcx"})
HALF = 1 / math.sqrt(2)


# ---------------------------------------------------------------- bit-sliced replay
def slices(columns: np.ndarray) -> np.ndarray:
    """Return one row of 64-bit words a wire from a boolean matrix wires x inputs."""
    wires, inputs = columns.shape
    padded = np.zeros((wires, -(-inputs // 64) * 64), dtype=bool)
    padded[:, :inputs] = columns
    packed = np.packbits(padded, axis=1, bitorder="little")
    return np.ascontiguousarray(packed).view(np.uint64)


def columns(words: np.ndarray, inputs: int) -> np.ndarray:
    """Return the boolean matrix of so many inputs from bit slices."""
    octets = np.ascontiguousarray(words).view(np.uint8)
    return np.unpackbits(octets, axis=1, bitorder="little")[:, :inputs].astype(bool)


def replay(ops: Iterable[Op], words: np.ndarray) -> np.ndarray:
    """Return bit slices after X-type gates, 64 inputs a machine word."""
    words = words.copy()
    for op in ops:
        if op.condition is not None:
            raise ValueError(op.name)
        _flip(op, words)
    return words


def _flip(op: Op, words: np.ndarray) -> None:
    """Do one X-type gate in place."""
    if op.name not in BITWISE:
        raise ValueError(op.name)
    target = words[op.wires[-1]]
    if len(op.wires) == 1:
        target ^= np.uint64(0xFFFFFFFFFFFFFFFF)
        return
    product = words[op.wires[0]]
    for wire in op.wires[1:-1]:
        product = product & words[wire]
    target ^= product


SIGNED = BITWISE | {"h", "measure", "z", "cz"}


def replay_signed(
    ops: Iterable[Op], words: np.ndarray, outcomes: Iterable[bool]
) -> tuple[np.ndarray, np.ndarray]:
    """Return bit slices and signs after X-type gates and X-basis measurements.

    There is one outcome for each measurement, the same for all inputs.  A wire that
    holds b gives outcome m the sign (-1)^(bm) and comes to hold m.  An `h` must be
    followed by the measurement of its wire.
    """
    words = words.copy()
    sign = np.zeros(words.shape[1], dtype=np.uint64)
    opened: int | None = None
    drawn, bits = iter(outcomes), dict[int, bool]()
    for op in ops:
        if opened is not None and op.name != "measure":
            raise ValueError(f"{op.name} before the measurement of wire {opened}")
        if op.name == "h":
            (opened,) = op.wires
        elif op.name == "measure":
            if opened != op.wires[0] or op.bit is None or op.bit in bits:
                raise ValueError("a measurement that is not in the X basis")
            bits[op.bit] = next(drawn)
            if bits[op.bit]:
                sign ^= words[opened]
            words[opened] = np.uint64(0xFFFFFFFFFFFFFFFF * bits[op.bit])
            opened = None
        elif op.condition is None or bits[op.condition]:
            if op.name in ("z", "cz"):
                sign ^= np.bitwise_and.reduce(words[list(op.wires)], axis=0)
            else:
                _flip(op, words)
    return words, sign


# ---------------------------------------------------------------- sparse states
Sparse = tuple[np.ndarray, np.ndarray]
"""Basis labels (wire 0 the lowest bit) and amplitudes."""

_EIGHTHS = {"z": 4, "s": 2, "sdg": -2, "t": 1, "tdg": -1, "id": 0}


def follow(circuit: Circuit, state: Sparse, outcomes: Sequence[int] = ()) -> Sparse:
    """Return a sparse state after a circuit with the given measurement outcomes.

    `outcomes` follow the order of the measurements.  An outcome whose probability is
    not 1/2 shows as a norm other than 1.
    """
    keys, amps = state
    drawn, bits = iter(outcomes), dict[int, int]()
    for op in circuit.ops:
        if op.condition is not None and not bits[op.condition]:
            continue
        if op.name == "measure":
            assert op.bit is not None
            assert op.bit not in bits
            bits[op.bit] = next(drawn)
            kept = (keys >> op.wires[0] & 1) == bits[op.bit]
            keys, amps = keys[kept], amps[kept] * math.sqrt(2)
        else:
            keys, amps = _gate(op, keys, amps)
    return keys, amps


def _gate(op: Op, keys: np.ndarray, amps: np.ndarray) -> Sparse:
    target = op.wires[-1]
    if op.name == "h":
        return _hadamard(keys, amps, target)
    on = np.ones(len(keys), dtype=bool)
    for wire in op.wires[:-1]:
        on &= (keys >> wire & 1).astype(bool)
    if op.name in BITWISE:
        return np.where(on, keys ^ 1 << target, keys), amps
    on &= (keys >> target & 1).astype(bool)
    if op.name in ("cz", "mcz"):
        angle = math.pi
    elif op.name in ("p", "cp", "mcp"):
        angle = op.params[0]
    else:
        assert len(op.wires) == 1, op.name
        angle = _EIGHTHS[op.name] * math.pi / 4
    return keys, np.where(on, amps * cmath.exp(1j * angle), amps)


def _hadamard(keys: np.ndarray, amps: np.ndarray, target: int) -> Sparse:
    sign = np.where(keys >> target & 1, -1.0, 1.0)
    base = keys & ~(1 << target)
    found, place = np.unique(base, return_inverse=True)
    low = np.zeros(len(found), dtype=complex)
    high = np.zeros(len(found), dtype=complex)
    np.add.at(low, place, amps * HALF)
    np.add.at(high, place, amps * sign * HALF)
    both = np.concatenate([found, found | 1 << target])
    total = np.concatenate([low, high])
    alive = np.abs(total) > 1e-12
    return both[alive], total[alive]


def mismatch(first: Sparse, second: Sparse) -> float:
    """Return the largest difference of two states, a global phase apart."""
    keys = np.union1d(first[0], second[0])
    vectors = np.zeros((2, len(keys)), dtype=complex)
    for row, (labels, amps) in enumerate((first, second)):
        vectors[row, np.searchsorted(keys, labels)] = amps
    overlap = np.vdot(vectors[0], vectors[1])
    if abs(overlap) < 1e-9:
        return 1.0
    return float(np.abs(vectors[0] * overlap / abs(overlap) - vectors[1]).max())
