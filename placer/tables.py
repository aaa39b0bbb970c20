"""A device in numbers: nominal times, costs, distances, as whole numbers in arrays.

In: a device.  Out: what DEVELOPERS.md defines under 'Nominal figures', 'Costs of
single things' and 'Moves', once per device.  Nothing here knows a program.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from placer.compiled import compiled, inner
from placer.device.fidelity import decay_slope, dephasing_rate, level2_decay_slope
from placer.units import cost_of_error, rate_per_tick

if TYPE_CHECKING:
    from collections.abc import Iterable

    from placer.device.model import Device, Link, Site

Ints = NDArray[np.int64]
Mask = tuple[bool, bool, bool]
"""Is it a level-2 gate; does the first, the second wire's site need level 2."""

FAR = 1 << 30
"""Links between two sites that no path joins, and away where no link fits."""
FAR_COST = 1 << 60
"""Cost of a path that does not exist."""
NONE = -1
"""In a table of costs or times: there is no such thing."""


@dataclass(frozen=True, slots=True, eq=False)
class Tables:
    """Everything that plans and routes ask of a device, P sites.

    Nominal times in ns are single numbers; arrays per site (P) and per pair of sites
    (P x P) hold times in ns and costs in 1e-12 of -ln(fidelity).  `two`, `two2`,
    `link_ns` and `link2_ns` are -1 where no usable link has such a gate, `rate2` is
    -1 where a site has no level 2.  `hop` is at least `far`, `moves` at least
    `far_cost` where no path exists.  `starts` and `neighbours` list the usable links
    by site: those of p are `neighbours[starts[p]:starts[p + 1]]`, ascending.
    `lifetime_ns` is min(T1, T2), infinite where no decay is known.
    """

    device: Device
    sites: int
    one_ns: int
    tee_ns: int
    two_ns: int
    level2_ns: int
    readout_ns: int
    reset_ns: int
    conditional_ns: int
    move_ns: int
    in_service: NDArray[np.bool_]
    has_level2: NDArray[np.bool_]
    one: Ints
    tee: Ints
    read: Ints
    wipe: Ints
    prep: Ints
    rate: Ints
    rate2: Ints
    site_one_ns: Ints
    site_tee_ns: Ints
    site_readout_ns: Ints
    site_reset_ns: Ints
    lifetime_ns: NDArray[np.float64]
    level2_lifetime_ns: NDArray[np.float64]
    two: Ints
    two2: Ints
    link_ns: Ints
    link2_ns: Ints
    step: Ints
    starts: Ints
    neighbours: Ints
    hop: Ints
    moves: Ints
    _pairs: dict[Mask, tuple[Ints, Ints]] = field(default_factory=dict, repr=False)
    _floors: dict[bool, int] = field(default_factory=dict, repr=False)

    @property
    def far(self) -> int:
        """A number of links that stands for 'no path'."""
        return FAR

    @property
    def far_cost(self) -> int:
        """A cost that stands for 'no path'."""
        return FAR_COST

    @property
    def furthest(self) -> int:
        """The largest number of links between two sites that a path joins."""
        return int(self.hop[self.hop < FAR].max(initial=0))

    def gate_floor(self, mask: Mask) -> int:
        """Return the cost of the cheapest gate of this kind anywhere."""
        if mask[0] not in self._floors:
            table = self.two2 if mask[0] else self.two
            self._floors[mask[0]] = int(table[table >= 0].min(initial=FAR_COST))
        return self._floors[mask[0]]

    def pair(self, mask: Mask) -> tuple[Ints, Ints]:
        """Return cost and moves of a gate between any two sites, as (pair, away).

        Row: site of the gate's first wire; column: of its second.  Values of at least
        `far_cost` and `far` mean that no fitting link is within reach.
        """
        if not mask[0]:
            mask = (False, False, False)
        if mask not in self._pairs:
            self._pairs[mask] = self._make_pair(mask)
        return self._pairs[mask]

    def pair_cost(self, mask: Mask) -> Ints:
        """Return the least cost of a gate of this kind, with its moves."""
        return self.pair(mask)[0]

    def away(self, mask: Mask) -> Ints:
        """Return the fewest moves before a gate of this kind can happen."""
        return self.pair(mask)[1]

    def fits(self, mask: Mask) -> NDArray[np.bool_]:
        """Return where a gate may happen: [site of the first, site of the second]."""
        if not mask[0]:
            return self.two >= 0
        fitting = self.two2 >= 0
        if mask[1]:
            fitting = fitting & self.has_level2[:, None]
        if mask[2]:
            fitting = fitting & self.has_level2[None, :]
        return fitting

    def _make_pair(self, mask: Mask) -> tuple[Ints, Ints]:
        price = np.where(self.fits(mask), self.two2 if mask[0] else self.two, NONE)
        both = [
            _crossings(self.starts, self.neighbours, lengths, near, far, cross)
            for lengths, near, far, cross in (
                (self.step, self.moves, FAR_COST, price),
                (np.ones_like(self.step), self.hop, FAR, np.minimum(price, 0)),
            )
        ]
        for table in both:
            table.flags.writeable = False
        return both[0], both[1]


