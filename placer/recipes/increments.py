"""Increments on borrowed wires: many, or one.

In: wires.  Out: drafts.  A number and its complement add up to -1, so that subtracting
both, whatever a borrowed register holds, adds 1.
Sources: Gidney 2015, Constructing large increment gates (web log); Haener, Roetteler
and Svore 2016, arXiv 1611.07995; the short form was derived here.
"""

from __future__ import annotations

from collections.abc import Sequence

from placer.recipes import ripple
from placer.recipes.constants import Chain, product_borrowed
from placer.recipes.draft import Draft, both, join

Wires = Sequence[int]


def _all(name: str, wires: Wires) -> Draft:
    return join(both(name, wire) for wire in wires)


def many_borrowed(wires: Wires, borrowed: Wires) -> Draft:
    """Return v += 1 with n borrowed wires: 4(n-1) Toffolis, 10n-12 CNOT."""
    lent = borrowed[: len(wires)]
    subtract = ripple.no_workspace(lent, wires, None).inverse()
    flip = _all("x", lent)
    return join((subtract, flip, subtract, flip))


def fewer_borrowed(wires: Wires, borrowed: Wires) -> Draft:
    """Return v += 1 with n-1 borrowed wires: 4n-6 Toffolis.

    The top bit of the borrowed number would be subtracted once as it is and once
    complemented; an X on the top wire does the same.
    """
    low, top = wires[:-1], wires[-1]
    if not low:
        return both("x", top)
    lent = borrowed[: len(low)]
    subtract = ripple.no_workspace(lent, low, top).inverse()
    flip = _all("x", lent)
    return join((subtract, flip, subtract, flip, both("x", top)))


def product(factors: Wires, target: int, borrowed: Wires) -> Draft:
    """Return target ^= product of wires with k-2 borrowed."""
    plain = Chain(tuple(factors), (), (False,) * len(factors), last=False)
    return product_borrowed(plain, target, borrowed)


def cascade(wires: Wires, borrowed: Wires) -> Draft:
    """Return v += 1 by one product for each wire, the highest first."""
    size = len(wires)
    pieces = [
        product(wires[:at], wires[at], borrowed) for at in reversed(range(1, size))
    ]
    return join((*pieces, both("x", wires[0])))


def lent(wires: Wires, borrowed: Wires) -> Draft:
    """Return v += 1 with up to n-1 borrowed wires, by the form of fewest Toffolis.

    The cascade takes 0, 0, 1, 5, 13 Toffolis for 1 to 5 wires, the other 4n-6.
    """
    if len(wires) <= 5:
        return cascade(wires, borrowed)
    return fewer_borrowed(wires, borrowed)


def toggled(high: Wires, helper: int, carry: Draft, borrowed: Wires) -> Draft:
    """Return high += carry, where `carry` adds the carry bit to a borrowed helper.

    The helper steps the register twice, the second time with the register
    complemented, so that what it held cancels and the carry stays.
    """
    step = lent([helper, *high], borrowed) + both("x", helper)
    fan = join(both("cx", helper, wire) for wire in high)
    return join((step, fan, carry, step, carry, fan))


def one_borrowed(wires: Wires, helper: int) -> Draft:
    """Return v += 1 with one borrowed wire: two halves that lend to one another."""
    if len(wires) <= 3:
        return cascade(wires, [helper])
    middle = (len(wires) + 1) // 2
    low, high = wires[:middle], wires[middle:]
    carry = product(low, helper, high)
    return join((toggled(high, helper, carry, low), lent(low, [*high, helper])))
