"""The compiled loop of the timeline: follow a route and write down what happens.

In: a placed circuit, a device and a route as arrays.  Out: starts, ends, sites, the
waits that are charged, the lives of values.  Nothing is priced here.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from placer.compiled import compiled, inner
from placer.placed import BARRIER, MEASURE, ONE, RESET, TEE, TWO
from placer.trial.release import begin, release

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from placer.placed import Flags, Flow, Ints

    Reals = NDArray[np.float64]

# Why the compiled loop stopped.
GOOD, _OFF_LINK, _NO_LEVEL2, _NOT_READY, _BAD_SWAP, _LEFT_OVER = range(6)
WHY = (
    "",
    "a two-body gate is off its link",
    "a gate or a swap lacks level 2",
    "a two-body gate comes before what it needs",
    "a swap is off any link",
    "the route leaves gates undone",
)


class Places(NamedTuple):
    """Times and links of a device, as the compiled loop reads them."""

    one_ns: Ints
    tee_ns: Ints
    readout_ns: Ints
    reset_ns: Ints
    link_ns: Ints
    link2_ns: Ints
    has_level2: Flags
    lifetime_ns: Reals
    level2_lifetime_ns: Reals
    conditional_ns: int


class Lives(NamedTuple):
    """Who is charged and who is a value, entry by entry (see `PlacedCircuit`)."""

    holder: Ints
    is_value: Flags
    alive_after: Flags
    valued_after: Flags
    alive_before: Flags


class Record(NamedTuple):
    """What the compiled loop writes down.

    `start`, `end` per operation and per swap; `site` per entry; `windows` are the
    charged waits; `share` and `stay` per holder: its life as a value, its longest
    stay in level 2; `high_swap` marks swaps in level 2.
    """

    start: Ints
    end: Ints
    site: Ints
    swap_start: Ints
    swap_end: Ints
    high_swap: Flags
    windows: Ints
    share: Reals
    stay: Reals


class Tokens(NamedTuple):
    """Where each token is, since when it is free, and what it did last."""

    at: Ints  # token on a site
    place: Ints  # site of a token
    since: Ints
    last: Ints  # entry of the last operation, -1 before the first
    high: Flags  # in level 2
    stay: Reals  # share of the present stay in level 2


@inner
def _window(
    places: Places, lives: Lives, tokens: Tokens, token: int, until: int,
    record: Record, count: int,
) -> int:  # fmt: skip
    """Account for a token's wait up to `until`; return the number of windows."""
    span = until - tokens.since[token]
    if span <= 0:
        return count
    site = tokens.place[token]
    last = tokens.last[token]
    alive = lives.alive_before[token] if last < 0 else lives.alive_after[last]
    if alive:
        record.windows[count, 0] = site
        record.windows[count, 1] = span
        record.windows[count, 2] = 1 if tokens.high[token] else 0
        count += 1
    _live(places, lives, tokens, token, span, record)
    return count


@inner
def _live(
    places: Places, lives: Lives, tokens: Tokens, token: int, span: int, record: Record
) -> None:
    """Add a wait or a swap to the life of the value or the stay on a token."""
    last = tokens.last[token]
    site = tokens.place[token]
    if last >= 0 and lives.valued_after[last]:
        record.share[lives.holder[last]] += span / places.lifetime_ns[site]
    if tokens.high[token]:
        tokens.stay[token] += span / places.level2_lifetime_ns[site]


@inner
def _length(flow: Flow, places: Places, tokens: Tokens, operation: int) -> int:
    """Return how long an operation takes where its tokens are, in ns."""
    site = tokens.place[flow.token[flow.first[operation]]]
    code = flow.code[operation]
    if code == ONE:
        return int(places.one_ns[site])
    if code == TEE:
        return int(places.tee_ns[site])
    if code == MEASURE:
        return int(places.readout_ns[site])
    if code == RESET:
        return int(places.reset_ns[site])
    if code == BARRIER:
        return 0
    other = tokens.place[flow.token[flow.first[operation] + 1]]
    links = places.link_ns if code == TWO else places.link2_ns
    return int(links[site, other])


@inner
def _fault(flow: Flow, places: Places, tokens: Tokens, gate: int) -> int:
    """Return why a two-body gate cannot happen now, 0 if it can."""
    entry = flow.first[gate]
    one, two = tokens.place[flow.token[entry]], tokens.place[flow.token[entry + 1]]
    if flow.code[gate] == TWO:
        return GOOD if places.link_ns[one, two] >= 0 else _OFF_LINK
    if places.link2_ns[one, two] < 0:
        return _OFF_LINK
    for k, site in ((entry, one), (entry + 1, two)):
        if flow.needs[k] and not places.has_level2[site]:
            return _NO_LEVEL2
    return GOOD


