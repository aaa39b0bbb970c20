"""Arrays for the walk over the sites of all wires (`sitetree.Walk`).

In: an instance and the choices that are open.  Out: the order of branching, and what
the walk needs to bound a placement of some of the wires.
"""

from __future__ import annotations

import random
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from placer.planner.sitetree import Bools, Walk
from placer.planner.stepdirect import parts_of
from placer.planner.steptables import are_direct, least_over_slots, reach_of

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.planner.model import Open
    from placer.planner.placement import Instance
    from placer.planner.profile import Profile
    from placer.planner.steptables import Ints, Reach

SETS = 4
"""Sets of chains that are tried for the bound."""


@dataclass(frozen=True, slots=True)
class Branches:
    """The walk, the wires in its order, and per profile (by id) its `Reach`."""

    walk: Walk
    order: tuple[int, ...]
    reach: dict[int, Reach]


def branches_of(instance: Instance, choice: Open, roots: Sequence[int]) -> Branches:
    """Return the walk over all wires with steps; the first one sits on `roots`."""
    order = _order(instance, choice)
    sites = list(instance.usable)
    domain = np.array(
        [[p in choice.sites[w] for p in sites] for w in order], dtype=np.bool_
    )
    domain[0] &= np.isin(np.arange(len(sites)), list(roots))
    prep, rate = instance.tables.prep[sites], instance.tables.rate[sites]
    zero = np.zeros(len(sites), dtype=np.int64)
    wires = [instance.wires[w] for w in order]
    before = direct_order(instance)
    first = [wire.uses[0] if wire.is_known_zero else -1 for wire in wires]
    last = [wire.uses[-1] if wire.ends_known else -1 for wire in wires]
    idle = sum(
        1
        for wire in instance.wires
        if not wire.uses and not wire.is_known_zero and not wire.is_workspace
    )
    others = idle * int(rate.min())
    chain, through = _chain_sets(instance, choice, before, first, last)
    pays = chain.sum(axis=1, dtype=np.int64) * int(rate.min()) + through * others
    tables, reach = _arrays(instance, choice, order)
    walk = Walk(
        domain=domain,
        apart=_apart(instance, order),
        alone=np.array([prep if wire.is_known_zero else zero for wire in wires]),
        rate=rate,
        choices=np.array([len(row) for row in choice.recipes], dtype=np.int64),
        chain=chain,
        pays=pays,
        before=_predecessors(instance),
        first=np.array(first, dtype=np.int64),
        last=np.array(last, dtype=np.int64),
        others=others,
        **tables,
    )
    return Branches(walk, order, reach)


def _predecessors(instance: Instance) -> Ints:
    """Return per step the steps just before it on its wires, -1 for none."""
    rows = [[-1] * max(map(len, instance.operands)) for _ in instance.operands]
    for w, wire in enumerate(instance.wires):
        for one, two in zip(wire.uses, wire.uses[1:], strict=False):
            rows[two][instance.operands[two].index(w)] = one
    return np.array(rows, dtype=np.int64)


def direct_order(instance: Instance) -> Bools:
    """Return which step directly follows which on a wire."""
    before = np.zeros((instance.steps, instance.steps), dtype=np.bool_)
    for wire in instance.wires:
        for one, two in zip(wire.uses, wire.uses[1:], strict=False):
            before[one, two] = True
    return before


def _order(instance: Instance, choice: Open) -> tuple[int, ...]:
    """Order wires: fixed ones first, then who meets most of those before it."""
    left = {w for w, wire in enumerate(instance.wires) if wire.uses}
    order: list[int] = []

    def worth(w: int) -> tuple[int, int, int, int]:
        wire = instance.wires[w]
        shared = sum(1 for i in wire.uses for v in instance.operands[i] if v in order)
        return (len(choice.sites[w]) == 1, shared, len(wire.uses), -w)

    while left:
        chosen = max(left, key=worth)
        order.append(chosen)
        left.remove(chosen)
    return tuple(order)


def _apart(instance: Instance, order: Sequence[int]) -> Bools:
    """Return which wires can never share a site."""
    count = len(order)
    apart = np.zeros((count, count), dtype=np.bool_)
    for a in range(count):
        for b in range(count):
            one, two = instance.wires[order[a]], instance.wires[order[b]]
            held = not one.is_workspace and not two.is_workspace
            unknown = not one.is_known_zero and not two.is_known_zero
            meets = bool(set(one.uses) & set(two.uses))
            apart[a, b] = a != b and (held or unknown or meets)
    return apart


