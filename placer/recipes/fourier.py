"""Addition in the Fourier basis: no workspace, no Toffoli, many small phases.

In: wires.  Out: drafts.  The target is transformed, every bit of the summand turns the
phases of the target wires, and the transform is undone.
Sources: Draper 2000, quant-ph/0008033; Beauregard 2003, quant-ph/0205095 (constants).
"""

from __future__ import annotations

import math
from collections.abc import Sequence

from placer.recipes.circuit import Op
from placer.recipes.draft import Draft, both, join, phase
from placer.recipes.toffoli import controlled_phase, three_wire_phase

Wires = Sequence[int]


def controlled_turn(angle: float, control: int, target: int) -> Draft:
    """Return a controlled phase: cz where it is one, else 2 CNOT."""
    if abs(angle) == math.pi:
        return both("cz", control, target)
    coarse = (Op("cp", (control, target), (angle,)),)
    return Draft(coarse, controlled_phase(angle, control, target))


def _turn(angle: float, controls: Wires, target: int) -> Draft:
    if not controls:
        ops = phase(angle, target)
        return Draft(ops, ops)
    if len(controls) == 1:
        return controlled_turn(angle, controls[0], target)
    wires = (controls[0], controls[1], target)
    coarse = (Op("mcp", wires, (angle,)),)
    return Draft(coarse, three_wire_phase(angle, *wires))


def transform(wires: Wires) -> Draft:
    """Return the Fourier transform without the final swaps.

    Wire i comes to hold the phase of the number over 2^(i+1).
    """
    pieces: list[Draft] = []
    for top in reversed(range(len(wires))):
        pieces.append(both("h", wires[top]))
        pieces += [
            controlled_turn(math.pi / (1 << (top - at)), wires[at], wires[top])
            for at in reversed(range(top))
        ]
    return join(pieces)


def add(a: Wires, target: Wires, control: int | None = None) -> Draft:
    """Return target += A, times the control if there is one: (3n^2-n)/2 phases."""
    controls = [] if control is None else [control]
    frame = transform(target)
    pieces = [
        _turn(math.pi / (1 << (top - at)), [*controls, a[at]], target[top])
        for top in reversed(range(len(target)))
        for at in reversed(range(min(top + 1, len(a))))
    ]
    return join((frame, *pieces, frame.inverse()))


def add_constant(value: int, target: Wires, controls: Wires = ()) -> Draft:
    """Return target += value, under at most two controls, by n phases."""
    frame = transform(target)
    pieces: list[Draft] = []
    for top, wire in enumerate(target):
        size = 1 << (top + 1)
        part = value % size
        if part:
            # The shorter way round: an angle in (-pi, pi].
            part = part - size if 2 * part > size else part
            pieces.append(_turn(2 * math.pi * part / size, controls, wire))
    return join((frame, *pieces, frame.inverse()))


def multiply_add(first: Wires, second: Wires, target: Wires) -> Draft:
    """Return target += first * second: a three-wire phase for every pair of bits."""
    frame = transform(target)
    pieces = [
        _turn(math.pi / (1 << (top - at - to)), [first[at], second[to]], target[top])
        for top in range(len(target))
        for at in range(min(top + 1, len(first)))
        for to in range(min(top + 1 - at, len(second)))
    ]
    return join((frame, *pieces, frame.inverse()))
