"""Least cost and length of a step for every place of its operands, as arrays.

In: an instance and the sites that are open.  Out: per recipe two arrays over the sites
of the operands: the least gate cost and the least duration over all places of the
slots.  Both are lower bounds: slots are placed apart for each, and in large tables
each slot for itself.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.planner.placement import Instance
    from placer.planner.profile import Profile

Ints = NDArray[np.int64]

NEVER = 1 << 50
"""A cost no plan has: sums of a few of them stay below 2^63."""
ENDLESS = 1 << 30
"""A duration no step has, in ns; times a rate it stays below 2^63."""
LARGEST = 8_000_000
"""Entries that the arrays of one instance may have together."""
WIDEST = 500_000
"""Entries of one slice while slots are placed together."""


@dataclass(frozen=True, slots=True)
class Reach:
    """Gate costs and lengths in a recipe, site by site (numbered as in `sites`)."""

    sites: tuple[int, ...]
    alone: tuple[Ints, ...]
    price: dict[tuple[int, int], Ints]
    moves: dict[tuple[int, int], Ints]
    base_ns: int


def reach_of(instance: Instance, profile: Profile) -> Reach:
    """Return a recipe's costs: per local wire and site, per pair and two sites."""
    tables = instance.tables
    sites = list(instance.usable)
    inside = np.ix_(sites, sites)
    price: dict[tuple[int, int], Ints] = {}
    moves: dict[tuple[int, int], Ints] = {}
    for pair in profile.pairs:
        key = (pair.a, pair.b)
        cost = np.minimum(tables.pair_cost(pair.mask)[inside], NEVER) * pair.count
        away = np.minimum(tables.away(pair.mask)[inside], 1 << 16)
        length = away * (pair.count * tables.move_ns)
        price[key] = price.get(key, 0) + cost
        moves[key] = moves.get(key, 0) + length
    alone = []
    operands = profile.built.fine.operands
    for local in range(profile.built.fine.width):
        row = profile.ones[local] * tables.one[sites]
        row = row + profile.tees[local] * tables.tee[sites]
        row = row + profile.reads[local] * tables.read[sites]
        row = row + profile.wipes[local] * tables.wipe[sites]
        if profile.level2_ns[local]:
            rate2 = tables.rate2[sites]
            extra = np.maximum(0, rate2 - tables.rate[sites])
            row = row + np.where(rate2 < 0, NEVER, extra * profile.level2_ns[local])
        slot = local - operands
        if slot >= 0 and profile.built.slots[slot] == "clean":
            row = row + tables.prep[sites]
            row = row + tables.rate[sites] * profile.live_ns[slot]
        alone.append(row)
    return Reach(tuple(sites), tuple(alone), price, moves, profile.base_ns)


def are_direct(instance: Instance, recipes: Sequence[Sequence[int]]) -> list[bool]:
    """Return which steps get no arrays: the widest ones, until the rest is small."""
    widths = [len(operands) for operands in instance.operands]
    direct = [False] * instance.steps
    for width in sorted(set(widths), reverse=True):
        seen = {
            id(instance.profiles[i][c]): len(instance.usable) ** widths[i]
            for i, row in enumerate(recipes)
            if not direct[i]
            for c in row
        }
        if sum(seen.values()) <= LARGEST:
            break
        direct = [
            is_direct or w == width for is_direct, w in zip(direct, widths, strict=True)
        ]
    return direct


def least_over_slots(profile: Profile, reach: Reach) -> tuple[Ints, Ints]:
    """Return least cost and least duration over the sites of the operands."""
    count = len(reach.sites)
    operands = profile.built.fine.operands
    slots = len(profile.built.slots)
    together = count ** (operands - 1 + slots) <= WIDEST
    costs, lengths = [], []
    for first in range(count):
        cost, length = _slice(reach, operands, (), first)
        groups = (
            [tuple(range(operands, operands + slots))]
            if together
            else [(local,) for local in range(operands, operands + slots)]
        )
        for group in groups:
            if not group or count ** (operands - 1 + len(group)) > 20 * WIDEST:
                continue
            more, longer = _slice(reach, operands, group, first)
            axes = tuple(range(operands, operands + len(group)))
            cost = cost + more.min(axis=axes)
            length = length + longer.min(axis=axes)
        if not together:
            cost = cost + _among_slots(reach, operands)
        costs.append(np.minimum(cost, NEVER))
        lengths.append(np.minimum(length + reach.base_ns, ENDLESS))
    return np.concatenate(costs), np.concatenate(lengths)


def _among_slots(reach: Reach, operands: int) -> int:
    """Return the least cost of gates between slots that are placed one by one."""
    return sum(int(t.min()) for (a, b), t in reach.price.items() if a >= operands)


def _slice(
    reach: Reach, operands: int, group: tuple[int, ...], first: int
) -> tuple[Ints, Ints]:
    """Return cost and length of what touches a group of slots, or of all operands.

    The first operand sits at `first`; a group's slots have the last axes.
    """
    count = len(reach.sites)
    axis = {local: local for local in range(operands)}
    axis.update({local: operands + k for k, local in enumerate(group)})
    width = operands + len(group)
    shape = [1] + [count] * (width - 1)
    cost = np.zeros(shape, dtype=np.int64)
    length = np.zeros(shape, dtype=np.int64)

    def spread(values: Ints, *locals_: int) -> Ints:
        """Give a row or a matrix its axes; the first operand's is cut to a site."""
        if locals_[0] == 0:
            values = values[first : first + 1]
        form = [1] * width
        for position, local in enumerate(locals_):
            form[axis[local]] = values.shape[position]
        return values.reshape(form)

    wanted = group or tuple(range(operands))
    for local in wanted:
        cost = cost + spread(reach.alone[local], local)
    for (a, b), table in sorted(reach.price.items()):
        if a in axis and b in axis and (not group or b in group):
            cost = cost + spread(table, a, b)
            length = length + spread(reach.moves[a, b], a, b)
    same = np.eye(count, dtype=np.int64)
    for b in wanted:
        for a in sorted(axis):
            if a < b:
                cost = cost + spread(same, a, b) * NEVER
                length = length + spread(same, a, b) * ENDLESS
    return cost, length
