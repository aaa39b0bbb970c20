"""Run one circuit on superposed inputs: levels per wire beside amplitudes.

A state is a table of basis states (one level 0, 1 or 2 per wire) with amplitudes;
equal basis states are merged after each branching gate.  Basis states are told apart
by a random weight per wire, summed modulo 2^64.  Relative phases count.
"""

from __future__ import annotations

import cmath
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from placer.check.plain import one_qubit

if TYPE_CHECKING:
    from collections.abc import Callable

    from numpy.typing import NDArray

    from placer.recipes.circuit import Circuit, Op

    Levels = NDArray[np.uint8]
    Amplitudes = NDArray[np.complex128]

TINY = 1e-9


class TooWide(Exception):  # noqa: N818 - a limit of this method, not a mistake
    """The state branches into more basis states than are followed."""


class Misuse(Exception):  # noqa: N818 - what the circuit does is wrong, not the code
    """A gate meets a level that it is not meant for."""


@dataclass(slots=True)
class State:
    """`levels[w, i]` is the level of wire w in basis state i."""

    levels: Levels
    amplitudes: Amplitudes
    weights: NDArray[np.uint64]
    most: int

    @property
    def keys(self) -> NDArray[np.uint64]:
        """Return a number for each basis state that tells it apart."""
        parts: NDArray[np.uint64] = self.levels * self.weights[:, None]
        return np.asarray(parts.sum(axis=0), dtype=np.uint64)

    def copy(self) -> State:
        """Return a state that changes on its own."""
        return State(
            self.levels.copy(), self.amplitudes.copy(), self.weights, self.most
        )


def start(
    levels: Levels, amplitudes: Amplitudes, draw: np.random.Generator, most: int
) -> State:
    """Return a state; at most `most` basis states are followed later."""
    weights = draw.integers(1, 2**63, len(levels), dtype=np.uint64)
    return State(levels, amplitudes, weights, most)


def run(
    circuit: Circuit, state: State, choose: Callable[[], int]
) -> tuple[State, set[int]]:
    """Return the state after a circuit, and the wires that were in level 2.

    `choose` says which outcome a measurement gives where both can come.

    Raises
    ------
    TooWide
        If there are more basis states than the state allows.
    Misuse
        If a wire is in level 2 outside of its window, or a gate acts on it there.
    """
    bits: dict[int, int] = {}
    window: set[int] = set()
    used: set[int] = set()
    state = state.copy()
    for op in circuit.ops:
        if op.condition is not None and not bits.get(op.condition, 0):
            continue
        window |= set(op.enters)
        if op.name == "measure":
            outcome = _measure(state, op.wires[0], choose())
            if op.bit is not None:
                bits[op.bit] = outcome
        elif op.name == "level2":
            _level2(state, op)
        else:
            _apply(state, op)
        window -= set(op.leaves)
        used |= set(op.enters)
        if op.name == "level2":
            _stay_inside(state, op, window)
    return state, used


def _stay_inside(state: State, op: Op, window: set[int]) -> None:
    for wire in op.wires:
        if wire not in window and (state.levels[wire] == 2).any():
            raise Misuse(f"wire {wire} is in level 2 outside of its stay there")


def _measure(state: State, wire: int, wanted: int) -> int:
    """Keep the part with the wanted outcome, or the other if there is no such part."""
    level = _two_levels(state, wire)
    weight = np.abs(state.amplitudes[level == wanted])
    outcome = wanted if (weight > TINY).any() else 1 - wanted
    kept = level == outcome
    state.levels = state.levels[:, kept]
    state.amplitudes = state.amplitudes[kept]
    return outcome


def _two_levels(state: State, wire: int) -> Levels:
    level: Levels = state.levels[wire]
    if level.max(initial=0) > 1:
        raise Misuse(f"a gate of two levels meets wire {wire} in level 2")
    return level


def _level2(state: State, op: Op) -> None:
    control, target = op.wires
    on = state.levels[control] == op.level
    if op.action == "p1":
        both = on & (state.levels[target] == 1)
        state.amplitudes[both] *= cmath.exp(1j * op.params[0])
        return
    table = np.array([1, 0, 2] if op.action == "x01" else [0, 2, 1], dtype=np.uint8)
    state.levels[target, on] = table[state.levels[target, on]]


def _all_on(state: State, wires: tuple[int, ...]) -> NDArray[np.bool_]:
    on = np.ones(len(state.amplitudes), dtype=np.bool_)
    for wire in wires:
        on &= _two_levels(state, wire) == 1
    return on


PHASES = ("cz", "mcz", "cp", "mcp")
TOGGLES = ("x", "cx", "ccx", "mcx")


def _apply(state: State, op: Op) -> None:
    if op.name in TOGGLES:
        on = _all_on(state, op.wires[:-1])
        _two_levels(state, op.wires[-1])
        state.levels[op.wires[-1]] ^= on
    elif op.name in PHASES:
        turn = cmath.exp(1j * op.params[0]) if op.params else -1.0
        state.amplitudes[_all_on(state, op.wires)] *= turn
    elif op.name == "swap":
        state.levels[list(op.wires)] = state.levels[list(op.wires[::-1])]
    elif op.name != "barrier":
        _one(state, op.wires[0], one_qubit(op.name, op.params))


def _one(state: State, wire: int, gate: list[list[complex]]) -> None:
    level = _two_levels(state, wire)
    if gate[0][1] == 0 and gate[1][0] == 0:
        state.amplitudes *= np.where(level == 0, gate[0][0], gate[1][1])
        return
    _, first, group = np.unique(
        state.keys - level * state.weights[wire], return_index=True, return_inverse=True
    )
    parts = np.zeros((2, len(first)), dtype=np.complex128)
    np.add.at(parts, (level, group), state.amplitudes)
    after = np.array(gate, dtype=np.complex128) @ parts
    levels = np.concatenate([state.levels[:, first]] * 2, axis=1)
    levels[wire] = np.repeat(np.array([0, 1], dtype=np.uint8), len(first))
    amplitudes = after.ravel()
    kept = np.abs(amplitudes) > TINY
    state.levels, state.amplitudes = levels[:, kept], amplitudes[kept]
    if len(state.amplitudes) > state.most:
        raise TooWide


def difference(expected: State, found: State) -> str:
    """Say how two states differ beyond a global phase and norm; empty if not."""
    kept = np.abs(found.amplitudes) > TINY
    one, two = np.argsort(expected.keys), np.argsort(found.keys[kept])
    if not np.array_equal(expected.keys[one], found.keys[kept][two]):
        return f"{kept.sum()} basis states come out, others than the call gives"
    amplitudes = found.amplitudes[kept][two] / np.linalg.norm(found.amplitudes)
    wanted = expected.amplitudes[one] / np.linalg.norm(expected.amplitudes)
    ratio = amplitudes / wanted
    if np.max(np.abs(ratio - ratio[0])) > 1e-6:
        return "phases or weights between inputs differ from the call's"
    return ""
