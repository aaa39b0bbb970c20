"""Build a complete placement step by step, given a site for every wire.

In: preferred sites of wires and the recipes that are open.  Out: recipe, slot sites
and start of every step, chosen greedily by price: gates and moves at the sites in
question, decay of what waits, and the delay that a choice causes.  Fast (a vector
operation per slot), never the last word.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

from placer.halt import NEVER, Halt
from placer.planner.placement import (
    Instance,
    Misfit,
    Placement,
    duration,
    earlier_steps,
    local_sites,
)

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from placer.planner.profile import Mask, Profile

STEPS_PER_LOOK = 64
"""Steps after which a decoding asks whether it must halt."""
HARD = 1e17
"""A price no real choice reaches; marks sites that cannot be used."""


@dataclass(frozen=True, slots=True)
class Taste:
    """How a decoding weighs its choices.

    `move_scale` multiplies prices of distance, `delay_scale` the price of time; 1.0
    is the placement cost's own weight.  `recipes[i]` are the open choices of step i.
    Steps in `lent_only` take no workspace but what a wire lends: nothing of theirs
    is a value that could outlive its lifetime.
    """

    recipes: tuple[tuple[int, ...], ...]
    move_scale: float = 1.0
    delay_scale: float = 1.0
    lent_only: frozenset[int] = frozenset()


@dataclass(slots=True)
class _State:
    """What is where while steps are placed in order."""

    wire_ready: list[int]
    site_ready: NDArray[np.float64]
    holder: list[int]
    sites: list[int]
    reserved: dict[int, int]
    recipes: list[int] = field(default_factory=list)
    slots: list[tuple[int, ...]] = field(default_factory=list)
    starts: list[int] = field(default_factory=list)
    ends: dict[int, int] = field(default_factory=dict)
    makespan: int = 0


@dataclass(frozen=True, slots=True)
class Offer:
    """What a recipe would cost at one step, and the slots and time it would take."""

    price: float
    recipe: int
    slots: tuple[int, ...]
    start: int
    end: int


def decode(
    instance: Instance,
    sites: Sequence[int],
    taste: Taste,
    earlier: Placement | None = None,
    *,
    halt: Halt = NEVER,
) -> Placement:
    """Return a placement whose permanent wires sit at `sites`.

    Workspace wires go to their preferred site when it is free, else to the nearest
    free one.  `earlier` starts guide how much a delay matters.

    Raises
    ------
    Misfit
        If some step finds no recipe with room for its workspace, or the halt is due.
    """
    return _Decoder(instance, taste, earlier).run(sites, halt)


def alternatives(
    instance: Instance, placement: Placement, taste: Taste
) -> list[list[Offer | None]]:
    """Return per step what each open recipe would cost where the plan stands then.

    `None` marks a recipe that finds no room.  The plan's own choices are committed
    step after step, in planned order.
    """
    return _Decoder(instance, taste, placement).follow(placement)


class _Decoder:
    def __init__(
        self, instance: Instance, taste: Taste, earlier: Placement | None
    ) -> None:
        self.instance = instance
        self.tables = instance.tables
        self.taste = taste
        count = len(self.tables.one)
        self.closed = np.full(count, HARD)
        self.closed[list(instance.usable)] = 0.0
        self.rates = np.asarray(self.tables.rate, dtype=np.float64)
        self.prep = np.asarray(self.tables.prep, dtype=np.float64)
        held = [
            w
            for w, wire in enumerate(instance.wires)
            if not wire.is_workspace and (wire.uses or not wire.is_known_zero)
        ]
        mean_rate = float(np.median(self.rates[list(instance.usable)]))
        self.delay_price = mean_rate * max(1, len(held)) * taste.delay_scale
        self.next_use = _next_uses(instance)
        self.hurry, self.due = _hurry(instance, earlier)
        self.earlier = earlier_steps(instance)
        self.floors: dict[Mask, float] = {}

    def _floor(self, mask: Mask) -> float:
        if mask not in self.floors:
            self.floors[mask] = float(self.tables.gate_floor(mask))
        return self.floors[mask]

    def _begin(self, sites: Sequence[int]) -> _State:
        instance = self.instance
        state = _State(
            [0] * len(instance.wires),
            np.zeros(len(self.tables.one)),
            [-1] * len(self.tables.one),
            list(sites),
            {},
        )
        for w, wire in enumerate(instance.wires):
            if wire.is_workspace:
                continue
            if not wire.is_known_zero:
                state.holder[sites[w]] = w
            elif wire.uses:
                state.reserved[sites[w]] = w
        return state

    def run(self, sites: Sequence[int], halt: Halt) -> Placement:
        """Place every step in program order."""
        state = self._begin(sites)
        for step in range(self.instance.steps):
            if step % STEPS_PER_LOOK == 0 and halt.is_due():
                raise Misfit("the work must end")
            self._place_new_wires(state, step)
            self._commit(state, step, self._best(state, step))
        return Placement(
            tuple(state.sites),
            tuple(state.recipes),
            tuple(state.slots),
            tuple(state.starts),
        )

    def follow(self, placement: Placement) -> list[list[Offer | None]]:
        """Price the open recipes of each step where a placement stands by then."""
        instance = self.instance
        state = self._begin(placement.sites)
        table: list[list[Offer | None]] = [[None]] * instance.steps
        order = sorted(range(instance.steps), key=lambda i: (placement.starts[i], i))
        for step in order:
            for w in instance.operands[step]:
                if instance.wires[w].uses[0] == step:
                    state.reserved.pop(state.sites[w], None)
                    state.holder[state.sites[w]] = w
            if len(instance.profiles[step]) > 1:
                table[step] = [
                    self._offer(state, step, c) for c in self.taste.recipes[step]
                ]
            profile = instance.profiles[step][placement.recipes[step]]
            slots = placement.slot_sites[step]
            where = local_sites(instance, step, placement.sites, slots)
            start = placement.starts[step]
            end = start + duration(instance, profile, where)
            self._commit(
                state, step, Offer(0.0, placement.recipes[step], slots, start, end)
            )
        return table

    def _place_new_wires(self, state: _State, step: int) -> None:
        """Give workspace wires that begin here a free site near their company."""
        for w in self.instance.operands[step]:
            wire = self.instance.wires[w]
            if wire.uses[0] != step:
                continue
            if wire.is_workspace:
                self._house(state, step, w)
            elif wire.is_known_zero:
                state.reserved.pop(state.sites[w], None)
            state.holder[state.sites[w]] = w

    def _house(self, state: _State, step: int, w: int) -> None:
        wanted = state.sites[w]
        if state.holder[wanted] < 0 and wanted not in state.reserved:
            return
        price = self.closed.copy()
        for p, holder in enumerate(state.holder):
            if holder >= 0 or p in state.reserved:
                price[p] = HARD
        matrix = self.tables.pair_cost((False, False, False))
        for other in self.instance.operands[step]:
            if other != w:
                price += matrix[:, state.sites[other]]
        best = int(np.argmin(price))
        if price[best] >= HARD:
            raise Misfit("no free site for a workspace wire")
        state.sites[w] = best

    def _best(self, state: _State, step: int) -> Offer:
        offers = []
        for c in self.taste.recipes[step]:
            offer = self._offer(state, step, c)
            if offer is not None:
                offers.append(offer)
        if not offers:
            raise Misfit(f"step {step} has no recipe with room")
        return min(offers, key=lambda offer: (offer.price, offer.recipe))

    def _offer(self, state: _State, step: int, c: int) -> Offer | None:
        profile = self.instance.profiles[step][c]
        operands = self.instance.operands[step]
        where = [state.sites[w] for w in operands]
        ready = max((state.wire_ready[w] for w in operands), default=0)
        for one in self.earlier.get(step, ()):
            ready = max(ready, state.ends.get(one, 0))
        for w in operands:
            wire = self.instance.wires[w]
            if wire.uses[0] == step and wire.is_known_zero:
                ready = max(ready, int(state.site_ready[state.sites[w]]))
        price = self._operand_price(profile, where)
        if price >= HARD:
            return None
        start = ready
        slots: list[int] = []
        if profile.built.slots:
            found = self._slots(state, step, profile, where, start)
            if found is None:
                return None
            slots, slot_price, start = found
            price += slot_price
        everything = [*where, *slots]
        try:
            end = start + duration(self.instance, profile, everything)
        except Misfit:
            return None
        price += self.delay_price * self.hurry[step] * (end - ready)
        price += self._lender_delay(state, step, slots, end)
        return Offer(price, c, tuple(slots), start, end)

    def _operand_price(self, profile: Profile, where: Sequence[int]) -> float:
        total = 0.0
        tables = self.tables
        scale = self.taste.move_scale
        for pair in profile.pairs:
            if pair.b >= len(where):
                continue
            price = float(tables.pair_cost(pair.mask)[where[pair.a], where[pair.b]])
            if price >= tables.far_cost:
                return HARD
            gate = self._floor(pair.mask)
            total += pair.count * (gate + scale * (price - gate))
        for local, site in enumerate(where):
            total += profile.ones[local] * float(tables.one[site])
            total += profile.tees[local] * float(tables.tee[site])
            total += profile.reads[local] * float(tables.read[site])
            total += profile.wipes[local] * float(tables.wipe[site])
            if profile.level2_ns[local]:
                if tables.rate2[site] < 0:
                    return HARD
                extra = max(0, int(tables.rate2[site]) - int(tables.rate[site]))
                total += extra * profile.level2_ns[local]
        return total

    def _slots(
        self,
        state: _State,
        step: int,
        profile: Profile,
        where: Sequence[int],
        ready: int,
    ) -> tuple[list[int], float, int] | None:
        """Choose a site per slot, one after the other, each the cheapest."""
        operands = self.instance.operands[step]
        free_at, clean_open, borrowed_open = self._availability(state, operands)
        if step in self.taste.lent_only:
            clean_open[:] = HARD
            unheld = [p for p in self.instance.usable if state.holder[p] < 0]
            borrowed_open[unheld] = HARD
        delay = self.delay_price * max(self.hurry[step], 0.05)
        base = profile.built.fine.operands
        chosen: list[int] = []
        total = 0.0
        start = ready
        for slot, kind in enumerate(profile.built.slots):
            local = base + slot
            price = (clean_open if kind == "clean" else borrowed_open).copy()
            price += self.rates * profile.live_ns[slot]
            if kind == "clean":
                price += self.prep
            price += np.maximum(free_at - start, 0.0) * delay
            self._add_meetings(price, profile, local, [*where, *chosen])
            best = int(np.argmin(price))
            if price[best] >= HARD:
                return None
            total += float(price[best])
            start = max(start, int(free_at[best]))
            chosen.append(best)
            clean_open[best] = HARD
            borrowed_open[best] = HARD
        return chosen, total, start

    def _availability(
        self, state: _State, operands: Sequence[int]
    ) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
        free_at = state.site_ready.copy()
        clean_open = self.closed.copy()
        borrowed_open = self.closed.copy()
        for p in self.instance.usable:
            w = state.holder[p]
            if w < 0:
                continue
            clean_open[p] = HARD
            free_at[p] = max(free_at[p], state.wire_ready[w])
            if w in operands or not self.instance.wires[w].is_lendable:
                borrowed_open[p] = HARD
        for p, w in state.reserved.items():
            if w in operands:
                clean_open[p] = borrowed_open[p] = HARD
        return free_at, clean_open, borrowed_open

    def _add_meetings(
        self,
        price: NDArray[np.float64],
        profile: Profile,
        local: int,
        where: Sequence[int],
    ) -> None:
        scale = self.taste.move_scale
        for pair in profile.pairs:
            other = pair.a if pair.b == local else pair.b if pair.a == local else -1
            if other < 0 or other >= len(where):
                continue
            row = self.tables.pair_cost(pair.mask)[:, where[other]]
            gate = self._floor(pair.mask)
            price += pair.count * (gate + scale * (row - gate))

    def _lender_delay(
        self, state: _State, step: int, slots: Sequence[int], end: int
    ) -> float:
        """Price what a lender's next step loses by waiting for its site."""
        total = 0.0
        for p in slots:
            w = state.holder[p]
            if w < 0:
                w = state.reserved.get(p, -1)
            if w < 0:
                continue
            following = self.next_use[step].get(w, -1)
            if following >= 0 and end > self.due[following]:
                late = end - self.due[following]
                total += self.delay_price * self.hurry[following] * late
        return total

    def _commit(self, state: _State, step: int, offer: Offer) -> None:
        state.recipes.append(offer.recipe)
        state.slots.append(offer.slots)
        state.starts.append(offer.start)
        state.ends[step] = offer.end
        state.makespan = max(state.makespan, offer.end)
        for w in self.instance.operands[step]:
            state.wire_ready[w] = offer.end
            wire = self.instance.wires[w]
            if wire.is_workspace and wire.uses[-1] == step:
                p = state.sites[w]
                state.holder[p] = -1
                state.site_ready[p] = max(state.site_ready[p], offer.end)
        for p in offer.slots:
            state.site_ready[p] = max(state.site_ready[p], offer.end)
            w = state.holder[p]
            if w >= 0:
                state.wire_ready[w] = max(state.wire_ready[w], offer.end)