@inner
def _perform(
    flow: Flow, places: Places, lives: Lives, tokens: Tokens, operation: int,
    record: Record, count: int,
) -> int:  # fmt: skip
    """Let an operation happen; return the number of windows."""
    entries = range(flow.first[operation], flow.first[operation + 1])
    start = 0
    for e in entries:
        start = max(start, tokens.since[flow.token[e]])
    if flow.cause[operation] >= 0:
        start = max(start, record.end[flow.cause[operation]] + places.conditional_ns)
    span = _length(flow, places, tokens, operation)
    record.start[operation] = start
    record.end[operation] = start + span
    for e in entries:
        token = flow.token[e]
        site = tokens.place[token]
        count = _window(places, lives, tokens, token, start, record, count)
        record.site[e] = site
        holder = lives.holder[e]
        if lives.is_value[holder]:
            record.share[holder] += span / places.lifetime_ns[site]
        if flow.enters[e] and not tokens.high[token]:
            tokens.high[token] = True
            tokens.stay[token] = 0.0
        if tokens.high[token]:
            tokens.stay[token] += span / places.level2_lifetime_ns[site]
            record.stay[holder] = max(record.stay[holder], tokens.stay[token])
        if flow.leaves[e]:
            tokens.high[token] = False
        tokens.since[token] = start + span
        tokens.last[token] = e
    return count


@inner
def _swap(
    places: Places, lives: Lives, tokens: Tokens, number: int, a: int, b: int,
    record: Record, count: int,
) -> int:  # fmt: skip
    """Swap what is on two sites; return the number of windows, -1 if forbidden."""
    one, two = tokens.at[a], tokens.at[b]
    high = tokens.high[one] or tokens.high[two]
    span = 3 * (places.link2_ns[a, b] if high else places.link_ns[a, b])
    if span < 0 or (high and not (places.has_level2[a] and places.has_level2[b])):
        return -1
    start = max(tokens.since[one], tokens.since[two])
    record.swap_start[number] = start
    record.swap_end[number] = start + span
    record.high_swap[number] = high
    for token in (one, two):
        count = _window(places, lives, tokens, token, start, record, count)
        _live(places, lives, tokens, token, span, record)
        tokens.since[token] = start + span
    tokens.at[a], tokens.at[b] = two, one
    tokens.place[one], tokens.place[two] = b, a
    return count


@inner
def _run_free(
    flow: Flow, places: Places, lives: Lives, tokens: Tokens, record: Record,
    waits: Ints, free: Ints, ready: Flags, size: int, count: int,
) -> int:  # fmt: skip
    """Perform all that needs no link and is free; mark gates that are ready."""
    while size > 0:
        size -= 1
        operation = free[size]
        if flow.code[operation] >= TWO:
            ready[operation] = True
        else:
            count = _perform(flow, places, lives, tokens, operation, record, count)
            size = release(flow, operation, waits, free, size)
    return count


@compiled
def follow(
    flow: Flow, places: Places, lives: Lives, tokens: Tokens, record: Record,
    gates: Ints, gaps: Ints, swap_a: Ints, swap_b: Ints,
) -> tuple[int, int, int]:  # fmt: skip
    """Follow a route; return why it stopped, where, and the number of windows.

    `gates` are the operations of the two-body gates in the order of the route, of
    which the first `gaps[i]` happen before swap i.
    """
    waits = flow.waits.copy()
    free = np.empty(len(waits) + 1, dtype=np.int64)
    ready = np.zeros(len(waits), dtype=np.bool_)
    size = begin(waits, free)
    count = _run_free(flow, places, lives, tokens, record, waits, free, ready, size, 0)
    done = 0
    for swap in range(len(swap_a) + 1):
        until = gaps[swap] if swap < len(swap_a) else len(gates)
        for k in range(done, until):
            gate = gates[k]
            if not ready[gate]:
                return _NOT_READY, gate, count
            fault = _fault(flow, places, tokens, gate)
            if fault != GOOD:
                return fault, gate, count
            count = _perform(flow, places, lives, tokens, gate, record, count)
            size = release(flow, gate, waits, free, 0)
            count = _run_free(
                flow, places, lives, tokens, record, waits, free, ready, size, count
            )
        done = until
        if swap < len(swap_a):
            count = _swap(
                places, lives, tokens, swap, swap_a[swap], swap_b[swap], record, count
            )
            if count < 0:
                return _BAD_SWAP, swap, 0
    end = 0
    for operation in range(len(waits)):
        if waits[operation] > 0:
            return _LEFT_OVER, operation, count
        end = max(end, record.end[operation])
    for swap in range(len(swap_a)):
        end = max(end, record.swap_end[swap])
    for token in range(len(tokens.place)):
        count = _window(places, lives, tokens, token, end, record, count)
        if tokens.high[token]:
            holder = lives.holder[tokens.last[token]]
            record.stay[holder] = max(record.stay[holder], tokens.stay[token])
    return GOOD, end, count
