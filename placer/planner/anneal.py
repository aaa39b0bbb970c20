"""Find better home sites for everything at once, by simulated annealing.

In: how often the tokens of the sites meet, in which kind of gate, and what each token
pays at each site.  Out: a permutation of sites.  What shares a site over time stays
together, so that a valid placement stays valid.  Compiled by numba.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numba
import numpy as np

from placer.planner.placement import Instance, Placement, local_sites
from placer.planner.placement import schedule as reschedule

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

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
    return _rows(count, meetings, prices, alone)


def _ends(instance: Instance, placement: Placement) -> list[int]:
    from placer.planner.placement import duration

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
    profile: object,
    where: Sequence[int],
) -> None:
    tables = instance.tables
    for local, site in enumerate(where):
        for counts, row in (
            (profile.ones, tables.one),  # type: ignore[attr-defined]
            (profile.tees, tables.tee),  # type: ignore[attr-defined]
            (profile.reads, tables.read),  # type: ignore[attr-defined]
            (profile.wipes, tables.wipe),  # type: ignore[attr-defined]
        ):
            if counts[local]:
                alone[site] += float(counts[local]) * np.asarray(row)
        time = profile.level2_ns[local]  # type: ignore[attr-defined]
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


def _rows(
    count: int,
    meetings: dict[tuple[int, int, int], int],
    prices: NDArray[np.float64],
    alone: NDArray[np.float64],
) -> Flow:
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
    return _anneal(
        identity,
        flow.offsets,
        flow.others,
        flow.weights,
        flow.kinds,
        flow.flipped,
        flow.prices,
        flow.alone,
        active,
        np.array(usable, dtype=np.int64),
        neighbours[0],
        neighbours[1],
        moves,
        seed,
        heat,
    )


@numba.njit(cache=True)
def _token_cost(
    t, site, place, offsets, others, weights, kinds, flipped, prices, alone
):  # type: ignore[no-untyped-def]
    total = alone[t, site]
    for k in range(offsets[t], offsets[t + 1]):
        other = place[others[k]]
        if flipped[k]:
            total += weights[k] * prices[kinds[k], other, site]
        else:
            total += weights[k] * prices[kinds[k], site, other]
    return total


@numba.njit(cache=True)
def _anneal(  # type: ignore[no-untyped-def]
    place,
    offsets,
    others,
    weights,
    kinds,
    flipped,
    prices,
    alone,
    active,
    usable,
    link_offsets,
    link_sites,
    moves,
    seed,
    heat,
):
    np.random.seed(seed)
    count = place.shape[0]
    token_at = np.empty(count, dtype=np.int64)
    for t in range(count):
        token_at[place[t]] = t
    best = place.copy()
    current = 0.0
    best_cost = 0.0
    hot = 0.0
    cold = 0.0
    samples = min(200, moves)
    for move in range(samples + moves):
        a = active[np.random.randint(active.shape[0])]
        target = usable[np.random.randint(usable.shape[0])]
        degree = offsets[a + 1] - offsets[a]
        if degree > 0 and np.random.random() < 0.7:
            near = place[others[offsets[a] + np.random.randint(degree)]]
            links = link_offsets[near + 1] - link_offsets[near]
            if links > 0:
                target = link_sites[link_offsets[near] + np.random.randint(links)]
        b = token_at[target]
        if a == b:
            continue
        source = place[a]
        before = _token_cost(
            a, source, place, offsets, others, weights, kinds, flipped, prices, alone
        ) + _token_cost(
            b, target, place, offsets, others, weights, kinds, flipped, prices, alone
        )
        place[a] = target
        place[b] = source
        after = _token_cost(
            a, target, place, offsets, others, weights, kinds, flipped, prices, alone
        ) + _token_cost(
            b, source, place, offsets, others, weights, kinds, flipped, prices, alone
        )
        change = after - before
        if move < samples:
            # Measure the size of changes first, then set the temperatures.
            if change < 1e13:
                hot += abs(change) / samples
            place[a] = source
            place[b] = target
            continue
        if move == samples:
            hot = max(hot, 1e-9) * heat * 0.5
            cold = max(hot * 1e-3, 1e-9)
        share = (move - samples) / moves
        temperature = hot * (cold / max(hot, 1e-30)) ** share if hot > 0 else 0.0
        accept = change <= 0
        if not accept and temperature > 0:
            accept = np.random.random() < np.exp(-change / temperature)
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


def move(instance: Instance, placement: Placement, to: Sequence[int]) -> Placement:
    """Return the placement with every site p renamed to `to[p]`, rescheduled."""
    sites = tuple(int(to[p]) for p in placement.sites)
    slots = tuple(tuple(int(to[p]) for p in row) for row in placement.slot_sites)
    order = sorted(range(instance.steps), key=lambda i: (placement.starts[i], i))
    starts = reschedule(instance, order, sites, placement.recipes, slots)
    return Placement(sites, placement.recipes, slots, starts)
