"""Where a plan may go when the budget limits the number of sites.

In: a problem with a limit on sites.  Out: the same problem on a device of which only
a compact region is in service, so that placements and routes stay inside it.
"""

from __future__ import annotations

import dataclasses
from typing import TYPE_CHECKING

from placer.planner.placement import Instance, make_instance
from placer.tables import device_tables

if TYPE_CHECKING:
    from placer.device.model import Device


def narrowed(instance: Instance) -> Instance:
    """Return the instance on a region of as many sites as the budget allows.

    Returns the instance itself when there is no such limit, or when no connected
    region is large enough.
    """
    problem = instance.problem
    most = problem.budget.most_sites
    if most is None or most >= len(instance.usable):
        return instance
    region = _compact(instance, most)
    if len(region) < most:
        return instance
    kept = set(region)
    device: Device = problem.device
    sites = tuple(
        dataclasses.replace(site, in_service=site.id in kept) for site in device.sites
    )
    small = dataclasses.replace(device, sites=sites)
    return make_instance(
        dataclasses.replace(problem, device=small), device_tables(small)
    )


def _compact(instance: Instance, most: int) -> list[int]:
    """Return the connected region with most links inside, then the least decay."""
    best: tuple[int, int, list[int]] | None = None
    for seed in instance.usable:
        region = _grown(instance, seed, most)
        if len(region) < most:
            continue
        inside = set(region)
        links = sum(
            1
            for link in instance.problem.device.links
            if link.a in inside and link.b in inside
        )
        decay = sum(int(instance.tables.rate[p]) for p in region)
        rank = (-links, decay, region)
        if best is None or rank < best:
            best = rank
    return [] if best is None else best[2]


def _grown(instance: Instance, seed: int, most: int) -> list[int]:
    tables = instance.tables
    usable = set(instance.usable)
    region = [seed]
    while len(region) < most:
        inside = set(region)
        rim: dict[int, int] = {}
        for p in region:
            for q in tables.neighbours[tables.starts[p] : tables.starts[p + 1]]:
                if int(q) in usable and int(q) not in inside:
                    rim[int(q)] = rim.get(int(q), 0) + 1
        if not rim:
            break
        hop = tables.hop[seed]
        region.append(min(rim, key=lambda q: (-rim[q], int(hop[q]), q)))
    return sorted(region)
