"""Multiplication as a sum of controlled additions.

In: wires.  Out: drafts.  Bit i of B adds A to the target from bit i upwards; where A is
too short for that, clean wires stand for its high zeros.
Source: common practice (schoolbook); the controlled additions cite their own.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

from placer.recipes.ands import Cleaner
from placer.recipes.draft import Draft, join
from placer.recipes.toffoli import temporary_and

Wires = Sequence[int]
AddIf = Callable[[int, Wires, Wires], Draft]
"""Return target += control * A, modulo the width of the target."""


def padding(widths: tuple[int, int, int]) -> int:
    """Return how many clean wires stand for zeros above A."""
    return max(0, widths[2] - widths[0])


def multiply_add(
    first: Wires,
    second: Wires,
    target: Wires,
    zeros: Wires,
    add_if: AddIf,
) -> Draft:
    """Return T += A B modulo 2^w, one controlled addition for each bit of B."""
    row = [*first, *zeros]
    return join(
        add_if(wire, row[: len(target) - at], target[at:])
        for at, wire in enumerate(second[: len(target)])
    )


def under(control: int | None, helper: int, add_if: AddIf, cleaner: Cleaner) -> AddIf:
    """Return a controlled addition under one control more, held in a clean helper."""
    if control is None:
        return add_if

    def twice(wire: int, a: Wires, b: Wires) -> Draft:
        return join(
            (
                temporary_and(control, wire, helper),
                add_if(helper, a, b),
                cleaner.undo(control, wire, helper),
            )
        )

    return twice
