"""The compiled search of the trial route: state, executable gates, choice of swap.

In: flow, gates, links and distances as arrays, a state that is changed in place.
Out: swaps, and the gap of every gate.  See `router.py` for what it is all about.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from placer.compiled import compiled
from placer.placed import TWO
from placer.trial.detour import Board, detour
from placer.trial.release import begin, release

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from placer.placed import Flags, Flow, Ints

    Reals = NDArray[np.float64]

DONE, FULL, STUCK, GOING = range(4)
"""How `advance` ended: all gates done, no room for more swaps, no way to go on."""

# What `State.tally` counts.
_SWAPS, _FRONT, _OLDEST, _MARK, _AHEAD, _QUEUED, _STARTED, _LAST_RESET, _STAMP = range(
    9
)
_RESET_EVERY = 5  # swaps after which the surcharges on sites are forgotten


class Gates(NamedTuple):
    """Two-body gates: operation, both tokens, kind, next gate on either token."""

    operation: Ints
    one: Ints
    two: Ints
    kind: Ints
    following: Ints


class Reach(NamedTuple):
    """Usable links by site, whether they carry level 2, and distances.

    `own` is the price of a swap over each link in the unit of `ranges[kind, p, q]`,
    the distance that a pair of tokens has yet to go; `fits[kind, p, q]` says where a
    gate may happen; `hop` and `step` are those of the tables.
    """

    starts: Ints
    neighbours: Ints
    capable: Flags
    own: Reals
    hop: Ints
    step: Ints
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
    head: Ints  # first place of a token in the extended set, or -1
    chain: Ints  # next place of the same token
    seen: Ints
    surcharge: Reals
    random: NDArray[np.uint64]


def open_state(flow: Flow, sites: int, lookahead: int, seed: int) -> State:
    """Return the state before the first operation."""
    gates = int((flow.code >= TWO).sum())
    own = np.arange(sites, dtype=np.int64)
    tally = np.zeros(9, dtype=np.int64)
    mixed = np.random.SeedSequence(seed).generate_state(1, np.uint64) | np.uint64(1)
    return State(
        tally=tally,
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
        ahead=np.empty(max(1, lookahead), dtype=np.int64),
        head=np.full(sites, -1, dtype=np.int64),
        chain=np.full(2 * max(1, lookahead), -1, dtype=np.int64),
        seen=np.full(gates, -1, dtype=np.int64),
        surcharge=np.ones(sites, dtype=np.float64),
        random=mixed.astype(np.uint64),
    )


@compiled
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
        state.front[tally[_FRONT]] = gate
        tally[_FRONT] += 1
        state.front_of[gates.one[gate]] = gate
        state.front_of[gates.two[gate]] = gate
        state.queue[tally[_QUEUED]] = gate
        tally[_QUEUED] += 1


@compiled
def _mark_levels(flow: Flow, state: State, operation: int) -> None:
    for e in range(flow.first[operation], flow.first[operation + 1]):
        if flow.enters[e]:
            state.high[flow.token[e]] = True
        if flow.leaves[e]:
            state.high[flow.token[e]] = False


@compiled
def _run_gates(flow: Flow, gates: Gates, reach: Reach, state: State) -> bool:
    """Do every queued gate that is on its link, and what comes free by it."""
    tally = state.tally
    moved_on = False
    while tally[_QUEUED] > 0:
        tally[_QUEUED] -= 1
        gate = state.queue[tally[_QUEUED]]
        one, two = gates.one[gate], gates.two[gate]
        if state.is_done[gate]:
            continue
        if not reach.fits[gates.kind[gate], state.place[one], state.place[two]]:
            continue
        moved_on = True
        state.is_done[gate] = True
        state.gap_of_gate[gate] = tally[_SWAPS]
        state.front_of[one] = -1
        state.front_of[two] = -1
        _leave_front(state, gate)
        operation = gates.operation[gate]
        _mark_levels(flow, state, operation)
        _settle(
            flow, gates, state, release(flow, operation, state.waits, state.free, 0)
        )
    while state.is_done[tally[_OLDEST]]:
        tally[_OLDEST] += 1
    return moved_on


@compiled
def _leave_front(state: State, gate: int) -> None:
    at = 0
    while state.front[at] != gate:
        at += 1
    state.tally[_FRONT] -= 1
    for k in range(at, state.tally[_FRONT]):
        state.front[k] = state.front[k + 1]


@compiled
def _look_ahead(gates: Gates, state: State, limit: int) -> None:
    """Collect the extended set: the gates nearest behind the front layer."""
    tally = state.tally
    for k in range(tally[_AHEAD]):
        state.head[gates.one[state.ahead[k]]] = -1
        state.head[gates.two[state.ahead[k]]] = -1
    tally[_AHEAD] = 0
    tally[_STAMP] += 1
    stamp = tally[_STAMP]
    at = 0
    while at < tally[_FRONT] + tally[_AHEAD] and tally[_AHEAD] < limit:
        if at < tally[_FRONT]:
            gate = state.front[at]
        else:
            gate = state.ahead[at - tally[_FRONT]]
        at += 1
        for side in range(2):
            after = gates.following[gate, side]
            if after < 0 or state.seen[after] == stamp or tally[_AHEAD] >= limit:
                continue
            state.seen[after] = stamp
            _append_ahead(gates, state, after)


@compiled
def _append_ahead(gates: Gates, state: State, gate: int) -> None:
    number = state.tally[_AHEAD]
    state.ahead[number] = gate
    state.chain[2 * number] = state.head[gates.one[gate]]
    state.head[gates.one[gate]] = 2 * number
    state.chain[2 * number + 1] = state.head[gates.two[gate]]
    state.head[gates.two[gate]] = 2 * number + 1
    state.tally[_AHEAD] += 1


@compiled
def _range(gates: Gates, reach: Reach, state: State, gate: int) -> float:
    p, q = state.place[gates.one[gate]], state.place[gates.two[gate]]
    return float(reach.ranges[gates.kind[gate], p, q])


@compiled
def _change(
    gates: Gates, reach: Reach, state: State, gate: int, s: int, t: int
) -> float:
    """Return how the range of a gate changes when tokens s and t change places."""
    one, two = gates.one[gate], gates.two[gate]
    p, q = state.place[one], state.place[two]
    a, b = p, q
    if one == s:
        a = state.place[t]
    elif one == t:
        a = state.place[s]
    if two == s:
        b = state.place[t]
    elif two == t:
        b = state.place[s]
    kind = gates.kind[gate]
    return float(reach.ranges[kind, a, b] - reach.ranges[kind, p, q])


@compiled
def _front_change(gates: Gates, reach: Reach, state: State, s: int, t: int) -> float:
    gate, other = state.front_of[s], state.front_of[t]
    total = 0.0
    if gate >= 0:
        total += _change(gates, reach, state, gate, s, t)
    if other >= 0 and other != gate:
        total += _change(gates, reach, state, other, s, t)
    return total


@compiled
def _ahead_change(gates: Gates, reach: Reach, state: State, s: int, t: int) -> float:
    total = 0.0
    link = state.head[s]
    while link >= 0:
        total += _change(gates, reach, state, state.ahead[link // 2], s, t)
        link = state.chain[link]
    link = state.head[t]
    while link >= 0:
        gate = state.ahead[link // 2]
        if gates.one[gate] != s and gates.two[gate] != s:
            total += _change(gates, reach, state, gate, s, t)
        link = state.chain[link]
    return total


@compiled
def _draw(state: State, below: int) -> int:
    """Return a random number below a bound (xorshift, Marsaglia 2003)."""
    x = state.random[0]
    x ^= x << np.uint64(13)
    x ^= x >> np.uint64(7)
    x ^= x << np.uint64(17)
    state.random[0] = x
    return int((x >> np.uint64(33)) % np.uint64(below))


@compiled
def _choose(gates: Gates, reach: Reach, state: State, weight: float) -> tuple[int, int]:
    """Return the swap of least score that touches the front, (-1, -1) for none."""
    tally = state.tally
    front, ahead = tally[_FRONT], tally[_AHEAD]
    front_sum, ahead_sum = 0.0, 0.0
    for k in range(front):
        front_sum += _range(gates, reach, state, state.front[k])
    for k in range(ahead):
        ahead_sum += _range(gates, reach, state, state.ahead[k])
    far = weight / max(1, ahead)
    best, best_a, best_b, ties = np.inf, -1, -1, 0
    for k in range(2 * front):
        gate = state.front[k // 2]
        s = gates.one[gate] if k % 2 == 0 else gates.two[gate]
        a = state.place[s]
        for link in range(reach.starts[a], reach.starts[a + 1]):
            b = reach.neighbours[link]
            t = state.at[b]
            if state.front_of[t] >= 0 and b < a:
                continue  # seen from the other end
            if (state.high[s] or state.high[t]) and not reach.capable[link]:
                continue
            near = front_sum + _front_change(gates, reach, state, s, t)
            score = (near + reach.own[link]) / front
            score += far * (ahead_sum + _ahead_change(gates, reach, state, s, t))
            score *= max(state.surcharge[a], state.surcharge[b])
            if score < best - 1e-9:
                best, best_a, best_b, ties = score, a, b, 1
            elif score <= best + 1e-9:
                ties += 1
                if _draw(state, ties) == 0:
                    best_a, best_b = a, b
    return best_a, best_b


@compiled
def _exchange(state: State, swaps: Ints, a: int, b: int) -> None:
    """Swap what is on two sites, write it down, queue the gates concerned."""
    tally = state.tally
    one, two = state.at[a], state.at[b]
    state.at[a], state.at[b] = two, one
    state.place[one], state.place[two] = b, a
    number = tally[_SWAPS]
    swaps[number, 0], swaps[number, 1] = min(a, b), max(a, b)
    swaps[number, 2] = tally[_OLDEST]
    tally[_SWAPS] += 1
    for token in (one, two):
        gate = state.front_of[token]
        if gate >= 0:
            state.queue[tally[_QUEUED]] = gate
            tally[_QUEUED] += 1


@compiled
def _take_back(state: State, swaps: Ints) -> None:
    """Undo the swaps since the last gate: they led nowhere."""
    tally = state.tally
    while tally[_SWAPS] > tally[_MARK]:
        tally[_SWAPS] -= 1
        a, b = swaps[tally[_SWAPS], 0], swaps[tally[_SWAPS], 1]
        one, two = state.at[a], state.at[b]
        state.at[a], state.at[b] = two, one
        state.place[one], state.place[two] = b, a


@compiled
def _way_out(gates: Gates, reach: Reach, state: State, swaps: Ints) -> bool:
    """Bring the oldest gate that can be brought to a link straight there."""
    tally = state.tally
    _take_back(state, swaps)
    board = Board(
        reach.starts, reach.neighbours, reach.capable, reach.step, reach.hop,
        state.at, state.place, state.high,
    )  # fmt: skip
    ranked = np.sort(state.front[: tally[_FRONT]])
    for gate in ranked:
        fit = reach.fits[gates.kind[gate]]
        path = detour(
            board, fit, gates.one[gate], gates.two[gate], gates.kind[gate] == 0
        )
        if len(path) == 0:
            continue
        for k in range(len(path)):
            _exchange(state, swaps, path[k, 0], path[k, 1])
            # Nothing may happen on the way: the path was made for what stands now.
            tally[_QUEUED] = 0
        state.queue[0] = gate
        tally[_QUEUED] = 1
        return True
    return False


@compiled
def _requeue(state: State) -> None:
    """Test every gate of the front again."""
    for k in range(state.tally[_FRONT]):
        state.queue[k] = state.front[k]
    state.tally[_QUEUED] = state.tally[_FRONT]


@compiled
def _step(
    gates: Gates, reach: Reach, state: State, swaps: Ints, weight: float, decay: float,
    patience: int,
) -> bool:  # fmt: skip
    """Make one swap of choice, or the swaps of a way out; say whether it went on."""
    tally = state.tally
    a, b = -1, -1
    if tally[_SWAPS] - tally[_MARK] < patience:
        a, b = _choose(gates, reach, state, weight)
    if a < 0:
        if not _way_out(gates, reach, state, swaps):
            return False
        gate = state.queue[0]
        _requeue(state)
        # The gate that the way was made for must be done first.
        state.queue[tally[_QUEUED]] = gate
        tally[_QUEUED] += 1
        return True
    if (tally[_SWAPS] - tally[_LAST_RESET]) >= _RESET_EVERY:
        state.surcharge[:] = 1.0
        tally[_LAST_RESET] = tally[_SWAPS]
    state.surcharge[a] += decay
    state.surcharge[b] += decay
    _exchange(state, swaps, a, b)
    return True


@compiled
def advance(
    flow: Flow, gates: Gates, reach: Reach, state: State, swaps: Ints, lookahead: int,
    weight: float, decay: float, patience: int,
) -> int:  # fmt: skip
    """Search until all gates are done, the room for swaps is used up, or no way."""
    tally = state.tally
    if tally[_STARTED] == 0:
        tally[_STARTED] = 1
        _settle(flow, gates, state, begin(state.waits, state.free))
        _run_gates(flow, gates, reach, state)
        _look_ahead(gates, state, lookahead)
    longest = patience + 16 * len(state.at)
    while tally[_FRONT] > 0:
        if tally[_SWAPS] + longest > len(swaps):
            return FULL
        if not _step(gates, reach, state, swaps, weight, decay, patience):
            return STUCK
        if _run_gates(flow, gates, reach, state):
            tally[_MARK] = tally[_SWAPS]
            tally[_LAST_RESET] = tally[_SWAPS]
            state.surcharge[:] = 1.0
            _look_ahead(gates, state, lookahead)
    return DONE
