"""Follow the included route once more, and write down every event of it.

In: a placed circuit, its route, its device.  Out: acts, swaps and waits with their
costs, and what every site holds when.  The sums are those of `trial.timeline`, event
by event, so that a report can say for each cost where and for which step it arose.
"""

from __future__ import annotations

from bisect import bisect_left
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, NamedTuple

from placer.placed import BARRIER, LEVEL2, MEASURE, ONE, RESET, TEE, TWO
from placer.trial.timeline import wait_cost

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.placed import PlacedCircuit
    from placer.tables import Tables
    from placer.trial.router import RouteResult

DATA, VALUE, LENT, CLEAN, HIGH, MOVING = range(6)
"""What a site holds: a wire of the program, a value in workspace, a wire that is lent,
|0> between two uses, something in level 2, something that is being swapped."""

NO_STEP = -1


class Act(NamedTuple):
    """One operation where and when it happens."""

    step: int
    code: int
    sites: tuple[int, ...]
    start: int
    end: int
    cost: int


class Swap(NamedTuple):
    """One swap; `step` is the step of the next two-body gate of what is moved."""

    a: int
    b: int
    start: int
    end: int
    cost: int
    step: int


class Wait(NamedTuple):
    """One charged wait; `step` is the step that it waits for."""

    site: int
    start: int
    end: int
    cost: int
    step: int


class Stretch(NamedTuple):
    """A site holds one thing over [start, end); `holder` -1 for a swap."""

    site: int
    start: int
    end: int
    state: int
    holder: int


@dataclass(slots=True)
class Replay:
    """Everything that happens on the included route."""

    acts: list[Act] = field(default_factory=list)
    swaps: list[Swap] = field(default_factory=list)
    waits: list[Wait] = field(default_factory=list)
    stretches: list[Stretch] = field(default_factory=list)
    end: int = 0


@dataclass(slots=True)
class _Token:
    """What started on a site: where it is, since when it is free, what it did last."""

    site: int
    since: int = 0
    last: int = -1
    is_high: bool = False
    begun: int = 0
    state: int = -1
    holder: int = -1


class _Arrays(NamedTuple):
    """The arrays of a placed circuit as plain lists, which Python reads faster."""

    code: list[int]
    first: list[int]
    cause: list[int]
    token: list[int]
    owner: list[int]
    following: list[int]
    enters: list[bool]
    leaves: list[bool]
    holder: list[int]
    alive: list[bool]
    step: list[int]


