"""Adding a constant with one borrowed wire, by divide and conquer.

In: wires and a constant.  Out: a draft.  The high half takes the carry of the low half
through the borrowed wire, each half lending its wires to the other; then both halves
are added to on their own.
Source: Haener, Roetteler and Svore 2016, arXiv 1611.07995.
"""

from __future__ import annotations

from collections.abc import Sequence

from placer.recipes.constants import (
    borrowed_need,
    carry_chain,
    product_borrowed,
    trailing_zeros,
)
from placer.recipes.draft import Draft, both, join
from placer.recipes.increments import toggled

Wires = Sequence[int]


def add_constant(
    wires: Wires,
    constant: int,
    helper: int,
    controls: Wires = (),
    idle: Wires = (),
) -> Draft:
    """Return v += c, times at most one control: O(n lg n) Toffolis, one borrowed wire.

    `idle` are further wires that may be borrowed.
    """
    constant %= 1 << len(wires)
    if not constant:
        return Draft()
    zeros = trailing_zeros(constant)
    low_zeros, rest = wires[:zeros], wires[zeros:]
    constant >>= zeros
    idle = [*idle, *low_zeros]
    if len(rest) == 1:
        return both("cx", controls[0], rest[0]) if controls else both("x", rest[0])
    # For two wires the carry of the low one is the wire itself.
    middle = (len(rest) + 1) // 2
    low, high = rest[:middle], rest[middle:]
    chain = carry_chain(low, constant % (1 << middle), controls)
    if len(high) == 1:
        spare = [helper, *idle]
        carry = product_borrowed(chain, high[0], spare[: borrowed_need(chain)])
    else:
        spare = [*high, *idle]
        into = product_borrowed(chain, helper, spare[: borrowed_need(chain)])
        carry = toggled(high, helper, into, [*low, *idle])
    return join(
        (
            carry,
            add_constant(low, constant, helper, controls, [*idle, *high]),
            add_constant(high, constant >> middle, helper, controls, [*idle, *low]),
        )
    )
