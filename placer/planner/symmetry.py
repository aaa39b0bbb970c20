"""Renumberings of the sites that change no cost: what a proof need not try twice.

In: an instance.  Out: some of the permutations of its usable sites (positions in
`usable`) under which every price, distance and rate stays the same.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from placer.planner.placement import Instance

Permutation = tuple[int, ...]

MOST = 64
"""Permutations that are listed at most; any part of the group may be used."""
MOST_TRIES = 20_000


def symmetries(instance: Instance) -> list[Permutation]:
    """Return permutations that keep all figures, the identity first."""
    labels = _labels(instance)
    count = len(labels)
    found: list[Permutation] = []
    tries = 0
    image: list[int] = []

    def extend() -> None:
        nonlocal tries
        position = len(image)
        if position == count:
            found.append(tuple(image))
            return
        for p in range(count):
            tries += 1
            if len(found) >= MOST or tries > MOST_TRIES:
                return
            if p in image or labels[p, p] != labels[position, position]:
                continue
            if all(
                labels[position, other] == labels[p, image[other]]
                and labels[other, position] == labels[image[other], p]
                for other in range(position)
            ):
                image.append(p)
                extend()
                image.pop()

    extend()
    return found or [tuple(range(count))]


def representatives(permutations: list[Permutation]) -> list[int]:
    """Return the least position of every orbit of the group that these generate."""
    parent = list(range(len(permutations[0])))

    def root(p: int) -> int:
        while parent[p] != p:
            p = parent[p]
        return p

    for permutation in permutations:
        for p, q in enumerate(permutation):
            one, two = sorted((root(p), root(q)))
            parent[two] = one
    return [p for p in range(len(parent)) if root(p) == p]


def _labels(instance: Instance) -> NDArray[np.int64]:
    """Number what distinguishes two sites: equal numbers, equal figures."""
    tables = instance.tables
    sites = list(instance.usable)
    inside = np.ix_(sites, sites)
    masks = {
        pair.mask
        for row in instance.profiles
        for profile in row
        for pair in profile.pairs
    }
    layers = []
    for mask in sorted(masks | {(False, False, False)}):
        layers += [tables.pair_cost(mask)[inside], tables.away(mask)[inside]]
    alone = (tables.one, tables.tee, tables.read, tables.wipe, tables.prep)
    for row in (*alone, tables.rate, tables.rate2):
        layers.append(np.diag(row[sites]))
    layers.append(np.eye(len(sites), dtype=np.int64))
    stack = np.stack(layers, axis=-1).reshape(len(sites) ** 2, -1)
    _, numbers = np.unique(stack, axis=0, return_inverse=True)
    return np.asarray(numbers, dtype=np.int64).reshape(len(sites), len(sites))
