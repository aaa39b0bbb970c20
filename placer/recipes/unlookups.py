"""Taking a looked-up word away by measurement; a smaller look-up fixes the phase.

In: wires and a table.  Out: a draft.  Measuring the word in the X basis leaves the
phase (-1)^(m.f(x)).  The low address bits are spread over k wires, one of them 1; unary
iteration over the high ones meets them with cz gates, each behind its outcome.
Source: Berry, Gidney, Motta, McClean and Babbush 2019, arXiv 1902.02134.
"""

from __future__ import annotations

from collections.abc import Sequence

from placer.recipes.ands import Cleaner
from placer.recipes.circuit import Op
from placer.recipes.constants import bit
from placer.recipes.draft import Draft, both, join
from placer.recipes.lookups import blocks, unary, unary_need
from placer.recipes.toffoli import temporary_and

Wires = Sequence[int]


def need(entries: int, block: int, *, controlled: bool) -> int:
    """Return the clean wires: one for each low address, and those of the iteration."""
    count = -(-entries // block)
    return unary_need(count, controlled=controlled) + (block if block > 1 else 0)


def one_hot(low: Wires, spread: Wires, cleaner: Cleaner) -> tuple[Draft, Draft]:
    """Return the piece that makes wire number `low` the only 1, and its way back.

    k - 2 ANDs for k wires, k a power of two, at least 2.
    """
    start = both("x", spread[0])
    first = both("cx", low[0], spread[1]) + both("cx", low[0], spread[0])
    up, down = [start + first], [first.inverse() + start]
    for level in range(1, len(low)):
        half = 1 << level
        for at in range(half):
            lower, upper = spread[at], spread[at + half]
            up.append(
                temporary_and(lower, low[level], upper) + both("cx", upper, lower)
            )
            undo = cleaner.undo(lower, low[level], upper)
            down.append(both("cx", upper, lower) + undo)
    return join(up), join(reversed(down))


def read_out(output: Wires) -> Draft:
    """Return the X-basis measurement of a word into bits 0, 1, ...; it ends in |0>."""
    ops: list[Op] = []
    for at, wire in enumerate(output):
        ops += [Op("h", (wire,)), Op("measure", (wire,), bit=at)]
        ops.append(Op("x", (wire,), condition=at))
    return Draft(tuple(ops), tuple(ops))


def _fix(word: int, width: int, *wires: int) -> Draft:
    """Return the sign of a chosen word: z or cz behind the outcome of each bit."""
    name = "cz" if len(wires) == 2 else "z"
    ops = tuple(Op(name, wires, condition=at) for at in range(width) if bit(word, at))
    return Draft(ops, ops)


def take_away(
    address: Wires,
    output: Wires,
    table: Sequence[int],
    block: int,
    fresh: Wires,
    cleaner: Cleaner,
    control: int | None = None,
) -> Draft:
    """Return output = 0 from output = table[address]: L/k + k - 4 ANDs, any width.

    The bits of the read-out come first; the cleaner must leave them out.
    """
    split, width = (block - 1).bit_length(), len(output)
    rows = blocks(table, block)
    spread = fresh[: block if block > 1 else 0]
    into, back = Draft(), Draft()
    if spread:
        into, back = one_hot(address[:split], spread, cleaner)

    def leaf(entry: int, chosen: int | None) -> Draft:
        if chosen is None:
            return Draft()  # a single word: its sign is a global phase
        if not spread:
            return _fix(rows[entry][0], width, chosen)
        pairs = zip(rows[entry], spread, strict=True)
        return join(_fix(word, width, chosen, wire) for word, wire in pairs)

    walk = unary(
        address[split:], len(rows), leaf, fresh[len(spread) :], cleaner, control
    )
    return join((read_out(output), into, walk, back))