def _arrays(
    instance: Instance, choice: Open, order: Sequence[int]
) -> tuple[dict[str, Any], dict[int, Reach]]:
    """Return the recipe arrays, one after the other, and where the states find them."""
    count = len(instance.usable)
    depth_of = {w: b for b, w in enumerate(order)}
    widest = max(len(row) for row in choice.recipes)
    deepest = max(len(row) for row in instance.operands)
    store = _Store(instance)
    state = np.zeros((len(order) + 1, instance.steps), dtype=np.int64)
    known: list[int] = []
    who: list[list[int]] = []
    stride: list[list[int]] = []
    at: list[list[int]] = []
    direct = np.array(are_direct(instance, choice.recipes), dtype=np.bool_)
    wires = np.full((instance.steps, deepest), -1, dtype=np.int64)
    for i, operands in enumerate(instance.operands):
        wires[i, : len(operands)] = [depth_of[w] for w in operands]
        for depth in range(len(order) + 1):
            if depth > 0 and order[depth - 1] not in operands:
                state[depth, i] = state[depth - 1, i]
                continue
            axes = [a for a, w in enumerate(operands) if depth_of[w] < depth]
            state[depth, i] = len(known)
            known.append(len(axes))
            row = [depth_of[operands[a]] for a in axes]
            who.append(row + [0] * (deepest - len(row)))
            steps = [count ** (len(axes) - 1 - k) for k in range(len(axes))]
            stride.append(steps + [0] * (deepest - len(row)))
            begins = [
                store.row(instance.profiles[i][c])
                if direct[i]
                else store.place(instance.profiles[i][c], tuple(axes))
                for c in choice.recipes[i]
            ]
            at.append(begins + [0] * (widest - len(begins)))
    tables = {
        "state": state,
        "known": np.array(known, dtype=np.int64),
        "who": np.array(who, dtype=np.int64),
        "stride": np.array(stride, dtype=np.int64),
        "at": np.array(at, dtype=np.int64),
        "cost": np.concatenate([*store.costs, np.zeros(1, dtype=np.int64)]),
        "length": np.concatenate([*store.lengths, np.zeros(1, dtype=np.int64)]),
        "direct": direct,
        "wires": wires,
        "parts": parts_of(store.rows, count),
    }
    return tables, store.reach


class _Store:
    """Arrays of recipes, each made once: whole, and with operands left open."""

    def __init__(self, instance: Instance) -> None:
        self.instance = instance
        self.whole: dict[int, tuple[Ints, Ints]] = {}
        self.reach: dict[int, Reach] = {}
        self.begins: dict[tuple[int, tuple[int, ...]], int] = {}
        self.costs: list[Ints] = []
        self.lengths: list[Ints] = []
        self.size = 0
        self.rows: list[Reach] = []
        self.row_of: dict[int, int] = {}

    def _reach(self, profile: Profile) -> Reach:
        if id(profile) not in self.reach:
            self.reach[id(profile)] = reach_of(self.instance, profile)
        return self.reach[id(profile)]

    def row(self, profile: Profile) -> int:
        """Return the row of a recipe that has no arrays."""
        if id(profile) not in self.row_of:
            self.row_of[id(profile)] = len(self.rows)
            self.rows.append(self._reach(profile))
        return self.row_of[id(profile)]

    def place(self, profile: Profile, axes: tuple[int, ...]) -> int:
        """Return where the array over some operands begins."""
        key = (id(profile), axes)
        if key in self.begins:
            return self.begins[key]
        if id(profile) not in self.whole:
            self.reach[id(profile)] = reach_of(self.instance, profile)
            self.whole[id(profile)] = least_over_slots(profile, self.reach[id(profile)])
        cost, length = self.whole[id(profile)]
        rest = tuple(a for a in range(cost.ndim) if a not in axes)
        self.begins[key] = self.size
        for rows, table in ((self.costs, cost), (self.lengths, length)):
            rows.append(np.ascontiguousarray(table.min(axis=rest)).reshape(-1))
        self.size += len(self.costs[-1])
        return self.begins[key]


def _chain_sets(
    instance: Instance,
    choice: Open,
    before: Bools,
    first: Sequence[int],
    last: Sequence[int],
) -> tuple[Bools, Bools]:
    """Return sets of chains: one per wire over which it certainly pays decay.

    A wire pays at least over any chain of steps within its stay.  Which is longest
    depends on choices not made yet, so a few guesses of the lengths are tried; a
    guess never makes a bound wrong, only weak.
    """
    draw = random.Random(0)
    sets: list[Bools] = []
    through: list[Bools] = []
    for number in range(SETS):
        guess = []
        for i, row in enumerate(choice.recipes):
            bases = [instance.profiles[i][c].base_ns for c in row]
            moves = [
                sum(pair.count for pair in instance.profiles[i][c].pairs) for c in row
            ]
            base = min(bases) if number != 1 else max(bases)
            base += min(moves) * instance.tables.move_ns * number // 2
            guess.append(base * (draw.uniform(0.8, 1.2) if number > 1 else 1.0))
        rows = [_chain(before, guess, f, e) for f, e in zip(first, last, strict=True)]
        whole = _chain(before, guess, -1, -1)
        if not any((np.array(rows) == old).all() for old in sets):
            sets.append(np.array(rows))
            through.append(whole)
    return np.array(sets), np.array(through)


def _chain(before: Bools, lengths: Sequence[float], first: int, last: int) -> Bools:
    """Return the steps of the longest chain from a step (-1: any) to another."""
    steps = len(lengths)
    far = [-1.0] * steps
    parent = [-1] * steps
    for i in range(steps):
        if first in (-1, i):
            far[i] = lengths[i]
        for j in range(i):
            if before[j, i] and far[j] >= 0 and far[j] + lengths[i] > far[i]:
                far[i] = far[j] + lengths[i]
                parent[i] = j
    i = last if last >= 0 else max(range(steps), key=lambda j: far[j])
    row = np.zeros(steps, dtype=np.bool_)
    while i >= 0:
        row[i] = True
        i = parent[i]
    return row