def _next_uses(instance: Instance) -> list[dict[int, int]]:
    """Return per step the next use of each wire after that step (shared dicts)."""
    result: list[dict[int, int]] = [{} for _ in range(instance.steps)]
    current: dict[int, int] = {}
    for step in range(instance.steps - 1, -1, -1):
        result[step] = current
        current = current | dict.fromkeys(instance.operands[step], step)
    return result


def _hurry(
    instance: Instance, earlier: Placement | None
) -> tuple[list[float], list[int]]:
    """Return per step how much a delay of it delays the end, and when it was due."""
    if earlier is None:
        return [1.0] * instance.steps, [1 << 60] * instance.steps
    lengths = [
        instance.profiles[i][earlier.recipes[i]].base_ns for i in range(instance.steps)
    ]
    tail = [0] * instance.steps
    following: dict[int, int] = {}
    for i in range(instance.steps - 1, -1, -1):
        after = max((following.get(w, 0) for w in instance.operands[i]), default=0)
        tail[i] = after + lengths[i]
        for w in instance.operands[i]:
            following[w] = tail[i]
    longest = max(
        (earlier.starts[i] + tail[i] for i in range(instance.steps)), default=0
    )
    hurry = []
    for i in range(instance.steps):
        slack = longest - earlier.starts[i] - tail[i]
        hurry.append(1.0 if slack <= 0 else max(0.05, 1.0 - 4.0 * slack / longest))
    return hurry, list(earlier.starts)
