"""The zero-swap search: what it finds is an embedding; what has none is not found."""

from __future__ import annotations

import random

import networkx as nx
import numpy as np
import pytest

from placer.device import lattices
from placer.planner.embed import could_embed, embed, graph_of

Pairs = list[tuple[int, int]]


def planted(lattice: lattices.Lattice, share: float, seed: int) -> tuple[int, Pairs]:
    """Return a share of a lattice's links under new names, and how many names."""
    draw = random.Random(seed)
    links = draw.sample(lattice.links, round(share * len(lattice.links)))
    names = sorted({v for link in links for v in link})
    draw.shuffle(names)
    number = {v: k for k, v in enumerate(names)}
    return len(names), [(number[a], number[b]) for a, b in links]


def is_embedding(found: np.ndarray, pairs: Pairs, lattice: lattices.Lattice) -> bool:
    links = {frozenset(link) for link in lattice.links}
    met = [frozenset((int(found[a]), int(found[b]))) for a, b in pairs]
    return len(set(found.tolist())) == len(found) and all(m in links for m in met)


@pytest.mark.parametrize("share", [0.4, 0.6, 0.8, 1.0])
@pytest.mark.parametrize("seed", range(3))
def test_planted_patterns_are_found(share: float, seed: int) -> None:
    lattice = lattices.heavy_hex(7, 15)
    count, pairs = planted(lattice, share, seed)
    target = graph_of(lattice.count, lattice.links)
    found = embed(graph_of(count, pairs), target, nodes=1_000_000, seed=seed)
    assert found is not None
    assert is_embedding(found, pairs, lattice)


@pytest.mark.parametrize("seed", range(40))
def test_small_graphs_agree_with_an_exhaustive_search(seed: int) -> None:
    # networkx' matcher tries everything on such small graphs.
    draw = random.Random(seed)
    lattice = draw.choice(
        [lattices.grid(2, 3), lattices.ring(6), lattices.line(6), lattices.grid(3, 3)]
    )
    count = draw.randint(3, min(6, lattice.count))
    every = [(a, b) for a in range(count) for b in range(a + 1, count)]
    pairs = draw.sample(every, draw.randint(2, min(len(every), count + 1)))
    used = sorted({v for pair in pairs for v in pair})
    number = {v: k for k, v in enumerate(used)}
    pairs = [(number[a], number[b]) for a, b in pairs]
    matcher = nx.isomorphism.GraphMatcher(nx.Graph(lattice.links), nx.Graph(pairs))
    exists = matcher.subgraph_is_monomorphic()
    target = graph_of(lattice.count, lattice.links)
    found = embed(graph_of(len(used), pairs), target, nodes=100_000, seed=seed)
    assert (found is not None) == exists
    if found is not None:
        assert is_embedding(found, pairs, lattice)


def test_counts_forbid_a_star_on_a_ring() -> None:
    star = graph_of(4, [(0, 1), (0, 2), (0, 3)])
    ring = graph_of(8, list(lattices.ring(8).links))
    assert not could_embed(star, ring)
    assert embed(star, ring, nodes=1_000, seed=0) is None


def test_the_same_seed_gives_the_same_sites() -> None:
    lattice = lattices.heavy_hex(7, 15)
    count, pairs = planted(lattice, 0.5, 1)
    target = graph_of(lattice.count, lattice.links)
    one, two = (
        embed(graph_of(count, pairs), target, nodes=100_000, seed=3) for _ in range(2)
    )
    assert one is not None
    assert two is not None
    assert np.array_equal(one, two)
