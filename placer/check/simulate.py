"""Exact simulation of one recipe's fine circuit on superposed inputs.

In: a built recipe.  Out: what differs from the call's meaning, if anything.  A state
is a list of basis rows (one level 0, 1 or 2 per wire) with amplitudes; equal rows are
merged after each branching gate.  Relative phases count, global phase does not.
"""

from __future__ import annotations

import cmath
import math
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from placer.recipes.circuit import Built, Op

MOST_ROWS = 1 << 15
TOLERANCE = 1e-7
INPUTS = 3


class TooWide(Exception):  # noqa: N818 - a limit of this method, not a mistake
    """The state branches into more rows than are followed."""


class State(NamedTuple):
    """Basis rows and their amplitudes."""

    rows: NDArray[np.uint8]
    amplitudes: NDArray[np.complex128]


def differences(built: Built, angle: float, *, inverse: bool, seed: int) -> list[str]:
    """Return how a recipe differs from its call on random superpositions.

    Slots must come back: clean ones in |0>, borrowed ones unchanged whatever they
    held, also in superposition with the operands.

    Raises
    ------
    TooWide
        If the circuit branches too much to be followed.
    """
    draw = np.random.default_rng(seed)
    found: list[str] = []
    for trial in range(4):
        state = _input(built, draw, is_inverse=inverse, is_all_on=trial % 2 == 0)
        expected = _meaning(built, angle, state, is_inverse=inverse)
        result = _run(built, state, draw)
        text = _compare(expected, result)
        if text:
            found.append(f"input {trial}: {text}")
    return found


def _input(
    built: Built, draw: np.random.Generator, *, is_inverse: bool, is_all_on: bool
) -> State:
    """Return random rows that meet the call's promise, with random amplitudes."""
    operands = built.fine.operands
    rows = draw.integers(0, 2, (INPUTS, built.fine.width), dtype=np.uint8)
    # Rare inputs are the interesting ones: all controls on, all but one on.
    rows[0, : operands - 1] = 1
    if not is_all_on:
        rows[1, : operands - 1] = 1
        rows[1, draw.integers(0, operands - 1)] = 0
    for slot, kind in enumerate(built.slots):
        if kind == "clean":
            rows[:, operands + slot] = 0
    if built.kind == "and":
        product = rows[:, : operands - 1].min(axis=1)
        rows[:, operands - 1] = product if is_inverse else 0
    amplitudes = draw.normal(size=INPUTS) + 1j * draw.normal(size=INPUTS)
    return _merged(State(rows, amplitudes.astype(np.complex128)), normal=True)


def _meaning(built: Built, angle: float, state: State, *, is_inverse: bool) -> State:
    rows = state.rows.copy()
    amplitudes = state.amplitudes.copy()
    target = built.fine.operands - 1
    on = rows[:, :target].min(axis=1) == 1
    if built.kind in ("mcx", "and"):
        rows[on, target] ^= 1
    else:
        both = on & (rows[:, target] == 1)
        sign = -1.0 if is_inverse else 1.0
        turn = -1.0 if built.kind == "mcz" else cmath.exp(1j * sign * angle)
        amplitudes[both] *= turn
    return State(rows, amplitudes)


def _run(built: Built, state: State, draw: np.random.Generator) -> State:
    bits: dict[int, int] = {}
    for op in built.fine.ops:
        if op.condition is not None and not bits[op.condition]:
            continue
        if op.name == "measure":
            state, outcome = _measure(state, op.wires[0], draw)
            if op.bit is not None:
                bits[op.bit] = outcome
        else:
            state = _apply(state, op)
    return _merged(state)


def _measure(state: State, wire: int, draw: np.random.Generator) -> tuple[State, int]:
    state = _merged(state)
    weight = np.abs(state.amplitudes) ** 2
    is_one = state.rows[:, wire] == 1
    chance = float(weight[is_one].sum() / weight.sum())
    outcome = int(draw.random() < chance)
    kept = is_one if outcome else ~is_one
    return State(state.rows[kept], state.amplitudes[kept]), outcome


def _apply(state: State, op: Op) -> State:
    rows, amplitudes = state
    if op.name == "cx":
        rows = rows.copy()
        rows[:, op.wires[1]] ^= rows[:, op.wires[0]] & 1
        return State(rows, amplitudes)
    if op.name == "cz":
        both = (rows[:, op.wires[0]] == 1) & (rows[:, op.wires[1]] == 1)
        return State(rows, np.where(both, -amplitudes, amplitudes))
    if op.name == "level2":
        return _level2(state, op)
    return _one(state, op.wires[0], matrix(op.name, op.params))