def device_tables(device: Device) -> Tables:
    """Return the tables of a device; meant to be made once and kept."""
    sites = device.sites
    alive = [s for s in sites if s.in_service]
    links = [k for k in device.links if device.is_usable(k)]
    one_ns = _median(s.gate_ns for s in alive)
    priced = device.t_gate
    two_ns = _median(k.time_ns for k in links)
    two = _matrix(device, links, lambda k: cost_of_error(k.error))
    starts, neighbours = _lists(len(sites), links)
    lengths = -(-3 * two[_rows(starts), neighbours] // 4)
    one = _per_site(sites, lambda s: cost_of_error(s.gate_error))
    tee_cost = None if priced is None else cost_of_error(priced.error)
    tables = Tables(
        device=device,
        sites=len(sites),
        one_ns=one_ns,
        tee_ns=one_ns if priced is None else priced.time_ns,
        two_ns=two_ns,
        level2_ns=_median(k.level2_ns for k in links if k.level2_ns is not None),
        readout_ns=_median(s.readout_ns for s in alive),
        reset_ns=_median(s.reset_ns for s in alive),
        conditional_ns=device.capabilities.conditional_ns or 0,
        move_ns=-(-3 * two_ns // 4),
        in_service=np.array([s.in_service for s in sites], dtype=np.bool_),
        has_level2=np.array([s.level2 is not None for s in sites], dtype=np.bool_),
        one=one,
        tee=one if tee_cost is None else _per_site(sites, lambda _: tee_cost),
        read=_per_site(sites, lambda s: cost_of_error(s.readout_error)),
        wipe=_per_site(sites, lambda s: cost_of_error(s.reset_error)),
        prep=_per_site(sites, lambda s: cost_of_error(s.prep_error)),
        rate=_per_site(sites, lambda s: rate_per_tick(decay_slope(s.t1_us, s.t2_us))),
        rate2=_per_site(sites, _rate2),
        site_one_ns=_per_site(sites, lambda s: s.gate_ns),
        site_tee_ns=_per_site(
            sites, lambda s: s.gate_ns if priced is None else priced.time_ns
        ),
        site_readout_ns=_per_site(sites, lambda s: s.readout_ns),
        site_reset_ns=_per_site(sites, lambda s: s.reset_ns),
        lifetime_ns=np.array([_lifetime_ns(s) for s in sites], dtype=np.float64),
        level2_lifetime_ns=np.array(
            [1e3 * s.level2.t1_us if s.level2 else np.inf for s in sites],
            dtype=np.float64,
        ),
        two=two,
        two2=_matrix(
            device,
            links,
            lambda k: NONE if k.level2_error is None else cost_of_error(k.level2_error),
        ),
        link_ns=_matrix(device, links, lambda k: k.time_ns),
        link2_ns=_matrix(
            device, links, lambda k: NONE if k.level2_ns is None else k.level2_ns
        ),
        step=lengths,
        starts=starts,
        neighbours=neighbours,
        hop=_all_paths(starts, neighbours, np.ones_like(lengths), FAR),
        moves=_all_paths(starts, neighbours, lengths, FAR_COST),
    )
    _freeze(tables)
    return tables


def _freeze(tables: Tables) -> None:
    for name in Tables.__dataclass_fields__:
        value = getattr(tables, name)
        if isinstance(value, np.ndarray):
            value.flags.writeable = False


def _median(values: Iterable[int]) -> int:
    """Return the lower median, 0 where there is nothing."""
    ranked = sorted(values)
    return ranked[(len(ranked) - 1) // 2] if ranked else 0


def _per_site(sites: tuple[Site, ...], figure) -> Ints:  # type: ignore[no-untyped-def]
    return np.array([figure(s) for s in sites], dtype=np.int64)


def _matrix(device: Device, links: list[Link], figure) -> Ints:  # type: ignore[no-untyped-def]
    table = np.full((len(device.sites), len(device.sites)), NONE, dtype=np.int64)
    for link in links:
        table[link.a, link.b] = table[link.b, link.a] = figure(link)
    return table


def _rate2(site: Site) -> int:
    if site.level2 is None:
        return NONE
    dephasing = dephasing_rate(site.t1_us, site.t2_us)
    slope = level2_decay_slope(site.t1_us, site.level2.t1_us, dephasing)
    return rate_per_tick(slope)


def _lifetime_ns(site: Site) -> float:
    known = [1e3 * t for t in (site.t1_us, site.t2_us) if t is not None]
    return min(known, default=np.inf)


def _lists(sites: int, links: list[Link]) -> tuple[Ints, Ints]:
    ends = sorted([(k.a, k.b) for k in links] + [(k.b, k.a) for k in links])
    counts = np.zeros(sites + 1, dtype=np.int64)
    for a, _ in ends:
        counts[a + 1] += 1
    neighbours = np.array([b for _, b in ends], dtype=np.int64)
    return np.cumsum(counts), neighbours


def _rows(starts: Ints) -> Ints:
    return np.repeat(np.arange(len(starts) - 1, dtype=np.int64), np.diff(starts))


@inner
def _spread(starts: Ints, neighbours: Ints, lengths: Ints, far: int, least: Ints):  # type: ignore[no-untyped-def]
    """Lower `least`, a first guess per site, to the least sum along any path.

    Dijkstra 1959 with a binary heap in two arrays; stale heap entries are skipped.
    """
    sites = len(starts) - 1
    keys = np.empty(sites + len(neighbours) + 1, dtype=np.int64)
    names = np.empty(sites + len(neighbours) + 1, dtype=np.int64)
    size = 0
    for site in range(sites):
        if least[site] < far:
            size = _push(keys, names, size, least[site], site)
    while size > 0:
        key, site = keys[0], names[0]
        size = _pop(keys, names, size)
        if key > least[site]:
            continue
        for k in range(starts[site], starts[site + 1]):
            through = key + lengths[k]
            if through < least[neighbours[k]]:
                least[neighbours[k]] = through
                size = _push(keys, names, size, through, neighbours[k])


@inner
def _push(keys: Ints, names: Ints, size: int, key: int, name: int) -> int:
    at = size
    while at > 0 and keys[(at - 1) // 2] > key:
        keys[at], names[at] = keys[(at - 1) // 2], names[(at - 1) // 2]
        at = (at - 1) // 2
    keys[at], names[at] = key, name
    return size + 1


@inner
def _pop(keys: Ints, names: Ints, size: int) -> int:
    size -= 1
    key, name = keys[size], names[size]
    at = 0
    while 2 * at + 1 < size:
        child = 2 * at + 1
        if child + 1 < size and keys[child + 1] < keys[child]:
            child += 1
        if keys[child] >= key:
            break
        keys[at], names[at] = keys[child], names[child]
        at = child
    keys[at], names[at] = key, name
    return size


@compiled
def _all_paths(starts: Ints, neighbours: Ints, lengths: Ints, far: int) -> Ints:
    """Return the least sum of lengths between any two sites, `far` without a path."""
    sites = len(starts) - 1
    table = np.full((sites, sites), far, dtype=np.int64)
    for site in range(sites):
        table[site, site] = 0
        _spread(starts, neighbours, lengths, far, table[site])
    return table


@compiled
def _crossings(
    starts: Ints, neighbours: Ints, lengths: Ints, near: Ints, far: int, price: Ints
) -> Ints:
    """Return the least of near[p, u] + price[u, v] + near[v, q] over links u-v.

    The first two terms give a first guess at every v, which then spreads along paths.
    """
    sites = len(starts) - 1
    table = np.full((sites, sites), far, dtype=np.int64)
    for site in range(sites):
        for u in range(sites):
            if near[site, u] >= far:
                continue
            for k in range(starts[u], starts[u + 1]):
                v = neighbours[k]
                if price[u, v] >= 0:
                    guess = near[site, u] + price[u, v]
                    table[site, v] = min(table[site, v], guess)
        _spread(starts, neighbours, lengths, far, table[site])
    return table