class _Follower:
    def __init__(
        self,
        placed: PlacedCircuit,
        tables: Tables,
        is_workspace: Sequence[bool],
        lent_until: Sequence[int],
    ) -> None:
        flow = placed.flow
        self.arrays = _Arrays(
            flow.code.tolist(),
            flow.first.tolist(),
            flow.cause.tolist(),
            flow.token.tolist(),
            flow.owner.tolist(),
            flow.following.tolist(),
            flow.enters.tolist(),
            flow.leaves.tolist(),
            placed.holder.tolist(),
            placed.alive_after.tolist(),
            placed.step.tolist(),
        )
        self.placed = placed
        self.tables = tables
        self.is_workspace = is_workspace
        self.lent_until = lent_until
        self.replay = Replay()
        self.tokens = [_Token(site) for site in range(placed.sites)]
        self.token_at = list(range(placed.sites))
        self.waits_for = flow.waits.tolist()
        self.heard_first = flow.heard_first.tolist()
        self.heard = flow.heard.tolist()
        self.ends = [0] * placed.operations
        self.costs: dict[tuple[int, int, bool], int] = {}
        self.alive_before = placed.alive_before.tolist()
        home = placed.home.tolist()
        held = frozenset(placed.held.tolist())
        for wire in range(placed.wires):
            if home[wire] in held:
                self.tokens[home[wire]].holder = wire
                self.tokens[home[wire]].state = DATA

    # --- what passes on a token

    def extend(self, token: _Token, until: int, state: int, holder: int) -> None:
        """Let a token hold something until a time; a new stretch where it changes."""
        if (token.state, token.holder) != (state, holder):
            self.close(token, token.since)
            token.begun, token.state, token.holder = token.since, state, holder
        token.since = until

    def close(self, token: _Token, until: int) -> None:
        """End the stretch that a token is in."""
        if token.state >= 0 and until > token.begun:
            self.replay.stretches.append(
                Stretch(token.site, token.begun, until, token.state, token.holder)
            )
        token.begun = until

    def wait(self, number: int, until: int, step: int) -> None:
        """Let a token wait where it is, and charge that if something lives on it."""
        token = self.tokens[number]
        if until <= token.since:
            return
        arrays, last = self.arrays, token.last
        alive = self.alive_before[number] if last < 0 else arrays.alive[last]
        if alive:
            cost = self.decay(token.site, until - token.since, token.is_high)
            self.replay.waits.append(Wait(token.site, token.since, until, cost, step))
        state, holder = token.state, token.holder
        if last >= 0:
            state, holder = self.rest(last, is_high=token.is_high)
        self.extend(token, until, state, holder)

    def rest(self, entry: int, *, is_high: bool) -> tuple[int, int]:
        """Return what a token holds after an entry."""
        arrays = self.arrays
        goes_on = arrays.following[entry] >= 0
        if not arrays.alive[entry]:
            return (CLEAN, -1) if goes_on else (-1, -1)
        holder = arrays.holder[entry]
        if is_high:
            return HIGH, holder
        is_lent = self.lent_until[entry] > entry
        return (LENT if is_lent else self.kind(holder)), holder

    def kind(self, holder: int) -> int:
        """Return whether a holder is a wire of the program or a value."""
        is_value = holder >= self.placed.wires or self.is_workspace[holder]
        return VALUE if is_value else DATA

    def decay(self, site: int, span: int, is_high: bool) -> int:
        """Return the cost of a wait, made once for each length."""
        key = (site, span, is_high)
        if key not in self.costs:
            where = self.tables.device.sites[site]
            self.costs[key] = wait_cost(where, span, is_high)
        return self.costs[key]

    # --- operations

    def perform(self, operation: int) -> None:
        """Let an operation happen as soon as everything that it needs is there."""
        arrays = self.arrays
        entries = range(arrays.first[operation], arrays.first[operation + 1])
        numbers = [arrays.token[e] for e in entries]
        tokens = [self.tokens[n] for n in numbers]
        start = max((t.since for t in tokens), default=0)
        cause = arrays.cause[operation]
        if cause >= 0:
            start = max(start, self.ends[cause] + self.tables.conditional_ns)
        sites = tuple(t.site for t in tokens)
        span, cost = self.price(arrays.code[operation], sites)
        step = arrays.step[operation]
        for entry, number, token in zip(entries, numbers, tokens, strict=True):
            self.wait(number, start, step)
            holder = arrays.holder[entry]
            token.is_high = token.is_high or arrays.enters[entry]
            state = LENT if self.lent_until[entry] >= 0 else self.kind(holder)
            self.extend(token, start + span, HIGH if token.is_high else state, holder)
            if arrays.leaves[entry]:
                token.is_high = False
            token.last = entry
        self.ends[operation] = start + span
        self.replay.end = max(self.replay.end, start + span)
        self.replay.acts.append(
            Act(step, arrays.code[operation], sites, start, start + span, cost)
        )

    def price(self, code: int, sites: tuple[int, ...]) -> tuple[int, int]:
        """Return how long an operation takes at its sites, and what it costs."""
        tables = self.tables
        if code == BARRIER:
            return 0, 0
        if code == TWO:
            return int(tables.link_ns[sites]), int(tables.two[sites])
        if code == LEVEL2:
            return int(tables.link2_ns[sites]), int(tables.two2[sites])
        spans, costs = {
            ONE: (tables.site_one_ns, tables.one),
            TEE: (tables.site_tee_ns, tables.tee),
            MEASURE: (tables.site_readout_ns, tables.read),
            RESET: (tables.site_reset_ns, tables.wipe),
        }[code]
        return int(spans[sites[0]]), int(costs[sites[0]])

    def swap(self, a: int, b: int, step: int) -> None:
        """Exchange what is on two sites."""
        one, two = self.token_at[a], self.token_at[b]
        pair = (self.tokens[one], self.tokens[two])
        is_high = pair[0].is_high or pair[1].is_high
        spans = self.tables.link2_ns if is_high else self.tables.link_ns
        costs = self.tables.two2 if is_high else self.tables.two
        start = max(token.since for token in pair)
        end = start + 3 * int(spans[a, b])
        for number, token, goal in ((one, pair[0], b), (two, pair[1], a)):
            self.wait(number, start, step)
            self.close(token, start)
            self.replay.stretches.append(Stretch(token.site, start, end, MOVING, -1))
            token.site, token.since, token.begun = goal, end, end
        self.token_at[a], self.token_at[b] = two, one
        cost = 3 * int(costs[a, b])
        self.replay.swaps.append(Swap(a, b, start, end, cost, step))
        self.replay.end = max(self.replay.end, end)

    def settle(self, free: list[int]) -> None:
        """Perform what needs no link and is free, and what that frees."""
        while free:
            operation = free.pop()
            if self.arrays.code[operation] < TWO:
                self.perform(operation)
                free += self.freed(operation)

    def freed(self, operation: int) -> list[int]:
        """Return the operations that waited for this one last."""
        arrays = self.arrays
        after = [
            arrays.owner[arrays.following[e]]
            for e in range(arrays.first[operation], arrays.first[operation + 1])
            if arrays.following[e] >= 0
        ]
        heard = range(self.heard_first[operation], self.heard_first[operation + 1])
        after += [self.heard[k] for k in heard]
        found = []
        for number in after:
            self.waits_for[number] -= 1
            if self.waits_for[number] == 0:
                found.append(number)
        return found


