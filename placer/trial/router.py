"""The trial route: a quick swap insertion that judges a placement.

In: a placed circuit, a device's tables, a setting, a seed.  Out: the swaps, and which
two-body gates happen between them; the same for the same input.  Lookahead search
with a front layer, an extended set and a decay after Li, Ding and Xie 2019
(arXiv 1809.02573), with distances that weigh link errors, level-2 rules, and a way
out when nothing moves on.  Nothing is timed here.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from placer.errors import InternalError
from placer.placed import LEVEL2
from placer.plan import Route
from placer.trial.detour import Board, around, straight
from placer.trial.search import (
    DONE,
    FRONT,
    FULL,
    MARK,
    OLDEST,
    SWAPS,
    Gates,
    Reach,
    advance,
    open_state,
    wake,
)

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from placer.placed import Ints, PlacedCircuit
    from placer.tables import Mask, Tables
    from placer.trial.search import State

_FAR = 1e9
_FIRST_ROOM = 256
_TRIES = 4


@dataclass(frozen=True, slots=True)
class Setting:
    """How the trial route looks ahead.

    `lookahead` is the size of the extended set per eight gates of the front layer,
    `weight` what it counts against the front layer, `decay` the surcharge on sites
    just used, `care` in [0, 1] how much link errors count against the mere number of
    links.
    """

    lookahead: int = 20
    weight: float = 0.5
    decay: float = 0.001
    care: float = 0.25


@dataclass(frozen=True, slots=True, eq=False)
class RouteResult:
    """A route: swap i exchanges `swap_a[i]` and `swap_b[i]`, in this order.

    `gap_of_gate[g]` is the number of swaps before two-body gate g; within a gap gates
    happen in the order of their numbers.  `moves_of_step` counts, for each step, the
    swaps made while its gate was the oldest that had to wait.
    """

    gap_of_gate: Ints
    swap_a: Ints
    swap_b: Ints
    moves_of_step: Ints

    @property
    def count(self) -> int:
        """Number of swaps."""
        return len(self.swap_a)

    @property
    def swaps(self) -> tuple[tuple[int, int], ...]:
        """The swaps as pairs of sites."""
        return tuple(zip(self.swap_a.tolist(), self.swap_b.tolist(), strict=True))

    @property
    def gaps(self) -> tuple[tuple[tuple[int, int], ...], ...]:
        """Runs of gates between the swaps, as `plan.Route` holds them."""
        order = np.argsort(self.gap_of_gate, kind="stable")
        gap = self.gap_of_gate[order]
        breaks = np.flatnonzero((np.diff(order) != 1) | (np.diff(gap) != 0))
        firsts = np.concatenate(([0], breaks + 1))[: len(order)]
        lasts = np.concatenate((breaks, [len(order) - 1]))[: len(order)]
        runs: list[list[tuple[int, int]]] = [[] for _ in range(self.count + 1)]
        for at, first, last in zip(
            gap[firsts].tolist(),
            order[firsts].tolist(),
            order[lasts].tolist(),
            strict=True,
        ):
            runs[at].append((first, last))
        return tuple(map(tuple, runs))

    def as_route(self, held_out: int = 0, expected_swaps: float = -1.0) -> Route:
        """Return the route as the plan holds it."""
        return Route(self.gaps, self.swaps, held_out, expected_swaps)


def from_route(route: Route, placed: PlacedCircuit) -> RouteResult:
    """Return a plan's route in the form that the timeline reads.

    Raises
    ------
    InternalError
        If the runs do not name every two-body gate once.
    """
    count = len(placed.gates)
    gap_of_gate = np.full(count, -1, dtype=np.int64)
    named = 0
    for gap, runs in enumerate(route.gaps):
        for first, last in runs:
            gap_of_gate[first : last + 1] = gap
            named += last + 1 - first
    if named != count or np.any(gap_of_gate < 0):
        raise InternalError("the route does not name every two-body gate once")
    swaps = np.array(route.swaps, dtype=np.int64).reshape(-1, 2)
    return RouteResult(
        gap_of_gate,
        swaps[:, 0].copy(),
        swaps[:, 1].copy(),
        np.zeros(placed.steps, dtype=np.int64),
    )


def route(
    placed: PlacedCircuit, tables: Tables, *, setting: Setting, seed: int
) -> RouteResult | None:
    """Insert swaps so that every two-body gate finds its link.

    Returns `None` if some gate cannot be brought to a link that fits.
    """
    gates, masks = _gates(placed)
    reach = _reach(tables, masks, setting.care, _crowd(placed))
    # What is in level 2 can bar the way for good where few sites have it: try again.
    for attempt in range(1 if len(masks) == 1 else _TRIES):
        found = _one_route(placed, tables, gates, reach, setting, (seed, attempt))
        if found is not None:
            return found
    return None


def _one_route(
    placed: PlacedCircuit,
    tables: Tables,
    gates: Gates,
    reach: Reach,
    setting: Setting,
    seed: tuple[int, int],
) -> RouteResult | None:
    state = open_state(
        placed.flow, len(tables.neighbours), placed.sites, setting.lookahead, seed
    )
    swaps = np.empty((max(_FIRST_ROOM, len(placed.gates)), 3), dtype=np.int64)
    finite = tables.hop[tables.hop < tables.far]
    patience = 10 + 2 * int(finite.max(initial=0))
    while True:
        status = advance(
            placed.flow, gates, reach, state, swaps, setting.lookahead, setting.weight,
            setting.decay, patience,
        )  # fmt: skip
        if status == DONE:
            break
        if status == FULL:
            swaps = np.concatenate([swaps, np.empty_like(swaps)])
            continue
        way = _way_out(tables, gates, reach, state, swaps)
        if way is None:
            return None
        swaps = way
    swaps = swaps[: state.tally[SWAPS]]
    return RouteResult(
        state.gap_of_gate,
        swaps[:, 0].copy(),
        swaps[:, 1].copy(),
        np.bincount(placed.step[placed.gates[swaps[:, 2]]], minlength=placed.steps),
    )


def _way_out(
    tables: Tables, gates: Gates, reach: Reach, state: State, swaps: Ints
) -> Ints | None:
    """Take back what led nowhere, and bring the oldest gate that can be straight on.

    Returns the list of swaps, enlarged where it had to be, or `None` for no way.
    """
    tally = state.tally
    while tally[SWAPS] > tally[MARK]:
        tally[SWAPS] -= 1
        _exchange(state, *swaps[tally[SWAPS], :2].tolist())
    for gate in sorted(state.front[: tally[FRONT]].tolist()):
        path = _path(tables, gates, reach, state, gate)
        if not path:
            continue
        while tally[SWAPS] + len(path) > len(swaps):
            swaps = np.concatenate([swaps, np.empty_like(swaps)])
        for a, b in path:
            swaps[tally[SWAPS]] = min(a, b), max(a, b), tally[OLDEST]
            tally[SWAPS] += 1
            _exchange(state, a, b)
        one, two, kind = gates.parts[gate].tolist()
        if not reach.fits[kind, state.place[one], state.place[two]]:
            raise InternalError(f"the way for two-body gate {gate} misses its link")
        wake(state, gate)
        return swaps
    return None


def _exchange(state: State, a: int, b: int) -> None:
    one, two = state.at[a], state.at[b]
    state.at[a], state.at[b] = two, one
    state.place[one], state.place[two] = b, a


def _path(
    tables: Tables, gates: Gates, reach: Reach, state: State, gate: int
) -> list[tuple[int, int]]:
    one, two, kind = gates.parts[gate].tolist()
    fits = reach.fits[kind]
    if kind == 0 and not state.high.any():
        return straight(tables, fits, state.place, one, two)
    board = Board(
        tables.starts, tables.neighbours, reach.capable, tables.hop,
        state.at, state.place, state.high,
    )  # fmt: skip
    path = around(board, fits, one, two).tolist()
    return [(a, b) for a, b in path]


def _gates(placed: PlacedCircuit) -> tuple[Gates, list[Mask]]:
    """Return the two-body gates, and the kinds of gate that occur (plain first)."""
    flow = placed.flow
    at = flow.first[placed.gates]
    one, two = flow.token[at], flow.token[at + 1]
    high = flow.code[placed.gates] == LEVEL2
    key = high + 2 * (high & flow.needs[at]) + 4 * (high & flow.needs[at + 1])
    found = np.unique(np.concatenate(([0], key)))
    masks = [(bool(k & 1), bool(k & 2), bool(k & 4)) for k in found.tolist()]
    following = np.full((len(at), 2), -1, dtype=np.int64)
    line = np.argsort(np.stack([one, two], axis=1).ravel(), kind="stable")
    token = np.stack([one, two], axis=1).ravel()[line]
    same = np.flatnonzero(token[1:] == token[:-1])
    following.ravel()[line[same]] = line[same + 1] // 2
    return (
        Gates(
            operation=placed.gates,
            parts=np.stack([one, two, np.searchsorted(found, key)], axis=1),
            following=following,
        ),
        masks,
    )


def _crowd(placed: PlacedCircuit) -> int:
    """Return the most wires that one step brings into level-2 gates."""
    flow = placed.flow
    high = placed.gates[flow.code[placed.gates] == LEVEL2]
    if not len(high):
        return 0
    at = np.concatenate([flow.first[high], flow.first[high] + 1])
    width = int(flow.token.max()) + 1
    pairs = np.unique(placed.step[flow.owner[at]] * width + flow.token[at])
    return int(np.bincount(pairs // width).max())


def _reach(tables: Tables, masks: list[Mask], care: float, crowd: int) -> Reach:
    """Return links, fits and distances of the kinds of gate that occur."""
    rows = np.repeat(np.arange(tables.sites), np.diff(tables.starts))
    both = tables.has_level2[rows] & tables.has_level2[tables.neighbours]
    capable = (tables.two2[rows, tables.neighbours] >= 0) & both
    roomy = _roomy(tables, rows[capable], tables.neighbours[capable], crowd)
    scale = float(np.median(tables.step)) if len(tables.step) else 1.0
    scale = scale if scale > 0.0 else 1.0
    fits, ranges = [], []
    for mask in masks:
        fit = tables.fits(mask)
        pair, away = tables.pair(mask)
        if mask[1]:
            fit = fit & roomy[:, None]
        if mask[2]:
            fit = fit & roomy[None, :]
        mixed = (1.0 - care) * away + (care / scale) * pair
        fits.append(fit)
        ranges.append(np.where(away >= tables.far, _FAR, mixed))
    return Reach(
        starts=tables.starts,
        neighbours=tables.neighbours,
        back=_back(rows, tables.neighbours),
        capable=capable,
        own=np.asarray((1.0 - care) + (care / scale) * tables.step, dtype=np.float64),
        fits=np.stack(fits),
        ranges=np.stack(ranges),
    )


def _back(ends: Ints, others: Ints) -> Ints:
    """Return the number of each link as seen from its other end."""
    # Links are sorted by (end, other), so sorting by (other, end) pairs them up.
    back = np.empty(len(ends), dtype=np.int64)
    back[np.lexsort((ends, others))] = np.arange(len(ends))
    return back


def _roomy(tables: Tables, ends: Ints, others: Ints, crowd: int) -> NDArray[np.bool_]:
    """Return the sites whose level-2 links reach enough sites for the widest step.

    What is in level 2 can leave such a group of sites only by ending its stay, so a
    stay must not begin in a group that is too small.
    """
    group = np.arange(tables.sites, dtype=np.int64)
    while True:
        lowest = group.copy()
        np.minimum.at(lowest, ends, group[others])
        if np.array_equal(lowest, group):
            break
        group = lowest
    sizes = np.bincount(group, minlength=tables.sites)[group]
    sizes = np.where(tables.has_level2 & tables.in_service, sizes, 0)
    enough = min(crowd, int(sizes.max(initial=0)))
    return np.asarray(sizes >= enough, dtype=np.bool_)