def _level2(state: State, op: Op) -> State:
    rows, amplitudes = state
    control, target = op.wires
    on = rows[:, control] == op.level
    if op.action == "p1":
        both = on & (rows[:, target] == 1)
        turn = cmath.exp(1j * op.params[0])
        return State(rows, np.where(both, turn * amplitudes, amplitudes))
    table = np.array([1, 0, 2] if op.action == "x01" else [0, 2, 1], dtype=np.uint8)
    rows = rows.copy()
    rows[on, target] = table[rows[on, target]]
    return State(rows, amplitudes)


def matrix(name: str, params: tuple[float, ...]) -> NDArray[np.complex128]:
    """Return the two-by-two matrix of a one-qubit gate (OpenQASM 3 conventions)."""
    half = math.sqrt(0.5)
    fixed: dict[str, list[list[complex]]] = {
        "id": [[1, 0], [0, 1]],
        "x": [[0, 1], [1, 0]],
        "y": [[0, -1j], [1j, 0]],
        "z": [[1, 0], [0, -1]],
        "h": [[half, half], [half, -half]],
        "s": [[1, 0], [0, 1j]],
        "sdg": [[1, 0], [0, -1j]],
        "t": [[1, 0], [0, cmath.exp(0.25j * math.pi)]],
        "tdg": [[1, 0], [0, cmath.exp(-0.25j * math.pi)]],
        "sx": [[(1 + 1j) / 2, (1 - 1j) / 2], [(1 - 1j) / 2, (1 + 1j) / 2]],
        "sxdg": [[(1 - 1j) / 2, (1 + 1j) / 2], [(1 + 1j) / 2, (1 - 1j) / 2]],
    }
    if name in fixed:
        return np.array(fixed[name], dtype=np.complex128)
    turn = params[0]
    c, s = math.cos(turn / 2), math.sin(turn / 2)
    if name == "p":
        rows: list[list[complex]] = [[1, 0], [0, cmath.exp(1j * turn)]]
    elif name == "rz":
        rows = [[cmath.exp(-0.5j * turn), 0], [0, cmath.exp(0.5j * turn)]]
    elif name == "rx":
        rows = [[c, -1j * s], [-1j * s, c]]
    elif name == "ry":
        rows = [[c, -s], [s, c]]
    else:
        _, phi, lam = params
        rows = [
            [c, -cmath.exp(1j * lam) * s],
            [cmath.exp(1j * phi) * s, cmath.exp(1j * (phi + lam)) * c],
        ]
    return np.array(rows, dtype=np.complex128)


def _one(state: State, wire: int, gate: NDArray[np.complex128]) -> State:
    rows, amplitudes = state
    level = rows[:, wire]
    if gate[0, 1] == 0 and gate[1, 0] == 0:
        factor = np.where(level == 0, gate[0, 0], np.where(level == 1, gate[1, 1], 1.0))
        return State(rows, amplitudes * factor)
    if gate[0, 0] == 0 and gate[1, 1] == 0:
        turned = rows.copy()
        turned[level < 2, wire] ^= 1
        factor = np.where(level == 0, gate[1, 0], np.where(level == 1, gate[0, 1], 1.0))
        return State(turned, amplitudes * factor)
    low = level < 2
    kept = (rows[~low], amplitudes[~low])
    source = level[low].astype(np.int64)
    parts_rows, parts = [kept[0]], [kept[1]]
    for outcome in (0, 1):
        part = rows[low].copy()
        part[:, wire] = outcome
        parts_rows.append(part)
        parts.append(amplitudes[low] * gate[outcome, source])
    state = _merged(State(np.concatenate(parts_rows), np.concatenate(parts)))
    if len(state.rows) > MOST_ROWS:
        raise TooWide
    return state


def _merged(state: State, *, normal: bool = False) -> State:
    """Add up equal rows and drop what cancels."""
    keys, back = np.unique(state.rows, axis=0, return_inverse=True)
    total = np.zeros(len(keys), dtype=np.complex128)
    np.add.at(total, back.ravel(), state.amplitudes)
    if normal:
        total /= np.linalg.norm(total)
    kept = np.abs(total) > 1e-12
    return State(keys[kept], total[kept])


def _compare(expected: State, result: State) -> str:
    wanted, got = _merged(expected), _merged(result)
    norm = np.linalg.norm(got.amplitudes)
    if wanted.rows.shape != got.rows.shape or not np.array_equal(wanted.rows, got.rows):
        return f"{len(got.rows)} basis states come out, others than the call gives"
    ratio = got.amplitudes / norm / wanted.amplitudes
    if np.max(np.abs(ratio - ratio[0])) > TOLERANCE:
        return "the phases between inputs differ from the call's"
    if abs(abs(ratio[0]) - 1.0) > TOLERANCE:
        return "the weights of inputs differ from the call's"
    return ""
