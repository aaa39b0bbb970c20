"""Sites on which a placement needs no swap at all, where such sites can be found.

In: a placement.  Out: a permutation of sites like that of the annealing, under which
all that meets has a link, or nothing.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from placer.planner.embed import could_embed, embed, graph_of
from placer.planner.placement import local_sites

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from placer.planner.placement import Instance, Placement


def zero_swap(
    instance: Instance, placement: Placement, *, nodes: int, seed: int
) -> NDArray[np.int64] | None:
    """Return the new site of every token so that all meetings are on links.

    What shares a site over time stays together.  `None` where level 2 is used, where
    counts forbid it, or where the search finds nothing within so many nodes.
    """
    meetings = _meetings(instance, placement)
    if not meetings:
        return None
    tokens = sorted({p for pair in meetings for p in pair})
    rank = {p: k for k, p in enumerate(tokens)}
    usable = list(instance.usable)
    place = {p: k for k, p in enumerate(usable)}
    device = instance.problem.device
    links = [
        (place[link.a], place[link.b])
        for link in device.links
        if device.is_usable(link)
    ]
    pattern = graph_of(len(tokens), [(rank[a], rank[b]) for a, b in sorted(meetings)])
    target = graph_of(len(usable), links)
    if not could_embed(pattern, target):
        return None
    found = embed(pattern, target, nodes=nodes, seed=seed)
    if found is None:
        return None
    to = np.arange(len(instance.tables.one), dtype=np.int64)
    taken = {usable[int(k)] for k in found}
    for p, k in zip(tokens, found.tolist(), strict=True):
        to[p] = usable[k]
    # Tokens that meet nobody stay where they are, or take the sites left over.
    alone = [p for p in usable if p not in rank]
    left = sorted(set(usable) - taken - set(alone))
    for p in alone:
        to[p] = p if p not in taken else left.pop(0)
    return to


def _meetings(instance: Instance, placement: Placement) -> set[tuple[int, int]]:
    pairs: set[tuple[int, int]] = set()
    for step in range(instance.steps):
        profile = instance.profiles[step][placement.recipes[step]]
        where = local_sites(instance, step, placement.sites, placement.slot_sites[step])
        for pair in profile.pairs:
            if pair.mask[0]:
                return set()
            a, b = where[pair.a], where[pair.b]
            pairs.add((min(a, b), max(a, b)))
    return pairs
