"""Look-ups: a table of constants added bit by bit to a register.

In: wires and a table.  Out: drafts.  Unary iteration walks through the addresses and
holds one AND a level; select-swap looks up k words at once and swaps the wanted one to
the front.
Sources: Babbush et al. 2018, arXiv 1805.03662; Low, Kliuchnikov and Schaeffer 2018,
arXiv 1812.00954; Berry et al. 2019, arXiv 1902.02134.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

from placer.recipes.ands import Cleaner
from placer.recipes.constants import bit
from placer.recipes.draft import Draft, both, join
from placer.recipes.toffoli import relative, temporary_and

Wires = Sequence[int]
Leaf = Callable[[int, int | None], Draft]
"""What to do for an entry under a wire that is 1 when it is chosen (`None`: always)."""


def unary_need(entries: int, *, controlled: bool) -> int:
    """Return the clean wires of unary iteration: ceil(lg L), one less uncontrolled."""
    depth = (entries - 1).bit_length()
    return depth if controlled else max(0, depth - 1)


def unary(
    address: Wires,
    entries: int,
    leaf: Leaf,
    fresh: Wires,
    cleaner: Cleaner,
    control: int | None = None,
) -> Draft:
    """Return `leaf` done for the addressed entry: L-1 ANDs, L-2 without control.

    The address is promised to be below the number of entries: a half of the range that
    is empty needs no AND.
    """
    if entries == 1:
        return leaf(0, control)
    level = (entries - 1).bit_length() - 1
    wire, half = address[level], 1 << level
    if control is not None:
        return _walk(address, (0, entries), leaf, fresh, cleaner, control)
    turn = both("x", wire)
    left = _walk(address, (0, half), leaf, fresh, cleaner, wire)
    right = _walk(address, (half, entries), leaf, fresh, cleaner, wire)
    return join((turn, left, turn, right))


def _walk(
    address: Wires,
    span: tuple[int, int],
    leaf: Leaf,
    fresh: Wires,
    cleaner: Cleaner,
    control: int,
) -> Draft:
    """Return `leaf` done for the entries of a span, under a control."""
    first, end = span
    if end - first == 1:
        return leaf(first, control)
    level = (end - first - 1).bit_length() - 1
    wire, middle = address[level], first + (1 << level)
    held, rest, turn = fresh[0], fresh[1:], both("x", wire)
    left = _walk(address, (first, middle), leaf, rest, cleaner, held)
    right = _walk(address, (middle, end), leaf, rest, cleaner, held)
    return join(
        (
            turn,
            temporary_and(control, wire, held),
            turn,
            left,
            both("cx", control, held),
            right,
            cleaner.undo(control, wire, held),
        )
    )


def write(word: int, wires: Wires, control: int | None) -> Draft:
    """Return wires ^= word, if the control is 1."""
    ones = [wire for at, wire in enumerate(wires) if bit(word, at)]
    if control is None:
        return join(both("x", wire) for wire in ones)
    return join(both("cx", control, wire) for wire in ones)


def table_leaf(table: Sequence[int], output: Wires) -> Leaf:
    """Return the leaf that adds an entry of a table to the output."""
    return lambda entry, control: write(table[entry], output, control)


# ------------------------------------------------------------------ select and swap
def blocks(table: Sequence[int], size: int) -> list[tuple[int, ...]]:
    """Return the table in blocks of so many words, filled up with zeros."""
    filled = [*table, *[0] * (-len(table) % size)]
    return [tuple(filled[at : at + size]) for at in range(0, len(filled), size)]


def swap_to_front(low: Wires, words: Sequence[Wires]) -> Draft:
    """Return the swaps that bring word `low` to the front: b(k-1) Toffolis.

    The Toffolis are relative-phase; the mirror image must follow, with nothing between
    but gates that only read the words.
    """
    pieces: list[Draft] = []
    for level in reversed(range(len(low))):
        half = 1 << level
        for at in range(half):
            pairs = zip(words[at], words[at + half], strict=True)
            for front, back in pairs:
                turn = both("cx", back, front)
                pieces += [turn, relative(low[level], front, back), turn]
    return join(pieces)


def block_leaf(table: Sequence[int], words: Sequence[Wires]) -> Leaf:
    """Return the leaf that adds a whole block of a table to so many words."""
    rows = blocks(table, len(words))

    def leaf(entry: int, control: int | None) -> Draft:
        return join(
            write(word, wires, control)
            for word, wires in zip(rows[entry], words, strict=True)
        )

    return leaf


def _copy(source: Wires, target: Wires) -> Draft:
    return join(
        both("cx", front, back) for front, back in zip(source, target, strict=True)
    )


def select_swap_compute(
    address: Wires,
    table: Sequence[int],
    words: Sequence[Wires],
    fresh: Wires,
    cleaner: Cleaner,
    control: int | None = None,
) -> Draft:
    """Return the addressed word on the first of k clean words, the others dirty.

    L/k - 2 ANDs and b(k-1) Toffolis where k divides L, without a control.
    """
    split = (len(words) - 1).bit_length()
    count = len(blocks(table, len(words)))
    leaf = block_leaf(table, words)
    chosen = unary(address[split:], count, leaf, fresh, cleaner, control)
    return chosen + swap_to_front(address[:split], words)


def select_swap_clean(
    address: Wires,
    output: Wires,
    table: Sequence[int],
    words: Sequence[Wires],
    fresh: Wires,
    cleaner: Cleaner,
    control: int | None = None,
) -> Draft:
    """Return output ^= table[address] through k clean words, cleaned again."""
    compute = select_swap_compute(address, table, words, fresh, cleaner, control)
    swaps = swap_to_front(address[: (len(words) - 1).bit_length()], words)
    leaf = block_leaf(table, words)
    count = len(blocks(table, len(words)))
    high = address[(len(words) - 1).bit_length() :]
    undo = unary(high, count, leaf, fresh, cleaner, control)
    return join((compute, _copy(words[0], output), swaps.inverse(), undo))


def select_swap_borrowed(
    address: Wires,
    output: Wires,
    table: Sequence[int],
    words: Sequence[Wires],
    fresh: Wires,
    cleaner: Cleaner,
    control: int | None = None,
) -> Draft:
    """Return output ^= table[address] through k borrowed words: 2 L/k + 4b(k-1).

    The words are swapped, copied, swapped back, added to, and all of it again, so that
    what they held is added to the output twice.
    """
    split = (len(words) - 1).bit_length()
    swaps = swap_to_front(address[:split], words)
    show = join((swaps, _copy(words[0], output), swaps.inverse()))
    leaf = block_leaf(table, words)
    count = len(blocks(table, len(words)))
    pieces: list[Draft] = []
    for _ in range(2):
        pieces += [show, unary(address[split:], count, leaf, fresh, cleaner, control)]
    return join(pieces)
