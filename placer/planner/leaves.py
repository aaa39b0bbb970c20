"""Look closer at one place of all wires: what each step can still choose there.

In: sites of the wires that have steps.  Out: a sharper bound than the walk's, and the
recipes and slot sites that a better plan could use; all else costs too much already.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from placer.planner.branches import direct_order
from placer.planner.model import Open
from placer.planner.steptables import ENDLESS, NEVER

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.planner.branches import Branches
    from placer.planner.placement import Instance
    from placer.planner.profile import Profile
    from placer.planner.sitetree import Bools
    from placer.planner.steptables import Ints, Reach

MOST_TOGETHER = 40_000
"""Places of a recipe's slots that are listed one by one."""


@dataclass(frozen=True, slots=True)
class Leaf:
    """A bound of a place of the wires, and what is left open below a limit."""

    bound: int
    choice: Open


class Lens:
    """What is the same for every leaf of an instance."""

    def __init__(self, instance: Instance, choice: Open, branches: Branches) -> None:
        self.instance = instance
        self.choice = choice
        self.branches = branches
        self.usable = instance.usable
        self.position = {p: k for k, p in enumerate(self.usable)}
        self.after = _closure(direct_order(instance))
        self.has_idle = any(
            not wire.uses and not wire.is_known_zero for wire in instance.wires
        )
        self.slot_domain = [
            np.array([p in row for p in self.usable], dtype=np.bool_)
            for row in choice.slot_sites
        ]

    def look(self, place: Sequence[int], limit: int) -> Leaf:
        """Return the leaf of a place; `place` gives positions in branching order."""
        walk, instance = self.branches.walk, self.instance
        at = dict(zip(self.branches.order, (int(p) for p in place), strict=True))
        fixed = sum(int(walk.alone[b, p]) for b, p in enumerate(place))
        rate = walk.rate[np.asarray(place, dtype=np.int64)] - walk.rate.min()
        pays = walk.pays + np.einsum("b,kbi->ki", rate, walk.chain)
        grids = [
            [self._grid(i, instance.profiles[i][c], at) for c in self.choice.recipes[i]]
            for i in range(instance.steps)
        ]
        totals, values = [], []
        for row in pays:
            value = [
                [cost + int(row[i]) * length for cost, length in grid]
                for i, grid in enumerate(grids)
            ]
            values.append(value)
            least = [min(int(v.min()) for v in options) for options in value]
            totals.append((fixed + sum(least), least))
        best = max(range(len(totals)), key=lambda k: totals[k][0])
        total, least = totals[best]
        if total >= limit:
            return Leaf(total, self.choice)
        room = [limit - total + one for one in least]
        return Leaf(total, self._open(at, values, room))

    def _open(
        self, at: dict[int, int], values: list[list[list[Ints]]], room: list[int]
    ) -> Open:
        """Return the choices that stay below the limit in every set of chains."""
        recipes, slot_sites = [], []
        best = max(
            range(len(values)),
            key=lambda k: sum(min(int(v.min()) for v in row) for row in values[k]),
        )
        for i, options in enumerate(values[best]):
            kept = []
            allowed: set[int] = set()
            for c, value in zip(self.choice.recipes[i], options, strict=True):
                if int(value.min()) >= room[i]:
                    continue
                kept.append(c)
                slots = len(self.instance.profiles[i][c].built.slots)
                if value.ndim < slots or slots == 0:
                    allowed |= set(self.choice.slot_sites[i]) if slots else set()
                    continue
                for axis in np.nonzero(value < room[i]):
                    allowed |= {self.usable[int(p)] for p in np.unique(axis)}
            recipes.append(tuple(kept))
            slot_sites.append(tuple(sorted(allowed)))
        sites = tuple(
            (self.usable[at[w]],) if w in at else domain
            for w, domain in enumerate(self.choice.sites)
        )
        return Open(sites, tuple(recipes), tuple(slot_sites))

    def _grid(self, i: int, profile: Profile, at: dict[int, int]) -> tuple[Ints, Ints]:
        """Return cost and length of a recipe, one axis per slot where that is small."""
        reach = self.branches.reach[id(profile)]
        where = [at[w] for w in self.instance.operands[i]]
        operands = len(where)
        cost, length = 0, reach.base_ns
        for local in range(operands):
            cost += int(reach.alone[local][where[local]])
        for (a, b), table in reach.price.items():
            if b < operands:
                cost += int(table[where[a], where[b]])
                length += int(reach.moves[a, b][where[a], where[b]])
        kinds = profile.built.slots
        rows = [
            self._slot(i, profile, reach, where, slot, at) for slot in range(len(kinds))
        ]
        if len(self.usable) ** len(kinds) > MOST_TOGETHER:
            # Too many places: each slot for itself, gates between slots left out.
            cost += sum(int(one.min()) for one, _ in rows)
            length += sum(int(two.min()) for _, two in rows)
            return _cut(np.array(cost), np.array(length))
        costs = np.array(cost, dtype=np.int64)
        lengths = np.array(length, dtype=np.int64)
        for row, longer in rows:
            costs = costs[..., None] + row
            lengths = lengths[..., None] + longer
        for (a, b), table in reach.price.items():
            if a >= operands:
                form = _form(a - operands, b - operands, table.shape, len(kinds))
                costs = costs + table.reshape(form)
                lengths = lengths + reach.moves[a, b].reshape(form)
        same = np.eye(len(self.usable), dtype=np.int64) * NEVER
        for one, two in itertools.combinations(range(len(kinds)), 2):
            costs = costs + same.reshape(_form(one, two, same.shape, len(kinds)))
        return _cut(costs, lengths)

    def _slot(
        self,
        i: int,
        profile: Profile,
        reach: Reach,
        where: list[int],
        slot: int,
        at: dict[int, int],
    ) -> tuple[Ints, Ints]:
        """Return a slot's cost and moves per site, seen from the operands alone."""
        local = len(where) + slot
        cost = reach.alone[local].copy()
        length = np.zeros(len(self.usable), dtype=np.int64)
        for (a, b), table in reach.price.items():
            if b == local and a < len(where):
                cost += table[where[a]]
                length += reach.moves[a, b][where[a]]
        is_clean = profile.built.slots[slot] == "clean"
        cost[~self.slot_domain[i]] = NEVER
        cost[where] = NEVER
        may_be_lent = np.zeros(len(self.usable), dtype=np.bool_)
        for w, p in at.items():
            wire = self.instance.wires[w]
            if w in self.instance.operands[i]:
                continue
            may_be_lent[p] |= wire.is_lendable
            if (is_clean or not wire.is_lendable) and self._is_held(w, i):
                cost[p] = NEVER
        if not is_clean and not self.has_idle:
            rate = self.branches.walk.rate
            cost += np.where(may_be_lent, 0, rate * profile.live_ns[slot])
        return cost, length

    def _is_held(self, w: int, i: int) -> bool:
        """Whether a wire holds its site during a step in every order."""
        wire = self.instance.wires[w]
        begun = not wire.is_known_zero or bool(self.after[wire.uses[0], i])
        kept = not wire.is_workspace or bool(self.after[i, wire.uses[-1]])
        return begun and kept


def _cut(cost: Ints, length: Ints) -> tuple[Ints, Ints]:
    return np.minimum(cost, NEVER), np.minimum(length, ENDLESS)


def _form(one: int, two: int, shape: tuple[int, ...], axes: int) -> list[int]:
    form = [1] * axes
    form[one], form[two] = shape
    return form


def _closure(direct: Bools) -> Bools:
    """Return which step comes before which, over any number of others."""
    before = direct.copy()
    for middle in range(len(before)):
        before |= np.outer(before[:, middle], before[middle])
    return before
