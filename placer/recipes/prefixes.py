"""Products of all prefixes of a row of wires on about lg n clean wires.

In: wires and what to do with each product.  Out: a draft.  Where the product of the
first s wires is 1, those wires are known to be 1 and hold the products of the next
s + 1 wires; only the product at the end of each such block needs a clean wire.
Source: after Khattar and Gidney 2024, arXiv 2407.17966 (conditionally clean wires);
this form, with blocks that double, was derived here.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

from placer.recipes.conditional import reuse
from placer.recipes.constants import bit
from placer.recipes.draft import Draft, both, join
from placer.recipes.toffoli import relative, toffoli

Wires = Sequence[int]
Visit = Callable[[int, tuple[int, ...]], Draft]
"""What to do with the product of the first so many wires: one or two factors."""


def prefix_clean(length: int) -> int:
    """Return the clean wires for a row: one for each block, at 2, 5, 11, 23, ..."""
    count, start = 0, 2
    while start < length:
        count, start = count + 1, 2 * start + 1
    return count


def prefixes(row: Wires, fresh: Wires, visit: Visit) -> Draft:
    """Return every prefix product visited, the longest first; the row is restored.

    A visit may change wires of the row beyond its prefix.
    """
    if len(row) == 1:
        return visit(1, (row[0],))
    if len(row) == 2:
        return visit(2, (row[0], row[1])) + visit(1, (row[0],))
    held = relative(row[0], row[1], fresh[0])
    inner = _block(row, 2, fresh, visit)
    shown = visit(2, (fresh[0],))
    return join((held, inner, shown, held.inverse(), visit(1, (row[0],))))


def _block(row: Wires, start: int, fresh: Wires, visit: Visit) -> Draft:
    """Return the visits beyond `start`, the product up to there being held."""
    held, rest = fresh[0], fresh[1:]
    size = min(start + 1, len(row) - start)
    end = start + size
    inside = [row[start], *row[: size - 1]]
    steps = [
        reuse(inside[at - 1], row[start + at], inside[at]) for at in range(1, size)
    ]
    pieces = list(steps)
    if end < len(row):
        product = relative(held, inside[-1], rest[0])
        shown = visit(end, (rest[0],))
        pieces += [product, _block(row, end, rest, visit), shown, product.inverse()]
    else:
        pieces.append(visit(end, (held, inside[-1])))
    for at in reversed(range(1, size)):
        pieces.append(steps[at - 1].inverse())
        pieces.append(visit(start + at, (held, inside[at - 1])))
    return join(pieces)


def flip(target: int, factors: tuple[int, ...]) -> Draft:
    """Return target ^= product of one or two factors."""
    if len(factors) == 1:
        return both("cx", factors[0], target)
    return toffoli(factors[0], factors[1], target)


def increment(wires: Wires, fresh: Wires) -> Draft:
    """Return v += 1: about 3n Toffolis on about lg n clean wires."""
    first = both("x", wires[0])
    if len(wires) == 1:
        return first
    steps = prefixes(
        wires[:-1], fresh, lambda length, factors: flip(wires[length], factors)
    )
    return steps + first


def compared_length(size: int, constant: int) -> int:
    """Return how many of the highest bits decide v < constant, 0 < constant < 2^n."""
    return size - ((constant & -constant).bit_length() - 1)


def below_constant(
    wires: Wires, constant: int, target: int, fresh: Wires, controls: Wires = ()
) -> Draft:
    """Return target ^= [v < constant], 0 < constant < 2^n, under at most one control.

    v is smaller if it agrees with the constant from the top down to a bit where only
    the constant has a 1.  Agreement down to a bit is a prefix product; those at the
    ends of each run of ones are added up.
    """
    length = compared_length(len(wires), constant)
    size = len(wires)
    top_down = [
        (wires[at], bit(constant, at)) for at in reversed(range(size - length, size))
    ]
    ones = [False, *(one for _, one in top_down), False]
    wanted = {at for at in range(length + 1) if ones[at] != ones[at + 1]}
    shift = len(controls)
    row = [*controls, *(wire for wire, _ in top_down)]

    def visit(count: int, factors: tuple[int, ...]) -> Draft:
        return flip(target, factors) if count - shift in wanted else Draft()

    frame = join(both("x", wire) for wire, one in top_down if not one)
    always = both("x", target) if 0 in wanted and not controls else Draft()
    return join((frame, prefixes(row, fresh, visit), frame, always))
