"""Carry look-ahead addition in logarithmic depth, in place and out of place.

In: wires.  Out: drafts.  P[t][m] says that block m of 2^t bits propagates a carry; the
wires Z come to hold the carries.
Source: Draper, Kutin, Rains and Svore 2004, quant-ph/0406142.
"""

from __future__ import annotations

from collections.abc import Sequence

from placer.recipes.ands import Cleaner
from placer.recipes.draft import Draft, both, join
from placer.recipes.toffoli import relative, temporary_and, toffoli

Wires = Sequence[int]


def propagate_count(size: int) -> int:
    """Return how many clean wires the propagation of blocks takes: n - w(n) - lg n."""
    return sum((size >> level) - 1 for level in range(1, size.bit_length() - 1))


def out_of_place_clean(size: int) -> int:
    """Return the clean wires of the out-of-place adder."""
    return propagate_count(size)


def in_place_clean(size: int, *, carry: bool) -> int:
    """Return the clean wires of the in-place adder: the carries and the propagation."""
    return size - 1 + propagate_count(size if carry else size - 1)


def carry_block(
    generate: Wires,
    propagate: Wires,
    fresh: Wires,
    cleaner: Cleaner,
    *,
    backward: bool = False,
) -> Draft:
    """Return the piece that turns generate bits into carries, or carries into those.

    `generate[j]` holds A[j] B[j] and comes to hold the carry into bit j + 1;
    `propagate[j]` holds A[j] ^ B[j].
    """
    size = len(generate)
    rows: list[dict[int, int]] = [dict(enumerate(propagate))]
    spare = list(fresh)
    up: list[Draft] = []
    down: list[Draft] = []
    for level in range(1, size.bit_length() - 1):
        below, row = rows[-1], dict[int, int]()
        for block in range(1, size >> level):
            row[block] = spare.pop(0)
            factors = below[2 * block], below[2 * block + 1]
            up.append(temporary_and(*factors, row[block]))
            down.append(cleaner.undo(*factors, row[block]))
        rows.append(row)
    middle = join(_carries(generate, rows))
    return join((*up, middle.inverse() if backward else middle, *reversed(down)))


def _carries(generate: Wires, rows: list[dict[int, int]]) -> list[Draft]:
    """Return the Toffolis that join carries of blocks, growing and then filling."""
    size = len(generate)
    pieces: list[Draft] = []
    for level in range(1, size.bit_length()):
        half = 1 << (level - 1)
        for block in range(size >> level):
            low = block << level
            source, target = generate[low + half - 1], generate[low + 2 * half - 1]
            pieces.append(toffoli(source, rows[level - 1][2 * block + 1], target))
    for level in reversed(range(1, (2 * size // 3).bit_length())):
        half = 1 << (level - 1)
        for block in range(1, ((size - half) >> level) + 1):
            low = block << level
            source, target = generate[low - 1], generate[low + half - 1]
            pieces.append(toffoli(source, rows[level - 1][2 * block], target))
    return pieces


def out_of_place(
    a: Wires, b: Wires, total: Wires, fresh: Wires, cleaner: Cleaner
) -> Draft:
    """Return S = A + B into clean wires, one more than A has if a carry is wanted."""
    size = len(a)
    count = len(total) - 1
    pieces = [temporary_and(a[at], b[at], total[at + 1]) for at in range(count)]
    pieces += [both("cx", a[at], b[at]) for at in range(1, size)]
    pieces.append(carry_block(total[1:], b[:count], fresh, cleaner))
    pieces += [both("cx", b[at], total[at]) for at in range(size)]
    pieces.append(both("cx", a[0], total[0]))
    pieces += [both("cx", a[at], b[at]) for at in range(1, size)]
    return join(pieces)


def in_place(
    a: Wires, b: Wires, out: int | None, fresh: Wires, cleaner: Cleaner
) -> Draft:
    """Return B += A in logarithmic depth.

    The carries are computed into n-1 clean wires (and the carry wire), added to B, and
    taken back by the carries of the complement of the sum, which are the same.  A carry
    wire that holds something unknown takes the carry by an exact Toffoli.
    """
    size = len(a)
    carries = list(fresh[: size - 1])
    spare = fresh[size - 1 :]
    tops = [] if out is None else [out]
    row = [*carries, *tops]
    pieces = [temporary_and(a[at], b[at], carries[at]) for at in range(size - 1)]
    pieces += [toffoli(a[-1], b[-1], top) for top in tops]
    pieces += [both("cx", a[at], b[at]) for at in range(size)]
    pieces.append(carry_block(row, b[: len(row)], spare, cleaner))
    pieces += [both("cx", carries[at - 1], b[at]) for at in range(1, size)]
    pieces += [both("x", b[at]) for at in range(size - 1)]
    turn = [both("cx", a[at], b[at]) for at in range(1, size - 1)]
    pieces += turn
    low = b[: size - 1]
    pieces.append(carry_block(carries, low, spare, cleaner, backward=True))
    pieces += turn
    pieces += [cleaner.undo(a[at], b[at], carries[at]) for at in range(size - 1)]
    pieces += [both("x", b[at]) for at in range(size - 1)]
    return join(pieces)


# ------------------------------------------------------------------ comparison
def top_carry_clean(size: int) -> int:
    """Return the clean wires of `top_carry`: n generate bits, n-1 propagate bits less.

    The block of the lowest bits never needs to know whether it propagates.
    """
    blocks, count = size, size
    while blocks > 1:
        count += blocks // 2 - 1 if blocks % 2 == 0 else blocks // 2
        blocks = (blocks + 1) // 2
    return count


def top_carry(
    a: Wires, b: Wires, out: int, fresh: Wires, control: int | None = None
) -> Draft:
    """Return out ^= carry of A + B in depth O(lg n), all else restored.

    Neighbouring blocks are joined pairwise; a block carries if its high half does, or
    if that propagates what the low half carries.
    """
    size = len(a)
    spare = list(fresh)
    generate = [spare.pop(0) for _ in range(size)]
    pieces = [relative(a[at], b[at], generate[at]) for at in range(size)]
    pieces += [both("cx", a[at], b[at]) for at in range(1, size)]
    row = [(generate[at], b[at]) for at in range(size)]
    while len(row) > 1:
        above: list[tuple[int, int]] = []
        odd = len(row) % 2
        # With an odd number of blocks the lowest stays alone.
        above += row[:odd]
        for at in range(odd, len(row), 2):
            (low, passes_low), (high, passes_high) = row[at], row[at + 1]
            passes = passes_low
            if at:
                passes = spare.pop(0)
                pieces.append(relative(passes_low, passes_high, passes))
            pieces.append(relative(low, passes_high, high))
            above.append((high, passes))
        row = above
    up, carry = join(pieces), row[0][0]
    middle = both("cx", carry, out)
    if control is not None:
        middle = toffoli(control, carry, out)
    return join((up, middle, up.inverse()))
