"""The device in numbers, as the check computes them for itself.

In: a device.  Out: nominal times, costs of single things, least costs and distances
between sites, made from their definitions in DEVELOPERS.md.
"""

from __future__ import annotations

import heapq
from typing import TYPE_CHECKING

from placer.units import cost_of_error, rate_per_tick

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Sequence

    from placer.check.base import Base
    from placer.device.model import Device, Link
    from placer.recipes.circuit import Built


def lower_median(values: Iterable[int]) -> int:
    """Return the lower median, 0 of nothing."""
    ordered = sorted(values)
    return ordered[(len(ordered) - 1) // 2] if ordered else 0


class Numbers:
    """Times in ns, costs in 1e-12 of -ln(fidelity); distances on demand."""

    def __init__(self, device: Device) -> None:
        self.device = device
        alive = [s for s in device.sites if s.in_service]
        self.links = [k for k in device.links if device.is_usable(k)]
        self.one_ns = lower_median(s.gate_ns for s in alive)
        self.tee_ns = self.one_ns if device.t_gate is None else device.t_gate.time_ns
        self.read_ns = lower_median(s.readout_ns for s in alive)
        self.wipe_ns = lower_median(s.reset_ns for s in alive)
        self.two_ns = lower_median(k.time_ns for k in self.links)
        self.high_ns = lower_median(
            k.level2_ns for k in self.links if k.level2_ns is not None
        )
        self.latency_ns = device.capabilities.conditional_ns or 0
        self.move_ns = -(-3 * self.two_ns // 4)
        self.near: dict[int, list[Link]] = {s.id: [] for s in device.sites}
        for link in self.links:
            self.near[link.a].append(link)
            self.near[link.b].append(link)
        # Recipes in nominal times, see `base`.
        self.bases: dict[int, tuple[Built, Base]] = {}
        self._one = [cost_of_error(s.gate_error) for s in device.sites]
        self._reach: dict[
            tuple[int, bool, bool, bool], tuple[dict[int, int], dict[int, int]]
        ] = {}

    def one(self, site: int) -> int:
        """Return the cost of a one-qubit gate."""
        return self._one[site]

    def tee(self, site: int) -> int:
        """Return the cost of a T gate."""
        priced = self.device.t_gate
        return self.one(site) if priced is None else cost_of_error(priced.error)

    def read(self, site: int) -> int:
        """Return the cost of a measurement."""
        return cost_of_error(self.device.sites[site].readout_error)

    def wipe(self, site: int) -> int:
        """Return the cost of a reset."""
        return cost_of_error(self.device.sites[site].reset_error)

    def prep(self, site: int) -> int:
        """Return the cost of starting in |0>."""
        return cost_of_error(self.device.sites[site].prep_error)

    def rate(self, site: int) -> int:
        """Return the slope of decay at time 0, per ns."""
        where = self.device.sites[site]
        slope = (_inverse(where.t1_us) + 2.0 * _inverse(where.t2_us)) / 4.0
        return rate_per_tick(slope)

    def dephasing(self, site: int) -> float:
        """Return 1/Tphi = 1/T2 - 1/(2 T1) per us, no less than 0."""
        where = self.device.sites[site]
        return max(0.0, _inverse(where.t2_us) - 0.5 * _inverse(where.t1_us))

    def high_rate(self, site: int) -> int | None:
        """Return the slope of decay with three levels, `None` without level 2."""
        where = self.device.sites[site]
        if where.level2 is None:
            return None
        dephasing = self.dephasing(site)
        both = _inverse(where.t1_us) + _inverse(where.level2.t1_us)
        return rate_per_tick((3.0 * both + 12.0 * dephasing) / 9.0)

    def lifetime_ns(self, site: int) -> float:
        """Return min(T1, T2)."""
        where = self.device.sites[site]
        known = [t for t in (where.t1_us, where.t2_us) if t is not None]
        return min(known) * 1e3 if known else float("inf")

    def fits(self, link: Link | None, first: int, kind: Sequence[bool]) -> bool:
        """Whether a gate may happen on a link, its first wire on site `first`."""
        if link is None or not self.device.is_usable(link):
            return False
        high, first_needs, second_needs = kind
        if not high:
            return True
        if link.level2_error is None:
            return False
        second = link.b if first == link.a else link.a
        sites = self.device.sites
        if first_needs and sites[first].level2 is None:
            return False
        return not (second_needs and sites[second].level2 is None)

    def meeting(
        self, first: int, second: int, kind: tuple[bool, bool, bool]
    ) -> tuple[int, int] | None:
        """Return (cost, distance) of a gate between two sites, `None` out of reach."""
        key = (first, *kind)
        if key not in self._reach:
            self._reach[key] = (
                self._cheapest(first, kind, moves=True),
                self._cheapest(first, kind, moves=False),
            )
        costs, hops = self._reach[key]
        if second not in costs:
            return None
        return costs[second], hops[second]

    def _cheapest(
        self, first: int, kind: tuple[bool, bool, bool], *, moves: bool
    ) -> dict[int, int]:
        """Walk the first thing anywhere, do the gate, walk the second from there."""

        def length(link: Link) -> int:
            return -(-3 * cost_of_error(link.error) // 4) if moves else 1

        def price(link: Link) -> int:
            if not moves:
                return 0
            if kind[0] and link.level2_error is not None:
                return cost_of_error(link.level2_error)
            return cost_of_error(link.error)

        walked = self._walk({first: 0}, length)
        begun: dict[int, int] = {}
        for u, so_far in walked.items():
            for link in self.near[u]:
                if self.fits(link, u, kind):
                    v = link.b if u == link.a else link.a
                    total = so_far + price(link)
                    begun[v] = min(begun.get(v, total), total)
        return self._walk(begun, length)

    def _walk(
        self, begun: dict[int, int], length: Callable[[Link], int]
    ) -> dict[int, int]:
        best = dict(begun)
        queue = [(cost, site) for site, cost in sorted(begun.items())]
        heapq.heapify(queue)
        while queue:
            cost, site = heapq.heappop(queue)
            if cost > best[site]:
                continue
            for link in self.near[site]:
                other = link.b if site == link.a else link.a
                through = cost + length(link)
                if through < best.get(other, through + 1):
                    best[other] = through
                    heapq.heappush(queue, (through, other))
        return best


def _inverse(time_us: float | None) -> float:
    return 0.0 if time_us is None else 1.0 / time_us
