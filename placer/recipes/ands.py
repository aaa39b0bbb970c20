"""Addition by temporary ANDs: n-1 clean wires, cleaned by measurement or by mirror.

In: wires.  Out: drafts.  Each carry is an AND in a wire of its own; taking it back by
an X-basis measurement costs no T gate.
Sources: Gidney 2018, arXiv 1709.06648; Jones 2013, arXiv 1212.5069.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from placer.recipes.draft import Draft, both, join
from placer.recipes.toffoli import measured_cleanup, temporary_and

Wires = Sequence[int]


@dataclass(slots=True)
class Cleaner:
    """Take products out of their wires, by measurement or by mirror; count the bits."""

    measured: bool
    bits: int = 0

    def skip(self, bits: int) -> None:
        """Leave so many bits to another part of the circuit."""
        self.bits += bits

    def undo(self, first: int, second: int, target: int) -> Draft:
        """Return the piece that takes the product of two factors out of its wire."""
        if not self.measured:
            return temporary_and(first, second, target).inverse()
        self.bits += 1
        return measured_cleanup(first, second, target, self.bits - 1)


def _up(a: Wires, b: Wires, carries: Wires) -> list[Draft]:
    """Return the way up; carry i+1 goes to wire i, A[i] and B[i] come to hold ^ carry.

    As many carries are computed as there are wires for them.
    """
    pieces: list[Draft] = []
    for at, wire in enumerate(carries):
        if at:
            below = carries[at - 1]
            pieces += [both("cx", below, a[at]), both("cx", below, b[at])]
        pieces.append(temporary_and(a[at], b[at], wire))
        if at:
            pieces.append(both("cx", carries[at - 1], wire))
    return pieces


def _take(a: Wires, b: Wires, carries: Wires, at: int, cleaner: Cleaner) -> Draft:
    """Return the piece that takes carry at+1 out of its wire."""
    undo = cleaner.undo(a[at], b[at], carries[at])
    return both("cx", carries[at - 1], carries[at]) + undo if at else undo


def add(a: Wires, b: Wires, out: int | None, fresh: Wires, cleaner: Cleaner) -> Draft:
    """Return B += A: n-1 ANDs without carry, n with carry, each in a clean wire."""
    size = len(a)
    carries = fresh[: size if out is not None else size - 1]
    pieces = _up(a, b, carries)
    if out is not None:
        pieces.append(both("cx", carries[-1], out))
    elif carries:
        pieces.append(both("cx", carries[-1], b[-1]))
    if out is None:
        pieces.append(both("cx", a[-1], b[-1]))
    for at in reversed(range(len(carries))):
        pieces.append(_take(a, b, carries, at, cleaner))
        if at:
            pieces.append(both("cx", carries[at - 1], a[at]))
        pieces.append(both("cx", a[at], b[at]))
    return join(pieces)


def add_if(
    control: int,
    a: Wires,
    b: Wires,
    out: int | None,
    fresh: Wires,
    cleaner: Cleaner,
) -> Draft:
    """Return B += control * A: 2n-1 ANDs (2n+1 with carry), one clean wire more.

    The last of the clean wires holds control * (A[i] ^ carry) while it is added to B.
    """
    size = len(a)
    carries, helper = fresh[: size if out is not None else size - 1], fresh[-1]

    def write(first: int, target: int) -> Draft:
        return join(
            (
                temporary_and(control, first, helper),
                both("cx", helper, target),
                cleaner.undo(control, first, helper),
            )
        )

    pieces = _up(a, b, carries)
    if out is not None:
        pieces.append(write(carries[-1], out))
    else:
        turn = both("cx", carries[-1], a[-1]) if carries else Draft()
        pieces += [turn, write(a[-1], b[-1]), turn]
    for at in reversed(range(len(carries))):
        pieces.append(_take(a, b, carries, at, cleaner))
        if at:
            pieces.append(both("cx", carries[at - 1], b[at]))
        pieces.append(write(a[at], b[at]))
        if at:
            pieces.append(both("cx", carries[at - 1], a[at]))
    return join(pieces)


def total(a: Wires, b: Wires, sums: Wires) -> Draft:
    """Return S = A + B into clean wires; the carries are made where the sums will be.

    One AND a carry and no workspace.
    """
    carries = sums[1:]
    pieces = _up(a, b, carries)
    for at in reversed(range(1, len(carries))):
        pieces += [
            both("cx", carries[at - 1], a[at]),
            both("cx", carries[at - 1], b[at]),
        ]
    for at in range(len(a)):
        pieces += [both("cx", a[at], sums[at]), both("cx", b[at], sums[at])]
    return join(pieces)


def take_total(a: Wires, b: Wires, sums: Wires, cleaner: Cleaner) -> Draft:
    """Return S = 0 from S = A + B."""
    carries = sums[1:]
    pieces: list[Draft] = []
    for at in range(len(a)):
        pieces += [both("cx", a[at], sums[at]), both("cx", b[at], sums[at])]
    for at in reversed(range(len(carries))):
        turn = Draft()
        if at:
            below = carries[at - 1]
            turn = both("cx", below, a[at]) + both("cx", below, b[at])
        pieces += [turn, _take(a, b, carries, at, cleaner), turn]
    return join(pieces)


def carry_out(
    a: Wires,
    b: Wires,
    out: int,
    fresh: Wires,
    cleaner: Cleaner,
    control: int | None = None,
) -> Draft:
    """Return out ^= carry of A + B: n ANDs in n clean wires, one more if controlled."""
    carries = fresh[: len(a)]
    pieces = _up(a, b, carries)
    if control is None:
        pieces.append(both("cx", carries[-1], out))
    else:
        pieces += [
            temporary_and(control, carries[-1], fresh[-1]),
            both("cx", fresh[-1], out),
            cleaner.undo(control, carries[-1], fresh[-1]),
        ]
    for at in reversed(range(len(carries))):
        pieces.append(_take(a, b, carries, at, cleaner))
        if at:
            below = carries[at - 1]
            pieces += [both("cx", below, a[at]), both("cx", below, b[at])]
    return join(pieces)
