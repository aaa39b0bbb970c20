"""Walk all sites of the wires in depth, cut by a bound, and collect what is left.

In: arrays (see `Walk`).  Out: every place of the branched wires whose bound is below
a limit, or as many of the best as there is room for.  Compiled by numba; knows
nothing of recipes or time beyond the arrays.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from placer.compiled import compiled, inner
from placer.halt import NEVER as NEVER_HALT
from placer.halt import Halt
from placer.planner.stepdirect import Parts, bound_recipe
from placer.planner.steptables import ENDLESS, NEVER

Ints = NDArray[np.int64]
Bools = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Walk:
    """What the walk reads; B wires in the order of branching, C steps, P sites.

    `domain` (B, P), `apart` (B, B): who may never share a site; `alone` (B, P) and its
    least value per wire; `rate` (P).  After b wires are placed, step i is in state
    `state[b, i]`: its `known[state]` placed operands are the wires `who[state, j]`,
    whose site counts `stride[state, j]` in the recipe arrays that begin at
    `at[state, c]` of `cost` and `length`.  `choices` (C): recipes per step.
    `chain[k, b, i]`: wire b pays decay over step i in the k-th set of chains;
    `pays[k, i]`: the rate paid for step i before any wire is placed.
    `before` (C, K): steps that directly precede a step, -1 for none; `first`, `last`
    (B): use at which a wire's decay begins (-1: at 0) and ends (-1: with the
    program).  `others`: rate of wires that are never placed and pay throughout.
    Steps with `direct` (C) have no arrays: operand a is the wire `wires[i, a]` (-1:
    none), and recipe c is row `at[state, c]` of `parts`.
    """

    domain: Bools
    apart: Bools
    alone: Ints
    rate: Ints
    state: Ints
    known: Ints
    who: Ints
    stride: Ints
    at: Ints
    cost: Ints
    length: Ints
    choices: Ints
    chain: Bools
    pays: Ints
    before: Ints
    first: Ints
    last: Ints
    others: int
    direct: Bools
    wires: Ints
    parts: Parts


SIZE, NODES, DEPTH, LIMIT = range(4)
"""What the tally of a walk holds: leaves kept, nodes seen, wires placed, the limit."""


def walk(
    given: Walk,
    limit: int,
    *,
    most_leaves: int,
    most_nodes: int,
    pause: int = 1_000_000,
    halt: Halt = NEVER_HALT,
) -> tuple[Ints, Ints, int, int, bool]:
    """Return bounds and sites of what is below a limit, the limit kept, nodes, done.

    Everything not returned has at least the limit kept, if the walk was done.  After
    every `pause` nodes the halt is asked.
    """
    wires, steps = given.domain.shape[0], len(given.choices)
    shape = (wires + 1, steps, given.at.shape[1])
    tally = np.array([0, 0, -1, limit], dtype=np.int64)
    costs, lengths = np.zeros(shape, dtype=np.int64), np.zeros(shape, dtype=np.int64)
    paid = np.zeros((wires + 1, *given.pays.shape), dtype=np.int64)
    rates = np.full(wires + 1, given.rate.min(), dtype=np.int64)
    fixed = np.zeros(wires + 1, dtype=np.int64)
    least = np.zeros(wires, dtype=np.int64)
    place = np.full(wires, -1, dtype=np.int64)
    bounds = np.zeros(most_leaves, dtype=np.int64)
    found = np.zeros((most_leaves, wires), dtype=np.int64)
    is_done = False
    while not is_done and tally[NODES] <= most_nodes and not halt.is_due():
        is_done = bool(
            _walk(
                given.domain,
                given.apart,
                given.alone,
                given.rate,
                given.state,
                given.known,
                given.who,
                given.stride,
                given.at,
                given.cost,
                given.length,
                given.choices,
                given.chain,
                given.pays,
                given.before,
                given.first,
                given.last,
                given.others,
                given.direct,
                given.wires,
                given.parts.pairs,
                given.parts.ends,
                given.parts.price,
                given.parts.moves,
                given.parts.floor,
                given.parts.width,
                given.parts.alone,
                given.parts.base,
                NEVER,
                ENDLESS,
                tally,
                costs,
                lengths,
                paid,
                rates,
                fixed,
                least,
                place,
                bounds,
                found,
                min(tally[NODES] + pause, most_nodes + 1),
            )
        )
    is_done = is_done and bool(tally[NODES] <= most_nodes)
    size = int(tally[SIZE])
    return bounds[:size], found[:size], int(tally[LIMIT]), int(tally[NODES]), is_done


@inner
def _bound(  # type: ignore[no-untyped-def]
    costs, lengths, choices, pays, before, first, last, rates, fixed, short, ready
):
    """Return the better of two bounds: by sets of chains, and by earliest times.

    Along a fixed chain each recipe weighs cost and length together; the earliest
    times find the longest chain, but take the least cost and length apart.
    """
    steps = len(choices)
    best = 0
    for k in range(len(pays)):
        total = fixed
        for i in range(steps):
            least = costs[i, 0] + pays[k, i] * lengths[i, 0]
            for c in range(1, choices[i]):
                value = costs[i, c] + pays[k, i] * lengths[i, c]
                least = min(least, value)
            total += least
        best = max(best, total)
    total = fixed
    makespan = 0
    for i in range(steps):
        least, brief = costs[i, 0], lengths[i, 0]
        for c in range(1, choices[i]):
            least = min(least, costs[i, c])
            brief = min(brief, lengths[i, c])
        total += least
        short[i] = brief
        begin = 0
        for j in before[i]:
            if j >= 0:
                begin = max(begin, ready[j])
        ready[i] = begin + brief
        makespan = max(makespan, ready[i])
    total += rates[len(first)] * makespan
    for b in range(len(first)):
        if first[b] < 0:
            until = makespan if last[b] < 0 else ready[last[b]]
        else:
            until = _span(first[b], last[b], short, before)
        total += rates[b] * until
    return max(best, total)


@inner
def _span(first, last, short, before):  # type: ignore[no-untyped-def]
    """Return the longest chain from the start of a step to the end of another."""
    steps = len(short)
    far = np.full(steps, -1, dtype=np.int64)
    far[first] = short[first]
    most = far[first]
    for i in range(first + 1, steps):
        for j in before[i]:
            if j >= 0 and far[j] >= 0:
                far[i] = max(far[i], far[j] + short[i])
        most = max(most, far[i])
    return most if last < 0 else max(far[last], 0)


@inner
def _begin(  # type: ignore[no-untyped-def]
    domain, alone, at, state, cost, length, choices, pays, others, direct,
    pairs, ends, price, moves, floor, width, single, base, never, endless,
    costs, lengths, paid, rates, fixed, least, where,
):  # fmt: skip
    """Fill the arrays of a walk that has placed no wire yet."""
    wires, sites = domain.shape
    rates[wires] = others
    for b in range(wires):
        least[b] = alone[b].max()
        for p in range(sites):
            if domain[b, p]:
                least[b] = min(least[b], alone[b, p])
        fixed[0] += least[b]
    paid[0] = pays
    for i in range(len(choices)):
        for c in range(choices[i]):
            row = at[state[0, i], c]
            if direct[i]:
                costs[0, i, c], lengths[0, i, c] = bound_recipe(
                    row,
                    where,
                    pairs,
                    ends,
                    price,
                    moves,
                    floor,
                    width,
                    single,
                    base,
                    never,
                    endless,
                )
            else:
                costs[0, i, c] = cost[row]
                lengths[0, i, c] = length[row]


@compiled
def _walk(  # type: ignore[no-untyped-def]  # noqa: C901, PLR0912, PLR0915
    domain,
    apart,
    alone,
    rate,
    state,
    known,
    who,
    stride,
    at,
    cost,
    length,
    choices,
    chain,
    pays,
    before,
    first,
    last,
    others,
    direct,
    operand,
    pairs,
    ends,
    price,
    moves,
    floor,
    width,
    single,
    base,
    never,
    endless,
    tally,
    costs,
    lengths,
    paid,
    rates,
    fixed,
    least,
    place,
    bounds,
    found,
    until,
):
    """Go on where the tally stands, up to a number of nodes; return whether done."""
    wires, sites = domain.shape
    steps, sets = len(choices), len(pays)
    most_leaves = len(bounds)
    low = rate.min()
    where = np.full(single.shape[1], -1, dtype=np.int64)
    if tally[2] < 0:
        _begin(
            domain,
            alone,
            at,
            state,
            cost,
            length,
            choices,
            pays,
            others,
            direct,
            pairs,
            ends,
            price,
            moves,
            floor,
            width,
            single,
            base,
            never,
            endless,
            costs,
            lengths,
            paid,
            rates,
            fixed,
            least,
            where,
        )
        tally[2] = 0
    short = np.zeros(steps, dtype=np.int64)
    ready = np.zeros(steps, dtype=np.int64)
    size, nodes, depth, limit = tally
    while depth >= 0:
        if nodes >= until:
            tally[0], tally[1], tally[2], tally[3] = size, nodes, depth, limit
            return False
        place[depth] += 1
        p = place[depth]
        rates[depth] = low
        if p >= sites:
            place[depth] = -1
            depth -= 1
            continue
        if not domain[depth, p]:
            continue
        is_taken = False
        for b in range(depth):
            if place[b] == p and apart[b, depth]:
                is_taken = True
        if is_taken:
            continue
        nodes += 1
        rates[depth] = rate[p]
        fixed[depth + 1] = fixed[depth] + alone[depth, p] - least[depth]
        for i in range(steps):
            now = state[depth + 1, i]
            for k in range(sets):
                paid[depth + 1, k, i] = paid[depth, k, i]
                if chain[k, depth, i]:
                    paid[depth + 1, k, i] += rate[p] - low
            if now == state[depth, i]:
                for c in range(choices[i]):
                    costs[depth + 1, i, c] = costs[depth, i, c]
                    lengths[depth + 1, i, c] = lengths[depth, i, c]
                continue
            if direct[i]:
                for a in range(operand.shape[1]):
                    b = operand[i, a]
                    if b >= 0:
                        where[a] = place[b] if b <= depth else -1
                for c in range(choices[i]):
                    costs[depth + 1, i, c], lengths[depth + 1, i, c] = bound_recipe(
                        at[now, c],
                        where,
                        pairs,
                        ends,
                        price,
                        moves,
                        floor,
                        width,
                        single,
                        base,
                        never,
                        endless,
                    )
                where[:] = -1
                continue
            index = 0
            for j in range(known[now]):
                index += stride[now, j] * place[who[now, j]]
            for c in range(choices[i]):
                costs[depth + 1, i, c] = cost[at[now, c] + index]
                lengths[depth + 1, i, c] = length[at[now, c] + index]
        value = _bound(
            costs[depth + 1],
            lengths[depth + 1],
            choices,
            paid[depth + 1],
            before,
            first,
            last,
            rates,
            fixed[depth + 1],
            short,
            ready,
        )
        if value >= limit:
            continue
        if depth + 1 < wires:
            depth += 1
            continue
        if size == most_leaves:
            # Keep the better half; what is dropped has at least the new limit.
            limit = np.sort(bounds)[most_leaves // 2]
            kept = 0
            for leaf in range(size):
                if bounds[leaf] < limit:
                    bounds[kept] = bounds[leaf]
                    found[kept] = found[leaf]
                    kept += 1
            size = kept
            if value >= limit:
                continue
        bounds[size] = value
        found[size] = place
        size += 1
    tally[0], tally[1], tally[2], tally[3] = size, nodes, depth, limit
    return True
