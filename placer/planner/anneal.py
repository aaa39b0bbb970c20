"""Find better home sites for everything at once, by simulated annealing.

In: how often the tokens of the sites meet, in which kind of gate, and what each token
pays at each site.  Out: a permutation of sites.  What shares a site over time stays
together, so that a valid placement stays valid.  Compiled by numba.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from placer.compiled import compiled, inner
from placer.planner.placement import Instance, Placement, duration, local_sites
from placer.planner.placement import schedule as reschedule

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from placer.planner.profile import Profile

HARD = 1e15


@dataclass(frozen=True, slots=True)
class Flow:
    """Meetings of tokens as adjacency rows, and prices of tokens alone.

    `offsets`, `others`, `weights`, `kinds`: row t lists the tokens that t meets;
    `prices[kind]` is a site-by-site matrix; `alone[t, p]` is what t pays at p.
    """

    offsets: NDArray[np.int64]
    others: NDArray[np.int64]
    weights: NDArray[np.float64]
    kinds: NDArray[np.int64]
    flipped: NDArray[np.int64]
    prices: NDArray[np.float64]
    alone: NDArray[np.float64]


def flow_of(instance: Instance, placement: Placement, move_scale: float) -> Flow:
    """Return the meetings of a placement's tokens (a token is a site's content)."""
    tables = instance.tables
    count = len(tables.one)
    masks: dict[tuple[bool, bool, bool], int] = {(False, False, False): 0}
    meetings: dict[tuple[int, int, int], int] = {}
    alone = np.zeros((count, count))
    ends = _ends(instance, placement)
    for step in range(instance.steps):
        profile = instance.profiles[step][placement.recipes[step]]
        where = local_sites(instance, step, placement.sites, placement.slot_sites[step])
        for pair in profile.pairs:
            kind = masks.setdefault(pair.mask, len(masks))
            key = (where[pair.a], where[pair.b], kind)
            meetings[key] = meetings.get(key, 0) + pair.count
        _add_alone(alone, instance, profile, where)
        for slot, site in enumerate(placement.slot_sites[step]):
            alone[site] += np.asarray(tables.rate) * float(profile.live_ns[slot])
    makespan = max(ends, default=0)
    for w, wire in enumerate(instance.wires):
        if wire.is_known_zero and not wire.uses:
            continue
        begin = placement.starts[wire.uses[0]] if wire.is_known_zero else 0
        to = ends[wire.uses[-1]] if wire.ends_known and wire.uses else makespan
        alone[placement.sites[w]] += np.asarray(tables.rate) * float(to - begin)
    out = [p for p in range(count) if p not in set(instance.usable)]
    alone[:, out] += HARD
    for p in out:
        alone[p, :] = 0.0
        alone[p, p] = -HARD
    prices = np.stack([_scaled(instance, mask, move_scale) for mask in masks])
    return rows_of(count, meetings, prices, alone)


def _ends(instance: Instance, placement: Placement) -> list[int]:
    return [
        placement.starts[step]
        + duration(
            instance,
            instance.profiles[step][placement.recipes[step]],
            local_sites(instance, step, placement.sites, placement.slot_sites[step]),
        )
        for step in range(instance.steps)
    ]


def _add_alone(
    alone: NDArray[np.float64],
    instance: Instance,
    profile: Profile,
    where: Sequence[int],
) -> None:
    tables = instance.tables
    for local, site in enumerate(where):
        for counts, row in (
            (profile.ones, tables.one),
            (profile.tees, tables.tee),
            (profile.reads, tables.read),
            (profile.wipes, tables.wipe),
        ):
            if counts[local]:
                alone[site] += float(counts[local]) * np.asarray(row)
        time = profile.level2_ns[local]
        if time:
            rate2 = np.asarray(tables.rate2, dtype=np.float64)
            extra = np.maximum(rate2 - np.asarray(tables.rate), 0.0) * float(time)
            alone[site] += np.where(rate2 < 0, HARD, extra)


def _scaled(
    instance: Instance, mask: tuple[bool, bool, bool], scale: float
) -> NDArray[np.float64]:
    tables = instance.tables
    price = np.asarray(tables.pair_cost(mask), dtype=np.float64)
    gate = float(tables.gate_floor(mask))
    scaled = gate + scale * (price - gate)
    return np.where(price >= tables.far_cost, HARD / 1e3, scaled)


def rows_of(
    count: int,
    meetings: dict[tuple[int, int, int], int],
    prices: NDArray[np.float64],
    alone: NDArray[np.float64],
) -> Flow:
    """Return meetings (token, token, kind of gate: how often) as adjacency rows."""
    rows: list[list[tuple[int, float, int, int]]] = [[] for _ in range(count)]
    for (a, b, kind), weight in sorted(meetings.items()):
        rows[a].append((b, float(weight), kind, 0))
        rows[b].append((a, float(weight), kind, 1))
    offsets = np.zeros(count + 1, dtype=np.int64)
    for t, row in enumerate(rows):
        offsets[t + 1] = offsets[t] + len(row)
    flat = [entry for row in rows for entry in row]
    return Flow(
        offsets,
        np.array([e[0] for e in flat], dtype=np.int64),
        np.array([e[1] for e in flat], dtype=np.float64),
        np.array([e[2] for e in flat], dtype=np.int64),
        np.array([e[3] for e in flat], dtype=np.int64),
        prices,
        alone,
    )


def anneal(
    flow: Flow,
    usable: Sequence[int],
    neighbours: tuple[NDArray[np.int64], NDArray[np.int64]],
    *,
    moves: int,
    seed: int,
    heat: float = 1.0,
) -> NDArray[np.int64]:
    """Return the new site of every token; index = old site.

    `neighbours` are the links as (offsets, sites).  `heat` scales the starting
    temperature; 0 means descent only.
    """
    count = flow.alone.shape[0]
    active = np.array(
        [
            t
            for t in usable
            if flow.offsets[t + 1] > flow.offsets[t] or flow.alone[t].any()
        ],
        dtype=np.int64,
    )
    identity = np.arange(count, dtype=np.int64)
    if len(active) == 0:
        return identity
    rows = (
        flow.offsets,
        flow.others,
        flow.weights,
        flow.kinds,
        flow.flipped,
        flow.alone,
    )
    links = (*neighbours, np.array(usable, dtype=np.int64))
    result: NDArray[np.int64] = _anneal(
        identity, rows, flow.prices, links, active, moves, seed, heat
    )
    return result


@inner
def _next(state: Any) -> Any:
    # xorshift64*: small, seedable, the same on every platform.
    x = state[0]
    x ^= x >> np.uint64(12)
    x ^= x << np.uint64(25)
    x ^= x >> np.uint64(27)
    state[0] = x
    return x * np.uint64(2685821657736338717)


@inner
def _below(state: Any, limit: Any) -> Any:
    return np.int64((_next(state) >> np.uint64(33)) % np.uint64(limit))


@inner
def _unit(state: Any) -> Any:
    return np.float64(_next(state) >> np.uint64(11)) / 9007199254740992.0


@inner
def _token_cost(t: Any, site: Any, place: Any, rows: Any, prices: Any) -> Any:
    offsets, others, weights, kinds, flipped, alone = rows
    total = alone[t, site]
    for k in range(offsets[t], offsets[t + 1]):
        other = place[others[k]]
        if flipped[k]:
            total += weights[k] * prices[kinds[k], other, site]
        else:
            total += weights[k] * prices[kinds[k], site, other]
    return total


@inner
def _change(a: Any, b: Any, place: Any, rows: Any, prices: Any) -> Any:
    """Exchange the sites of two tokens and return the change of cost."""
    source, target = place[a], place[b]
    before = _token_cost(a, source, place, rows, prices)
    before += _token_cost(b, target, place, rows, prices)
    place[a] = target
    place[b] = source
    after = _token_cost(a, target, place, rows, prices)
    return after + _token_cost(b, source, place, rows, prices) - before


@inner
def _propose(state: Any, place: Any, rows: Any, links: Any, active: Any) -> Any:
    """Return a token and a site: mostly one beside a token that it meets."""
    offsets, others = rows[0], rows[1]
    link_offsets, link_sites, usable = links
    a = active[_below(state, active.shape[0])]
    degree = offsets[a + 1] - offsets[a]
    if degree > 0 and _unit(state) < 0.7:
        near = place[others[offsets[a] + _below(state, degree)]]
        count = link_offsets[near + 1] - link_offsets[near]
        if count > 0:
            return a, link_sites[link_offsets[near] + _below(state, count)]
    return a, usable[_below(state, usable.shape[0])]


@compiled
def _anneal(
    place: Any,
    rows: Any,
    prices: Any,
    links: Any,
    active: Any,
    moves: Any,
    seed: Any,
    heat: Any,
) -> Any:
    state = np.array([np.uint64(seed) * np.uint64(7919) + np.uint64(88172645463325252)])
    token_at = np.empty_like(place)
    for t in range(place.shape[0]):
        token_at[place[t]] = t
    # Measure the size of changes first, then set the temperatures.
    hot = 0.0
    samples = 200
    for _ in range(samples):
        a, target = _propose(state, place, rows, links, active)
        b = token_at[target]
        if a != b:
            change = abs(_change(a, b, place, rows, prices))
            _change(a, b, place, rows, prices)
            if change < 1e13:
                hot += change / samples
    hot *= 0.5 * heat
    best = place.copy()
    current = 0.0
    best_cost = 0.0
    for step in range(moves):
        a, target = _propose(state, place, rows, links, active)
        b = token_at[target]
        if a == b:
            continue
        source = place[a]
        change = _change(a, b, place, rows, prices)
        temperature = hot * 1e-3 ** (step / moves)
        accept = change <= 0
        if not accept and temperature > 0:
            accept = _unit(state) < np.exp(-change / temperature)
        if accept:
            token_at[target] = a
            token_at[source] = b
            current += change
            if current < best_cost - 1e-6:
                best_cost = current
                best[:] = place
        else:
            place[a] = source
            place[b] = target
    return best


def neighbours_of(instance: Instance) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Return the usable links of the device as rows (offsets, sites)."""
    device = instance.problem.device
    rows: list[list[int]] = [[] for _ in device.sites]
    for link in device.links:
        if device.is_usable(link):
            rows[link.a].append(link.b)
            rows[link.b].append(link.a)
    offsets = np.cumsum([0, *(len(row) for row in rows)], dtype=np.int64)
    sites = np.array([p for row in rows for p in sorted(row)], dtype=np.int64)
    return offsets, sites


def move(instance: Instance, placement: Placement, to: Sequence[int]) -> Placement:
    """Return the placement with every site p renamed to `to[p]`, rescheduled."""
    sites = tuple(int(to[p]) for p in placement.sites)
    slots = tuple(tuple(int(to[p]) for p in row) for row in placement.slot_sites)
    order = sorted(range(instance.steps), key=lambda i: (placement.starts[i], i))
    starts = reschedule(instance, order, sites, placement.recipes, slots)
    return Placement(sites, placement.recipes, slots, starts)
