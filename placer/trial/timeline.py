"""The timeline of a route: when everything happens, and what it costs.

In: a placed circuit, a device's tables, a route.  Out: times, costs by cause, life of
values, exactly as DEVELOPERS.md defines under 'The route and the figures'.  The loop
that follows the route is compiled; every rounded cost is made outside of it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from placer.compiled import compiled, inner
from placer.device.fidelity import dephasing_rate, level2_process_fidelity
from placer.errors import InternalError
from placer.placed import BARRIER, LEVEL2, MEASURE, ONE, RESET, TEE, TWO
from placer.plan import Costs, Figures
from placer.trial.release import begin, release
from placer.units import cost_of_fidelity, success_of

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from placer.device.model import Site
    from placer.placed import Flags, Flow, Ints, PlacedCircuit
    from placer.tables import Tables
    from placer.trial.router import RouteResult

    Reals = NDArray[np.float64]

# Columns of a window: where, how long, in level 2 or not.
_SITE, _SPAN, _HIGH = range(3)
# Why the compiled loop stopped.
_GOOD, _OFF_LINK, _NO_LEVEL2, _NOT_READY, _BAD_SWAP, _LEFT_OVER = range(6)
_WHY = (
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


@dataclass(frozen=True, slots=True, eq=False)
class Timeline:
    """What a route does: figures in whole ns and costs, and where they come from.

    `step_start` and `step_end` span the operations of each step (-1 without any);
    `step_cost` is what its gates, measurements and resets cost where they happen
    (no swaps, no decay), `swap_cost` and `swap_start`/`swap_end` are per swap,
    `decay_of_site` is the decay charged on each site.  `share` is the part of
    min(T1, T2) that each holder lives as a value (0 for others), `stay` the longest
    stay of each holder in level 2 as part of that level's lifetime.  `touched` counts
    sites in use.  `start` and `end` are per operation.
    """

    costs: Costs
    time_ns: int
    touched: int
    swaps: int
    counts: tuple[int, ...]
    start: Ints
    end: Ints
    step_start: Ints
    step_end: Ints
    step_cost: Ints
    swap_start: Ints
    swap_end: Ints
    swap_cost: Ints
    decay_of_site: Ints
    share: Reals
    stay: Reals

    @property
    def worst(self) -> tuple[float, int, bool]:
        """The largest share, its holder (-1 for none), and whether it is in level 2."""
        best: tuple[float, int, bool] = (0.0, -1, False)
        for shares, high in ((self.share, False), (self.stay, True)):
            if len(shares):
                holder = int(np.argmax(shares))
                if float(shares[holder]) > best[0]:
                    best = (float(shares[holder]), holder, high)
        return best


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
        return _GOOD if places.link_ns[one, two] >= 0 else _OFF_LINK
    if places.link2_ns[one, two] < 0:
        return _OFF_LINK
    for k, site in ((entry, one), (entry + 1, two)):
        if flow.needs[k] and not places.has_level2[site]:
            return _NO_LEVEL2
    return _GOOD


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
def _follow(
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
            if fault != _GOOD:
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
    return _GOOD, end, count


def timeline(placed: PlacedCircuit, tables: Tables, route: RouteResult) -> Timeline:
    """Follow a route and return when everything happens and what it costs.

    Raises
    ------
    InternalError
        If the route breaks a rule of the device or of the circuit.
    """
    flow = placed.flow
    swaps = len(route.swap_a)
    order = np.argsort(route.gap_of_gate, kind="stable")
    gaps = np.searchsorted(
        route.gap_of_gate[order], np.arange(swaps, dtype=np.int64), side="right"
    )
    record = _blank_record(placed, swaps)
    why, where, count = _follow(
        flow,
        _places(tables),
        Lives(
            placed.holder,
            placed.is_value,
            placed.alive_after,
            placed.valued_after,
            placed.alive_before,
        ),
        _fresh_tokens(placed.sites),
        record,
        placed.gates[order],
        gaps.astype(np.int64),
        route.swap_a,
        route.swap_b,
    )
    if why != _GOOD:
        raise InternalError(f"bad trial route: {_WHY[why]} (at {where})")
    return _account(placed, tables, route, record, int(where), record.windows[:count])


def _places(tables: Tables) -> Places:
    return Places(
        tables.site_one_ns,
        tables.site_tee_ns,
        tables.site_readout_ns,
        tables.site_reset_ns,
        tables.link_ns,
        tables.link2_ns,
        tables.has_level2,
        tables.lifetime_ns,
        tables.level2_lifetime_ns,
        tables.conditional_ns,
    )


def _fresh_tokens(sites: int) -> Tokens:
    own = np.arange(sites, dtype=np.int64)
    return Tokens(
        own,
        own.copy(),
        np.zeros_like(own),
        np.full_like(own, -1),
        np.zeros(sites, dtype=np.bool_),
        np.zeros(sites, dtype=np.float64),
    )


def _blank_record(placed: PlacedCircuit, swaps: int) -> Record:
    entries = len(placed.flow.token)
    return Record(
        start=np.zeros(placed.operations, dtype=np.int64),
        end=np.zeros(placed.operations, dtype=np.int64),
        site=np.zeros(entries, dtype=np.int64),
        swap_start=np.zeros(swaps, dtype=np.int64),
        swap_end=np.zeros(swaps, dtype=np.int64),
        high_swap=np.zeros(swaps, dtype=np.bool_),
        windows=np.zeros((entries + 2 * swaps + placed.sites, 3), dtype=np.int64),
        share=np.zeros(placed.holders, dtype=np.float64),
        stay=np.zeros(placed.holders, dtype=np.float64),
    )


def _account(
    placed: PlacedCircuit,
    tables: Tables,
    route: RouteResult,
    record: Record,
    end: int,
    windows: Ints,
) -> Timeline:
    flow = placed.flow
    prices = _prices(placed, tables, record.site)
    by_code = [int(prices[flow.code == code].sum()) for code in range(LEVEL2 + 1)]
    counts = np.bincount(flow.code, minlength=LEVEL2 + 1)
    swap_cost = 3 * np.where(
        record.high_swap,
        tables.two2[route.swap_a, route.swap_b],
        tables.two[route.swap_a, route.swap_b],
    )
    decay = _decay(tables, windows)
    costs = Costs(
        two_qubit=by_code[TWO],
        one_qubit=by_code[ONE] + by_code[TEE],
        swaps=int(swap_cost.sum()),
        decay=int(decay.sum()),
        measurement=by_code[MEASURE],
        level2=by_code[LEVEL2],
        preparation=by_code[RESET] + int(tables.prep[placed.fresh].sum()),
    )
    used = np.zeros(placed.sites, dtype=np.bool_)
    for touched in (record.site, route.swap_a, route.swap_b, placed.held):
        used[touched] = True
    step_start = np.full(placed.steps, np.iinfo(np.int64).max, dtype=np.int64)
    np.minimum.at(step_start, placed.step, record.start)
    step_end = np.full(placed.steps, -1, dtype=np.int64)
    np.maximum.at(step_end, placed.step, record.end)
    step_cost = np.zeros(placed.steps, dtype=np.int64)
    np.add.at(step_cost, placed.step, prices)
    return Timeline(
        costs=costs,
        time_ns=end,
        touched=int(used.sum()),
        swaps=len(route.swap_a),
        counts=tuple(int(c) for c in counts),
        start=record.start,
        end=record.end,
        step_start=np.where(step_end < 0, -1, step_start),
        step_end=step_end,
        step_cost=step_cost,
        swap_start=record.swap_start,
        swap_end=record.swap_end,
        swap_cost=swap_cost,
        decay_of_site=decay,
        share=record.share,
        stay=record.stay,
    )


def _prices(placed: PlacedCircuit, tables: Tables, site: Ints) -> Ints:
    """Return what each operation costs where it happens."""
    flow = placed.flow
    prices = np.zeros(placed.operations, dtype=np.int64)
    begin_at = flow.first[:-1]
    for code, price in (
        (ONE, tables.one),
        (TEE, tables.tee),
        (MEASURE, tables.read),
        (RESET, tables.wipe),
    ):
        chosen = np.flatnonzero(flow.code == code)
        prices[chosen] = price[site[begin_at[chosen]]]
    for code, links in ((TWO, tables.two), (LEVEL2, tables.two2)):
        chosen = np.flatnonzero(flow.code == code)
        at = begin_at[chosen]
        prices[chosen] = links[site[at], site[at + 1]]
    return prices


def _decay(tables: Tables, windows: Ints) -> Ints:
    """Return the decay charged on each site; every window is rounded up by itself."""
    total = np.zeros(tables.sites, dtype=np.int64)
    if not len(windows):
        return total
    longest = int(windows[:, _SPAN].max()) + 1
    place = 2 * windows[:, _SITE] + windows[:, _HIGH]
    keys, times = np.unique(place * longest + windows[:, _SPAN], return_counts=True)
    for key, count in zip(keys.tolist(), times.tolist(), strict=True):
        where, span = divmod(key, longest)
        site, high = divmod(where, 2)
        total[site] += count * wait_cost(tables.device.sites[site], span, bool(high))
    return total


def wait_cost(site: Site, span_ns: int, in_level2: bool = False) -> int:
    """Return the cost of waiting on a site for a time in ns, rounded up."""
    span = span_ns / 1000.0
    if in_level2 and site.level2 is not None:
        dephasing = dephasing_rate(site.t1_us, site.t2_us)
        fidelity = level2_process_fidelity(
            span, site.t1_us, site.level2.t1_us, dephasing
        )
    else:
        kept1 = 1.0 if site.t1_us is None else math.exp(-span / site.t1_us)
        kept2 = 1.0 if site.t2_us is None else math.exp(-span / site.t2_us)
        fidelity = (1.0 + kept1 + 2.0 * kept2) / 4.0
    return cost_of_fidelity(fidelity)


def figures(line: Timeline, names: Sequence[str]) -> Figures:
    """Return the figures of a plan; `names` are those of the holders."""
    share, holder, high = line.worst
    name = "" if holder < 0 else names[holder] + (" in level 2" if high else "")
    return Figures(
        sites=line.touched,
        swaps=line.swaps,
        time_ns=line.time_ns,
        two_qubit_gates=line.counts[TWO],
        one_qubit_gates=line.counts[ONE] + line.counts[TEE],
        t_gates=line.counts[TEE],
        measurements=line.counts[MEASURE],
        level2_gates=line.counts[LEVEL2],
        costs=line.costs,
        success=success_of(line.costs.total),
        worst_share=share,
        worst_value=name,
    )
