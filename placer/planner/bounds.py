"""Lower bounds that a reader can redo by hand.

`least_estimate` bounds the placement cost, `floor_of_error` the expected error of any
included route.  Both are sums of cheapest parts: valid for every plan, seldom tight.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from placer.planner.placement import Instance
    from placer.planner.profile import Profile

ESTIMATE_RULE = "cheapest recipe of every call, plus decay over the longest chain"
FLOOR_RULE = "gates of the cheapest recipe of every call on the best sites and links"

Choice = tuple[tuple[int, ...], ...]


def floor_of_error(instance: Instance, recipes: Choice) -> int:
    """Return a cost that the figures of no plan can go below.

    Every plan does the gates and measurements of one recipe per step somewhere.
    """
    least = _Least(instance)
    return sum(
        min(least.gates(instance.profiles[step][c]) for c in recipes[step])
        for step in range(instance.steps)
    )


def least_estimate(instance: Instance, recipes: Choice) -> int:
    """Return a placement cost that no plan can go below.

    Adds to the gates: the slots' own decay at the best site, and for wires held from
    the start to the end the longest chain of base durations at the best site.
    """
    least = _Least(instance)
    rate = least.rate
    total = 0
    for step, row in enumerate(instance.profiles):
        total += min(least.gates(row[c]) + least.slots(row[c]) for c in recipes[step])
    begins, chain = _chains(instance, recipes)
    for w, wire in enumerate(instance.wires):
        if not wire.uses:
            total += 0 if wire.is_known_zero else rate * chain
            continue
        if wire.is_known_zero:
            total += least.prep
            total += rate * _own_length(instance, recipes, w)
        elif wire.ends_known:
            last = wire.uses[-1]
            total += rate * (begins[last] + _shortest(instance, recipes, last))
        else:
            total += rate * chain
    return total


def cheapest_first(instance: Instance, step: int) -> list[int]:
    """Return a step's recipes by their gates on the best sites, cheapest first."""
    row = instance.profiles[step]
    least = _Least(instance)
    return sorted(range(len(row)), key=lambda c: (least.gates(row[c]), c))


class _Least:
    """The least price of each kind of operation over the sites in service."""

    def __init__(self, instance: Instance) -> None:
        self.tables = instance.tables
        usable = list(instance.usable)
        self.one = int(self.tables.one[usable].min())
        self.tee = int(self.tables.tee[usable].min())
        self.read = int(self.tables.read[usable].min())
        self.wipe = int(self.tables.wipe[usable].min())
        self.prep = int(self.tables.prep[usable].min())
        self.rate = int(self.tables.rate[usable].min())
        self.known: dict[int, int] = {}

    def gates(self, profile: Profile) -> int:
        """Return what a recipe's operations cost at least, wherever they happen."""
        if id(profile) not in self.known:
            floor = self.tables.gate_floor
            total = sum(pair.count * floor(pair.mask) for pair in profile.pairs)
            total += sum(profile.ones) * self.one
            total += sum(profile.tees) * self.tee
            total += sum(profile.reads) * self.read
            total += sum(profile.wipes) * self.wipe
            self.known[id(profile)] = total
        return self.known[id(profile)]

    def slots(self, profile: Profile) -> int:
        """Return what a recipe's clean slots cost at least."""
        return sum(
            self.rate * profile.live_ns[slot] + self.prep
            for slot, kind in enumerate(profile.built.slots)
            if kind == "clean"
        )


def _shortest(instance: Instance, recipes: Choice, step: int) -> int:
    return min(instance.profiles[step][c].base_ns for c in recipes[step])


def _chains(instance: Instance, recipes: Choice) -> tuple[list[int], int]:
    """Return the earliest start of every step and the least length of the program."""
    ready = [0] * len(instance.wires)
    begins = []
    for step in range(instance.steps):
        begin = max((ready[w] for w in instance.operands[step]), default=0)
        begins.append(begin)
        for w in instance.operands[step]:
            ready[w] = begin + _shortest(instance, recipes, step)
    return begins, max(ready, default=0)


def _own_length(instance: Instance, recipes: Choice, w: int) -> int:
    return sum(_shortest(instance, recipes, step) for step in instance.wires[w].uses)
