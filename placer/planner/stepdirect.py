"""Bound one recipe at some sites without tables: for steps with many operands.

In: a recipe's costs per site and pair of sites, the sites of the operands placed so
far.  Out: a lower bound of its cost and length; every operand or slot that is not
placed takes its own best site, and gates between two such are taken at their least.
Compiled by numba.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from placer.compiled import inner

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.planner.steptables import Reach

Ints = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Parts:
    """Recipes side by side, padded: R recipes, M pairs, L local wires, P sites.

    `pairs` (R): how many; `ends` (R, M, 2): their local wires; `price`, `moves`
    (R, M, P, P); `floor` (R, M, 2): least price and moves; `width` (R); `alone`
    (R, L, P); `base` (R).
    """

    pairs: Ints
    ends: Ints
    price: Ints
    moves: Ints
    floor: Ints
    width: Ints
    alone: Ints
    base: Ints


def parts_of(rows: Sequence[Reach], sites: int) -> Parts:
    """Return the recipes as padded arrays; at least one row, so that they exist."""
    count = max(1, len(rows))
    most = max((len(row.price) for row in rows), default=1) or 1
    widest = max((len(row.alone) for row in rows), default=1)
    parts = Parts(
        pairs=np.zeros(count, dtype=np.int64),
        ends=np.zeros((count, most, 2), dtype=np.int64),
        price=np.zeros((count, most, sites, sites), dtype=np.int64),
        moves=np.zeros((count, most, sites, sites), dtype=np.int64),
        floor=np.zeros((count, most, 2), dtype=np.int64),
        width=np.zeros(count, dtype=np.int64),
        alone=np.zeros((count, widest, sites), dtype=np.int64),
        base=np.zeros(count, dtype=np.int64),
    )
    apart = ~np.eye(sites, dtype=np.bool_)
    for r, row in enumerate(rows):
        parts.pairs[r] = len(row.price)
        parts.width[r] = len(row.alone)
        parts.base[r] = row.base_ns
        for m, (key, table) in enumerate(sorted(row.price.items())):
            parts.ends[r, m] = key
            parts.price[r, m], parts.moves[r, m] = table, row.moves[key]
            if sites > 1:
                parts.floor[r, m, 0] = table[apart].min()
                parts.floor[r, m, 1] = row.moves[key][apart].min()
        for local, values in enumerate(row.alone):
            parts.alone[r, local] = values
    return parts


@inner
def bound_recipe(  # type: ignore[no-untyped-def]  # noqa: C901, PLR0912
    r, where, pairs, ends, price, moves, floor, width, alone, base, never, endless
):
    """Return least cost and length; `where` gives the site per local wire, or -1."""
    cost, length = 0, base[r]
    for local in range(width[r]):
        if where[local] >= 0:
            cost += alone[r, local, where[local]]
    for m in range(pairs[r]):
        a, b = where[ends[r, m, 0]], where[ends[r, m, 1]]
        if a >= 0 and b >= 0:
            cost += price[r, m, a, b]
            length += moves[r, m, a, b]
        elif a < 0 and b < 0:
            cost += floor[r, m, 0]
            length += floor[r, m, 1]
    sites = alone.shape[2]
    for local in range(width[r]):
        if where[local] >= 0:
            continue
        least, brief = never, endless
        for p in range(sites):
            is_taken = False
            for other in range(width[r]):
                is_taken = is_taken or where[other] == p
            if is_taken:
                continue
            here, far = alone[r, local, p], 0
            for m in range(pairs[r]):
                one, two = ends[r, m, 0], ends[r, m, 1]
                if one == local and where[two] >= 0:
                    here += price[r, m, p, where[two]]
                    far += moves[r, m, p, where[two]]
                elif two == local and where[one] >= 0:
                    here += price[r, m, where[one], p]
                    far += moves[r, m, where[one], p]
            least = min(least, here)
            brief = min(brief, far)
        cost += least
        length += brief
    return min(cost, never), min(length, endless)
