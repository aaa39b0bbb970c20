"""Constants: the carries of v + c as products of literals, on clean or borrowed wires.

In: wires and a constant.  Out: drafts.  Where bit i of c is 0 the next carry is
v[i] AND carry; where it is 1 the next *complement* is (NOT v[i]) AND complement.  So a
carry is one product of v[i] ^ c[i], with a flip wherever two bits of c differ.
Sources: Haener, Roetteler and Svore 2016, arXiv 1611.07995 (borrowed); the form on
clean wires is common practice for c = 1 and was derived here for every c.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from placer.recipes.ands import Cleaner
from placer.recipes.draft import Draft, both, join
from placer.recipes.toffoli import (
    relative,
    shared_top,
    side_in,
    side_out,
    temporary_and,
    toffoli,
    twice,
)

Wires = Sequence[int]


@dataclass(frozen=True, slots=True)
class Chain:
    """A carry as a product: its factors, and where the product so far is flipped.

    `turned` are the wires that enter complemented.  `flips[j]` says that the product of
    the factors before factor j is complemented before factor j joins; `last` that the
    whole product is.
    """

    factors: tuple[int, ...]
    turned: tuple[int, ...]
    flips: tuple[bool, ...]
    last: bool

    def frame(self) -> Draft:
        """Return the X gates that complement the turned wires."""
        return join(both("x", wire) for wire in self.turned)


def bit(value: int, at: int) -> bool:
    """Return one bit of a number."""
    return bool(value >> at & 1)


def trailing_zeros(value: int) -> int:
    """Return how many of the lowest bits of a positive number are 0."""
    return (value & -value).bit_length() - 1


def carry_chain(wires: Wires, constant: int, controls: Wires = ()) -> Chain:
    """Return the carry out of wires + constant, times the controls, as a chain.

    The constant must be odd.
    """
    bits = [bit(constant, at) for at in range(len(wires))]
    turned = [wire for wire, one in zip(wires[1:], bits[1:], strict=True) if one]
    if len(wires) > 1 and bits[1]:
        turned.insert(0, wires[0])
    flips = [False, False] + [bits[at] != bits[at - 1] for at in range(2, len(wires))]
    flips = flips[: len(wires)]
    held = len(wires) > 1 and bits[-1]
    if controls:
        flips += [held] + [False] * (len(controls) - 1)
        held = False
    return Chain((*wires, *controls), tuple(turned), tuple(flips), held)


def _flip(chain: Chain, factor: int, wire: int) -> Draft:
    return both("x", wire) if chain.flips[factor] else Draft()


# ------------------------------------------------------------------ borrowed
def _borrowed_flip(chain: Chain, borrowed: Wires) -> Draft:
    """Return the piece that adds the product without its last factor to the last wire.

    The other borrowed wires are left changed, phases are left behind, and the mirror
    image takes both away.
    """
    factors, last = chain.factors, len(borrowed) - 1
    pieces = [
        side_in(borrowed[at - 1], factors[at + 1], borrowed[at])
        for at in range(last, 0, -1)
    ]
    pieces.append(relative(factors[0], factors[1], borrowed[0]))
    for at in range(1, last + 1):
        pieces.append(_flip(chain, at + 1, borrowed[at - 1]))
        pieces.append(side_out(borrowed[at - 1], factors[at + 1], borrowed[at]))
    pieces.append(_flip(chain, last + 2, borrowed[last]))
    return join(pieces)


def product_borrowed(chain: Chain, target: int, borrowed: Wires) -> Draft:
    """Return target ^= product: 4(k-2) Toffolis for k factors, k-2 borrowed wires."""
    factors = chain.factors
    frame = chain.frame()
    finish = both("x", target) if chain.last else Draft()
    if len(factors) == 1:
        middle = both("cx", factors[0], target)
    elif len(factors) == 2:
        lone = _flip(chain, 1, factors[0])
        middle = join((lone, toffoli(factors[0], factors[1], target), lone))
    else:
        used = borrowed[: len(factors) - 2]
        flip = _borrowed_flip(chain, used)
        top = shared_top(used[-1], factors[-1], target)
        hadamard = Draft((), both("h", target).fine)
        middle = join((hadamard, twice(Draft(), top, flip), hadamard))
    return join((frame, middle, finish, frame))


def borrowed_need(chain: Chain) -> int:
    """Return how many borrowed wires a chain needs."""
    return max(0, len(chain.factors) - 2)


# ------------------------------------------------------------------ clean
def product_clean(chain: Chain, target: int, fresh: Wires, cleaner: Cleaner) -> Draft:
    """Return target ^= product of k factors, on k-2 clean wires, or on k-1.

    With k-2 the last factor joins by an exact Toffoli on the target; with k-1 the whole
    product is held.
    """
    factors, held = chain.factors, chain.factors[0]
    up: list[Draft] = []
    down: list[Draft] = []
    for at, wire in enumerate(fresh, start=1):
        flip = _flip(chain, at, held)
        up += [flip, temporary_and(held, factors[at], wire)]
        down = [cleaner.undo(held, factors[at], wire), flip, *down]
        held = wire
    if len(fresh) < len(factors) - 1:
        flip = _flip(chain, len(factors) - 1, held)
        top = join((flip, toffoli(held, factors[-1], target), flip))
    else:
        top = both("cx", held, target)
    finish = both("x", target) if chain.last else Draft()
    frame = chain.frame()
    return join((frame, *up, top, finish, *down, frame))


def clean_need(size: int, controls: int, *, held: bool) -> int:
    """Return the clean wires of `add_clean`: n-3 without controls, n-2 if held."""
    factors = size - 1 + controls
    return max(0, factors - (1 if held else 2))


def add_clean(
    wires: Wires,
    constant: int,
    fresh: Wires,
    cleaner: Cleaner,
    controls: Wires = (),
) -> Draft:
    """Return v += c for an odd c: 2n-5 Toffolis on n-3 clean wires.

    With n-2 clean wires the top carry is held as well, and all products are ANDs that
    measurement can take back.  The controls join as the lowest factors; more than one
    only for c = 1.
    """
    top, factors = wires[-1], [*controls, *wires[:-1]]
    size, shift = len(wires), len(controls)
    if not factors:
        return both("x", top)

    def flip(at: int, held: int) -> Draft:
        if at < 2 or bit(constant, at) == bit(constant, at - 1):
            return Draft()
        return both("cx", controls[0], held) if controls else both("x", held)

    def turn(at: int) -> Draft:
        turned = bit(constant, max(at, 1)) and size > 1
        return both("x", wires[at]) if turned else Draft()

    held = [factors[0]]
    pieces = [turn(at) for at in range(size - 1)]
    for at in range(1, len(factors)):
        pieces.append(flip(at - shift, held[-1]))
        if at > len(fresh):
            pieces.append(toffoli(held[-1], factors[at], top))
            break
        pieces.append(temporary_and(held[-1], factors[at], fresh[at - 1]))
        held.append(fresh[at - 1])
    if len(held) == len(factors):
        pieces.append(both("cx", held[-1], top))
    pieces.append(flip(size - 1, top))
    for at in reversed(range(1, len(factors))):
        if at < len(held):
            pieces.append(cleaner.undo(held[at - 1], factors[at], held[at]))
        if at >= shift:
            pieces += [turn(at - shift), both("cx", held[at - 1], factors[at])]
        pieces.append(flip(at - shift, held[at - 1]))
    if not controls:
        pieces += [turn(0), both("x", wires[0])]
    return join(pieces)


def load(constant: int, fresh: Wires, controls: Wires = ()) -> Draft:
    """Return the piece that writes a constant, times one control, into clean wires."""
    ones = [wire for at, wire in enumerate(fresh) if bit(constant, at)]
    if controls:
        return join(both("cx", controls[0], wire) for wire in ones)
    return join(both("x", wire) for wire in ones)
