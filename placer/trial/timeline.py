"""The timeline of a route: when everything happens, and what it costs.

In: a placed circuit, a device's tables, a route.  Out: times, costs by cause, life of
values, exactly as DEVELOPERS.md defines under 'The route and the figures'.  The loop
that follows the route is compiled; every rounded cost is made outside of it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from placer.device.fidelity import dephasing_rate, level2_process_fidelity
from placer.errors import InternalError
from placer.placed import LEVEL2, MEASURE, ONE, RESET, TEE, TWO
from placer.plan import Costs, Figures
from placer.trial.follow import GOOD, WHY, Lives, Places, Record, Tokens, follow
from placer.units import cost_of_fidelity, success_of

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from placer.device.model import Site
    from placer.placed import Ints, PlacedCircuit
    from placer.tables import Tables
    from placer.trial.router import RouteResult

    Reals = NDArray[np.float64]

# Columns of a window: where, how long, in level 2 or not.
_SITE, _SPAN, _HIGH = range(3)


@dataclass(frozen=True, slots=True, eq=False)
class Timeline:
    """What a route does: figures in whole ns and costs, and where they come from.

    `step_start` and `step_end` span the operations of each step (-1 without any);
    `step_cost` is what its gates, measurements and resets cost where they happen
    (no swaps, no decay), `swap_cost` and `swap_start`/`swap_end` are per swap,
    `decay_of_site` is the decay charged on each site.  `share` is the part of
    min(T1, T2) that each holder lives as a value (0 for others), `stay` the longest
    stay of each holder in level 2 as part of that level's lifetime.  `touched` counts
    sites in use.  `start` and `end` are per operation.
    """

    costs: Costs
    time_ns: int
    touched: int
    swaps: int
    counts: tuple[int, ...]
    start: Ints
    end: Ints
    step_start: Ints
    step_end: Ints
    step_cost: Ints
    swap_start: Ints
    swap_end: Ints
    swap_cost: Ints
    decay_of_site: Ints
    share: Reals
    stay: Reals

    @property
    def worst(self) -> tuple[float, int, bool]:
        """The largest share, its holder (-1 for none), and whether it is in level 2."""
        best: tuple[float, int, bool] = (0.0, -1, False)
        for shares, high in ((self.share, False), (self.stay, True)):
            if len(shares):
                holder = int(np.argmax(shares))
                if float(shares[holder]) > best[0]:
                    best = (float(shares[holder]), holder, high)
        return best


def timeline(placed: PlacedCircuit, tables: Tables, route: RouteResult) -> Timeline:
    """Follow a route and return when everything happens and what it costs.

    Raises
    ------
    InternalError
        If the route breaks a rule of the device or of the circuit.
    """
    flow = placed.flow
    swaps = len(route.swap_a)
    order = np.argsort(route.gap_of_gate, kind="stable")
    gaps = np.searchsorted(
        route.gap_of_gate[order], np.arange(swaps, dtype=np.int64), side="right"
    )
    record = _blank_record(placed, swaps)
    why, where, count = follow(
        flow,
        _places(tables),
        Lives(
            placed.holder,
            placed.is_value,
            placed.alive_after,
            placed.valued_after,
            placed.alive_before,
        ),
        _fresh_tokens(placed.sites),
        record,
        placed.gates[order],
        gaps.astype(np.int64),
        route.swap_a,
        route.swap_b,
    )
    if why != GOOD:
        raise InternalError(f"bad trial route: {WHY[why]} (at {where})")
    return _account(placed, tables, route, record, int(where), record.windows[:count])


def _places(tables: Tables) -> Places:
    return Places(
        tables.site_one_ns,
        tables.site_tee_ns,
        tables.site_readout_ns,
        tables.site_reset_ns,
        tables.link_ns,
        tables.link2_ns,
        tables.has_level2,
        tables.lifetime_ns,
        tables.level2_lifetime_ns,
        tables.conditional_ns,
    )


def _fresh_tokens(sites: int) -> Tokens:
    own = np.arange(sites, dtype=np.int64)
    return Tokens(
        own,
        own.copy(),
        np.zeros_like(own),
        np.full_like(own, -1),
        np.zeros(sites, dtype=np.bool_),
        np.zeros(sites, dtype=np.float64),
    )


def _blank_record(placed: PlacedCircuit, swaps: int) -> Record:
    entries = len(placed.flow.token)
    return Record(
        start=np.zeros(placed.operations, dtype=np.int64),
        end=np.zeros(placed.operations, dtype=np.int64),
        site=np.zeros(entries, dtype=np.int64),
        swap_start=np.zeros(swaps, dtype=np.int64),
        swap_end=np.zeros(swaps, dtype=np.int64),
        high_swap=np.zeros(swaps, dtype=np.bool_),
        windows=np.zeros((entries + 2 * swaps + placed.sites, 3), dtype=np.int64),
        share=np.zeros(placed.holders, dtype=np.float64),
        stay=np.zeros(placed.holders, dtype=np.float64),
    )


def _account(
    placed: PlacedCircuit,
    tables: Tables,
    route: RouteResult,
    record: Record,
    end: int,
    windows: Ints,
) -> Timeline:
    flow = placed.flow
    prices = _prices(placed, tables, record.site)
    by_code = [int(prices[flow.code == code].sum()) for code in range(LEVEL2 + 1)]
    counts = np.bincount(flow.code, minlength=LEVEL2 + 1)
    swap_cost = 3 * np.where(
        record.high_swap,
        tables.two2[route.swap_a, route.swap_b],
        tables.two[route.swap_a, route.swap_b],
    )
    decay = _decay(tables, windows)
    costs = Costs(
        two_qubit=by_code[TWO],
        one_qubit=by_code[ONE] + by_code[TEE],
        swaps=int(swap_cost.sum()),
        decay=int(decay.sum()),
        measurement=by_code[MEASURE],
        level2=by_code[LEVEL2],
        preparation=by_code[RESET] + int(tables.prep[placed.fresh].sum()),
    )
    used = np.zeros(placed.sites, dtype=np.bool_)
    for touched in (record.site, route.swap_a, route.swap_b, placed.held):
        used[touched] = True
    step_start = np.full(placed.steps, np.iinfo(np.int64).max, dtype=np.int64)
    np.minimum.at(step_start, placed.step, record.start)
    step_end = np.full(placed.steps, -1, dtype=np.int64)
    np.maximum.at(step_end, placed.step, record.end)
    step_cost = np.zeros(placed.steps, dtype=np.int64)
    np.add.at(step_cost, placed.step, prices)
    return Timeline(
        costs=costs,
        time_ns=end,
        touched=int(used.sum()),
        swaps=len(route.swap_a),
        counts=tuple(int(c) for c in counts),
        start=record.start,
        end=record.end,
        step_start=np.where(step_end < 0, -1, step_start),
        step_end=step_end,
        step_cost=step_cost,
        swap_start=record.swap_start,
        swap_end=record.swap_end,
        swap_cost=swap_cost,
        decay_of_site=decay,
        share=record.share,
        stay=record.stay,
    )


def _prices(placed: PlacedCircuit, tables: Tables, site: Ints) -> Ints:
    """Return what each operation costs where it happens."""
    flow = placed.flow
    prices = np.zeros(placed.operations, dtype=np.int64)
    begin_at = flow.first[:-1]
    for code, price in (
        (ONE, tables.one),
        (TEE, tables.tee),
        (MEASURE, tables.read),
        (RESET, tables.wipe),
    ):
        chosen = np.flatnonzero(flow.code == code)
        prices[chosen] = price[site[begin_at[chosen]]]
    for code, links in ((TWO, tables.two), (LEVEL2, tables.two2)):
        chosen = np.flatnonzero(flow.code == code)
        at = begin_at[chosen]
        prices[chosen] = links[site[at], site[at + 1]]
    return prices


def _decay(tables: Tables, windows: Ints) -> Ints:
    """Return the decay charged on each site; every window is rounded up by itself."""
    total = np.zeros(tables.sites, dtype=np.int64)
    if not len(windows):
        return total
    longest = int(windows[:, _SPAN].max()) + 1
    place = 2 * windows[:, _SITE] + windows[:, _HIGH]
    keys, times = np.unique(place * longest + windows[:, _SPAN], return_counts=True)
    for key, count in zip(keys.tolist(), times.tolist(), strict=True):
        where, span = divmod(key, longest)
        site, high = divmod(where, 2)
        total[site] += count * wait_cost(tables.device.sites[site], span, bool(high))
    return total


def wait_cost(site: Site, span_ns: int, in_level2: bool = False) -> int:
    """Return the cost of waiting on a site for a time in ns, rounded up."""
    span = span_ns / 1000.0
    if in_level2 and site.level2 is not None:
        dephasing = dephasing_rate(site.t1_us, site.t2_us)
        fidelity = level2_process_fidelity(
            span, site.t1_us, site.level2.t1_us, dephasing
        )
    else:
        kept1 = 1.0 if site.t1_us is None else math.exp(-span / site.t1_us)
        kept2 = 1.0 if site.t2_us is None else math.exp(-span / site.t2_us)
        fidelity = (1.0 + kept1 + 2.0 * kept2) / 4.0
    return cost_of_fidelity(fidelity)


def figures(line: Timeline, names: Sequence[str]) -> Figures:
    """Return the figures of a plan; `names` are those of the holders."""
    share, holder, high = line.worst
    name = "" if holder < 0 else names[holder] + (" in level 2" if high else "")
    return Figures(
        sites=line.touched,
        swaps=line.swaps,
        time_ns=line.time_ns,
        two_qubit_gates=line.counts[TWO],
        one_qubit_gates=line.counts[ONE] + line.counts[TEE],
        t_gates=line.counts[TEE],
        measurements=line.counts[MEASURE],
        level2_gates=line.counts[LEVEL2],
        costs=line.costs,
        success=success_of(line.costs.total),
        worst_share=share,
        worst_value=name,
    )
