"""The compiled search of the trial route: state, executable gates, choice of swap.

In: flow, gates, links and distances as arrays, a state that is changed in place.
Out: swaps, and the gap of every gate.  See `router.py` for what it is all about.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from placer.compiled import compiled, inner
from placer.placed import TWO
from placer.trial.release import begin, release

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from placer.placed import Flags, Flow, Ints

    Reals = NDArray[np.float64]

DONE, FULL, STUCK = range(3)
"""How `advance` ended: all gates done, no room for more swaps, nothing moves on."""

SWAPS, FRONT, OLDEST, MARK, QUEUED = range(5)
"""What `State.tally` counts: swaps, gates in the front, the oldest gate not done,
swaps up to the last gate, gates to test."""
_AHEAD, _LAST_RESET, _STAMP, _STARTED, _DIRTY = range(5, 10)
_RESET_EVERY = 5  # swaps after which the surcharges on sites are forgotten
_NARROW = 8  # gates in the front up to which `lookahead` is meant
_EQUAL = 1e-9  # scores nearer than this are equal, and lots are drawn


class Gates(NamedTuple):
    """Two-body gates: operation; tokens and kind; next gate on either token."""

    operation: Ints
    parts: Ints  # first token, second token, kind
    following: Ints


class Reach(NamedTuple):
    """Usable links by site, in the order of the tables, and distances.

    `back` is the number of the same link from the other end, `capable` whether what
    is in level 2 may be swapped over it, `own` the price of a swap in the unit of
    `ranges[kind, p, q]`, the distance that a pair of tokens has yet to go;
    `fits[kind, p, q]` says where a gate may happen.
    """

    starts: Ints
    neighbours: Ints
    back: Ints
    capable: Flags
    own: Reals
    fits: NDArray[np.bool_]
    ranges: Reals


class State(NamedTuple):
    """Where the search stands."""

    tally: Ints
    at: Ints  # token on a site
    place: Ints  # site of a token
    high: Flags  # token is in level 2
    waits: Ints
    free: Ints
    front: Ints  # gates that only need a link, oldest entry first
    front_of: Ints  # gate of a token in the front, or -1
    queue: Ints  # gates whose link is to be tested
    is_done: Flags
    gap_of_gate: Ints
    ahead: Ints  # the extended set
    spare: Ints  # the extended set before
    head: Ints  # first place of a token in the extended set, or -1
    chain: Ints  # next place of the same token
    seen: Ints
    surcharge: Reals
    gain: Reals  # change of ranges, front and ahead, when a link's token takes it
    dirty: Ints  # tokens whose gains are stale
    is_dirty: Flags
    random: NDArray[np.uint64]


def open_state(
    flow: Flow, links: int, sites: int, lookahead: int, seed: tuple[int, ...]
) -> State:
    """Return the state before the first operation."""
    gates = int((flow.code >= TWO).sum())
    own = np.arange(sites, dtype=np.int64)
    # One gate may add two, so the extended set can exceed its limit by one.
    room = lookahead * max(_NARROW, sites // 2) // _NARROW + 1
    seeded = np.random.SeedSequence([number % 2**32 for number in seed]).generate_state(
        1, np.uint64
    )
    return State(
        tally=np.zeros(10, dtype=np.int64),
        at=own,
        place=own.copy(),
        high=np.zeros(sites, dtype=np.bool_),
        waits=flow.waits.copy(),
        free=np.empty(len(flow.waits) + 1, dtype=np.int64),
        front=np.empty(sites + 1, dtype=np.int64),
        front_of=np.full(sites, -1, dtype=np.int64),
        queue=np.empty(2 * sites + 4, dtype=np.int64),
        is_done=np.zeros(gates + 1, dtype=np.bool_),
        gap_of_gate=np.full(gates, -1, dtype=np.int64),
        ahead=np.empty(room, dtype=np.int64),
        spare=np.empty(room, dtype=np.int64),
        head=np.full(sites, -1, dtype=np.int64),
        chain=np.full(2 * room, -1, dtype=np.int64),
        seen=np.full(gates, -1, dtype=np.int64),
        surcharge=np.ones(sites, dtype=np.float64),
        gain=np.zeros((links, 2), dtype=np.float64),
        dirty=np.empty(sites, dtype=np.int64),
        is_dirty=np.zeros(sites, dtype=np.bool_),
        random=(seeded | np.uint64(1)).astype(np.uint64),
    )


@inner
def _touch(state: State, token: int) -> None:
    """Note that the gains of a token are stale."""
    if not state.is_dirty[token]:
        state.is_dirty[token] = True
        state.dirty[state.tally[_DIRTY]] = token
        state.tally[_DIRTY] += 1


@inner
def _touch_gate(gates: Gates, state: State, gate: int) -> None:
    _touch(state, gates.parts[gate, 0])
    _touch(state, gates.parts[gate, 1])


@inner
def _settle(flow: Flow, gates: Gates, state: State, size: int) -> None:
    """Let happen all that needs no link; put free gates into the front."""
    tally = state.tally
    while size > 0:
        size -= 1
        operation = state.free[size]
        gate = flow.gate[operation]
        if gate < 0:
            _mark_levels(flow, state, operation)
            size = release(flow, operation, state.waits, state.free, size)
            continue
        state.front[tally[FRONT]] = gate
        tally[FRONT] += 1
        state.front_of[gates.parts[gate, 0]] = gate
        state.front_of[gates.parts[gate, 1]] = gate
        _touch_gate(gates, state, gate)
        state.queue[tally[QUEUED]] = gate
        tally[QUEUED] += 1


@inner
def _mark_levels(flow: Flow, state: State, operation: int) -> None:
    for e in range(flow.first[operation], flow.first[operation + 1]):
        if flow.enters[e]:
            state.high[flow.token[e]] = True
        if flow.leaves[e]:
            state.high[flow.token[e]] = False


@inner
def _run_gates(flow: Flow, gates: Gates, reach: Reach, state: State) -> bool:
    """Do every queued gate that is on its link, and what comes free by it."""
    tally = state.tally
    moved_on = False
    while tally[QUEUED] > 0:
        tally[QUEUED] -= 1
        gate = state.queue[tally[QUEUED]]
        one, two, kind = gates.parts[gate]
        if state.is_done[gate]:
            continue
        if not reach.fits[kind, state.place[one], state.place[two]]:
            continue
        moved_on = True
        state.is_done[gate] = True
        state.gap_of_gate[gate] = tally[SWAPS]
        state.front_of[one] = -1
        state.front_of[two] = -1
        _touch_gate(gates, state, gate)
        _leave_front(state, gate)
        operation = gates.operation[gate]
        _mark_levels(flow, state, operation)
        size = release(flow, operation, state.waits, state.free, 0)
        _settle(flow, gates, state, size)
    while state.is_done[tally[OLDEST]]:
        tally[OLDEST] += 1
    return moved_on


@inner
def _leave_front(state: State, gate: int) -> None:
    at = 0
    while state.front[at] != gate:
        at += 1
    state.tally[FRONT] -= 1
    for k in range(at, state.tally[FRONT]):
        state.front[k] = state.front[k + 1]


@inner
def _look_ahead(gates: Gates, state: State, lookahead: int) -> None:
    """Collect the extended set: the gates nearest behind the front layer."""
    tally = state.tally
    old = tally[_AHEAD]
    for k in range(old):
        gate = state.ahead[k]
        state.spare[k] = gate
        state.head[gates.parts[gate, 0]] = -1
        state.head[gates.parts[gate, 1]] = -1
    # A wide front needs more to look at, or most of its tokens are moved blindly.
    limit = lookahead * max(_NARROW, tally[FRONT]) // _NARROW
    tally[_AHEAD] = 0
    tally[_STAMP] += 1
    at = 0
    while at < tally[FRONT] + tally[_AHEAD] and tally[_AHEAD] < limit:
        behind = at - tally[FRONT]
        gate = state.front[at] if behind < 0 else state.ahead[behind]
        at += 1
        for side in range(2):
            after = gates.following[gate, side]
            if after >= 0 and state.seen[after] != tally[_STAMP]:
                _append_ahead(gates, state, after)
    for k in range(old):
        if state.seen[state.spare[k]] != tally[_STAMP]:
            _touch_gate(gates, state, state.spare[k])


@inner
def _append_ahead(gates: Gates, state: State, gate: int) -> None:
    number = state.tally[_AHEAD]
    state.ahead[number] = gate
    for side in range(2):
        token = gates.parts[gate, side]
        state.chain[2 * number + side] = state.head[token]
        state.head[token] = 2 * number + side
    if state.seen[gate] != state.tally[_STAMP] - 1:
        _touch_gate(gates, state, gate)
    state.seen[gate] = state.tally[_STAMP]
    state.tally[_AHEAD] += 1


@inner
def _change(
    parts: Ints, ranges: Reals, place: Ints, gate: int, token: int, to: int
) -> float:
    """Return how the range of a gate changes when one of its tokens moves to a site.

    If its partner is there they change places, of which each counts a half.
    """
    one, two, kind = parts[gate, 0], parts[gate, 1], parts[gate, 2]
    p, q = place[one], place[two]
    before = ranges[kind, p, q]
    if token == one:
        if q == to:
            return 0.5 * float(ranges[kind, q, p] - before)
        return float(ranges[kind, to, q] - before)
    if p == to:
        return 0.5 * float(ranges[kind, q, p] - before)
    return float(ranges[kind, p, to] - before)


@inner
def _refresh(gates: Gates, reach: Reach, state: State) -> None:
    """Work out the gains of every token that was touched."""
    parts, ranges, place = gates.parts, reach.ranges, state.place
    for k in range(state.tally[_DIRTY]):
        token = state.dirty[k]
        state.is_dirty[token] = False
        site = place[token]
        for link in range(reach.starts[site], reach.starts[site + 1]):
            to = reach.neighbours[link]
            gate = state.front_of[token]
            near, later = 0.0, 0.0
            if gate >= 0:
                near = _change(parts, ranges, place, gate, token, to)
            item = state.head[token]
            while item >= 0:
                gate = state.ahead[item // 2]
                later += _change(parts, ranges, place, gate, token, to)
                item = state.chain[item]
            state.gain[link, 0] = near
            state.gain[link, 1] = later
    state.tally[_DIRTY] = 0


@inner
def _sum(gates: Gates, reach: Reach, state: State, some: Ints, count: int) -> float:
    """Return the sum of the ranges of gates."""
    total = 0.0
    for k in range(count):
        one, two, kind = gates.parts[some[k]]
        total += reach.ranges[kind, state.place[one], state.place[two]]
    return total


@inner
def _draw(state: State, below: int) -> int:
    """Return a random number below a bound (xorshift, Marsaglia 2003)."""
    x = state.random[0]
    x ^= x << np.uint64(13)
    x ^= x >> np.uint64(7)
    x ^= x << np.uint64(17)
    state.random[0] = x
    return int((x >> np.uint64(33)) % np.uint64(below))


@inner
def _choose(gates: Gates, reach: Reach, state: State, weight: float) -> int:
    """Return the link whose swap has the least score and touches the front, or -1."""
    front, ahead = state.tally[FRONT], state.tally[_AHEAD]
    far = weight / max(1, ahead)
    base = _sum(gates, reach, state, state.front, front) / front
    base += far * _sum(gates, reach, state, state.ahead, ahead)
    gain, back, high, surcharge = state.gain, reach.back, state.high, state.surcharge
    best, chosen, ties = np.inf, -1, 0
    for k in range(2 * front):
        token = gates.parts[state.front[k // 2], k % 2]
        site = state.place[token]
        for link in range(reach.starts[site], reach.starts[site + 1]):
            other = reach.neighbours[link]
            mate = state.at[other]
            if other < site and state.front_of[mate] >= 0:
                continue  # seen from the other end
            if (high[token] or high[mate]) and not reach.capable[link]:
                continue
            near = gain[link, 0] + gain[back[link], 0] + reach.own[link]
            later = gain[link, 1] + gain[back[link], 1]
            score = base + near / front + far * later
            score *= max(surcharge[site], surcharge[other])
            if score < best - _EQUAL:
                best, chosen, ties = score, link, 1
            elif score <= best + _EQUAL:
                ties += 1
                if _draw(state, ties) == 0:
                    chosen = link
    return chosen


@inner
def _touch_all(gates: Gates, state: State, token: int) -> None:
    """Touch a token that has moved, and all that have it as a partner."""
    _touch(state, token)
    gate = state.front_of[token]
    if gate >= 0:
        _touch_gate(gates, state, gate)
    item = state.head[token]
    while item >= 0:
        _touch_gate(gates, state, state.ahead[item // 2])
        item = state.chain[item]


@inner
def _exchange(gates: Gates, state: State, swaps: Ints, a: int, b: int) -> None:
    """Swap what is on two sites, write it down, queue the gates concerned."""
    tally = state.tally
    one, two = state.at[a], state.at[b]
    state.at[a], state.at[b] = two, one
    state.place[one], state.place[two] = b, a
    number = tally[SWAPS]
    swaps[number, 0], swaps[number, 1] = min(a, b), max(a, b)
    swaps[number, 2] = tally[OLDEST]
    tally[SWAPS] += 1
    for token in (one, two):
        _touch_all(gates, state, token)
        gate = state.front_of[token]
        if gate >= 0:
            state.queue[tally[QUEUED]] = gate
            tally[QUEUED] += 1


@inner
def _swap_one(
    gates: Gates, reach: Reach, state: State, swaps: Ints, weight: float, decay: float
) -> bool:
    """Make the swap of least score; say whether there was one."""
    tally = state.tally
    _refresh(gates, reach, state)
    link = _choose(gates, reach, state, weight)
    if link < 0:
        return False
    if tally[SWAPS] - tally[_LAST_RESET] >= _RESET_EVERY:
        state.surcharge[:] = 1.0
        tally[_LAST_RESET] = tally[SWAPS]
    a, b = reach.neighbours[reach.back[link]], reach.neighbours[link]
    state.surcharge[a] += decay
    state.surcharge[b] += decay
    _exchange(gates, state, swaps, a, b)
    return True


@compiled
def advance(
    flow: Flow, gates: Gates, reach: Reach, state: State, swaps: Ints, lookahead: int,
    weight: float, decay: float, patience: int,
) -> int:  # fmt: skip
    """Search until all gates are done, the room for swaps is used up, or no way.

    Can be called again after it has stopped: with more room, or after the tokens were
    moved from outside (then every token must be touched, see `wake`).
    """
    tally = state.tally
    if tally[_STARTED] == 0:
        tally[_STARTED] = 1
        _settle(flow, gates, state, begin(state.waits, state.free))
        _look_ahead(gates, state, lookahead)
    while True:
        if _run_gates(flow, gates, reach, state):
            tally[MARK] = tally[SWAPS]
            tally[_LAST_RESET] = tally[SWAPS]
            state.surcharge[:] = 1.0
            _look_ahead(gates, state, lookahead)
        if tally[FRONT] == 0:
            return DONE
        if tally[SWAPS] == len(swaps):
            return FULL
        if tally[SWAPS] - tally[MARK] >= patience:
            return STUCK
        if not _swap_one(gates, reach, state, swaps, weight, decay):
            return STUCK


def wake(state: State, gate: int) -> None:
    """Make the search look at every token and gate anew, at one gate first."""
    tally = state.tally
    state.dirty[:] = np.arange(len(state.dirty))
    state.is_dirty[:] = True
    tally[_DIRTY] = len(state.dirty)
    count = int(tally[FRONT])
    state.queue[:count] = state.front[:count]
    state.queue[count] = gate
    tally[QUEUED] = count + 1