def replay_route(
    placed: PlacedCircuit,
    tables: Tables,
    route: RouteResult,
    *,
    is_workspace: Sequence[bool],
    lent_until: Sequence[int],
) -> Replay:
    """Follow a route that the timeline has followed before.

    Parameters
    ----------
    placed, tables, route
        As for `trial.timeline`; the route keeps all rules.
    is_workspace
        Per wire, whether its register is workspace.
    lent_until
        Per entry of the placed circuit: the last entry of the borrowed slot with a
        lender that it acts for, -1 where it acts for none.
    """
    follower = _Follower(placed, tables, is_workspace, lent_until)
    gaps = route.gap_of_gate.tolist()
    order = sorted(range(len(gaps)), key=lambda gate: (gaps[gate], gate))
    purposes = _purposes(placed, route, order)
    gates = placed.gates.tolist()
    follower.settle([n for n, w in enumerate(follower.waits_for) if w == 0])
    done = 0
    swaps = list(zip(route.swap_a.tolist(), route.swap_b.tolist(), strict=True))
    for number in range(len(swaps) + 1):
        while done < len(order) and gaps[order[done]] <= number:
            gate = gates[order[done]]
            follower.perform(gate)
            follower.settle(follower.freed(gate))
            done += 1
        if number < len(swaps):
            follower.swap(*swaps[number], purposes[number])
    for number, token in enumerate(follower.tokens):
        follower.wait(number, follower.replay.end, NO_STEP)
        follower.close(token, follower.replay.end)
    return follower.replay


def _purposes(
    placed: PlacedCircuit, route: RouteResult, order: Sequence[int]
) -> list[int]:
    """Return per swap the step of the next two-body gate of either of its tokens."""
    flow = placed.flow
    first, token = flow.first.tolist(), flow.token.tolist()
    gates, steps = placed.gates.tolist(), placed.step.tolist()
    places: dict[int, list[int]] = {}
    for place, gate in enumerate(order):
        entry = first[gates[gate]]
        for one in token[entry : entry + 2]:
            places.setdefault(one, []).append(place)
    gaps = [int(route.gap_of_gate[gate]) for gate in order]
    at = list(range(placed.sites))
    found = []
    pairs = zip(route.swap_a.tolist(), route.swap_b.tolist(), strict=True)
    for number, (a, b) in enumerate(pairs):
        done = bisect_left(gaps, number + 1)
        later = []
        for one in (at[a], at[b]):
            mine = places.get(one, [])
            k = bisect_left(mine, done)
            later += mine[k : k + 1]
        step = steps[gates[order[min(later)]]] if later else NO_STEP
        found.append(step)
        at[a], at[b] = at[b], at[a]
    return found
