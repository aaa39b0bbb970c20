"""Start from an earlier plan: its placement and route on the problem at hand.

In: an earlier plan and its program.  Out: a placement of the new problem that keeps
every choice that still makes sense, and the earlier route where it still can be
followed.  Wires are matched by name, steps by what they do to which wires, the k-th
such step with the k-th.
"""

from __future__ import annotations

import dataclasses
from collections import defaultdict
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from placer.errors import InternalError
from placer.planner.anneal import move
from placer.planner.decode import Taste, decode
from placer.planner.placement import Misfit, Placement, evaluate, schedule

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from placer.planner.judge import Judged
    from placer.planner.placement import Instance
    from placer.planner.pool import Pool
    from placer.program.model import Operation, Program

NOISE = 0.01
"""Gain of expected error, as a share, below which a wire keeps its earlier site."""
MOST_RETURNS = 24
"""Moved wires up to which each one's return to its earlier site is tried."""


@dataclass(frozen=True, slots=True)
class Earlier:
    """The raw data of a plan file, and the program that its steps are the steps of."""

    data: Mapping[str, Any]
    program: Program


@dataclass(frozen=True, slots=True)
class Start:
    """A placement taken over; `same[i]` is the earlier step of step i, -1 if new.

    `judged` is the placement judged on the earlier route, or on one of its own.
    """

    placement: Placement
    same: tuple[int, ...]
    judged: Judged | None
    kept_route: bool


def take_over(pool: Pool, earlier: Earlier) -> Start | None:
    """Return the earlier plan on the problem at hand, `None` if nothing is left."""
    instance = pool.instance
    same = _matched(earlier.program, instance.problem.program)
    calls = {int(c["index"]): c for c in earlier.data["calls"]}
    times = {int(i): int(s) for i, s, _ in earlier.data["others"]}
    times |= {i: int(c["start"]) for i, c in calls.items()}
    sites = _sites(instance, earlier.data["wires"])
    placement = _exact(instance, same, calls, times, sites)
    is_exact = placement is not None
    if placement is None:
        placement = _nearly(instance, same, calls, sites)
    if placement is None:
        return None
    judged = None
    if is_exact:
        gaps = _gaps(instance, earlier, same, times, placement)
        swaps = [(int(a), int(b)) for a, b in earlier.data["route"]["swaps"]]
        judged = _followed(pool, placement, gaps, swaps)
    kept = judged is not None
    if judged is None:
        judged = pool.route(placement, is_needed=True)
    return Start(placement, same, judged, kept)


def _followed(
    pool: Pool,
    placement: Placement,
    gaps: list[int],
    swaps: Sequence[tuple[int, int]],
) -> Judged | None:
    try:
        judged = pool.judge.follow(placement, gaps, swaps)
    except InternalError:
        # Links or the order have changed: the earlier route leads nowhere now.
        return None
    pool.judged.append(judged)
    return judged


def _key(program: Program, op: Operation) -> tuple[object, ...]:
    return (
        op.kind,
        op.name,
        tuple(program.wire_names[w] for w in op.wires),
        op.params,
        op.inverse,
        op.bit,
        op.condition,
        op.signature,
    )


def _matched(old: Program, new: Program) -> tuple[int, ...]:
    """Return the earlier step of each step: the k-th alike is the k-th alike."""
    known: dict[tuple[object, ...], list[int]] = defaultdict(list)
    for op in reversed(old.operations):
        known[_key(old, op)].append(op.index)
    same = []
    for op in new.operations:
        left = known.get(_key(new, op))
        same.append(left.pop() if left else -1)
    return tuple(same)


def _sites(instance: Instance, wires: Mapping[str, Any]) -> list[int]:
    """Return a site per wire: the earlier one, else the nearest free one to it."""
    program = instance.problem.program
    usable = set(instance.usable)
    sites = [-1] * len(program.wire_names)
    permanent: set[int] = set()
    for w, name in enumerate(program.wire_names):
        site = int(wires.get(name, -1))
        lasting = not instance.wires[w].is_workspace
        if site in usable and not (lasting and site in permanent):
            sites[w] = site
            if lasting:
                permanent.add(site)
    free = [p for p in instance.usable if p not in permanent]
    hop = instance.tables.hop
    for w, name in enumerate(program.wire_names):
        if sites[w] >= 0 or not free:
            continue
        near = int(wires.get(name, -1))
        if not 0 <= near < len(hop):
            near = next((p for p in sites if p >= 0), free[0])
        sites[w] = min(free, key=lambda p: (int(hop[near, p]), p))
        free.remove(sites[w])
    return [p if p >= 0 else instance.usable[0] for p in sites]


def _exact(
    instance: Instance,
    same: tuple[int, ...],
    calls: Mapping[int, Mapping[str, Any]],
    times: Mapping[int, int],
    sites: Sequence[int],
) -> Placement | None:
    """Return the earlier choices one by one, `None` where one is not possible."""
    recipes: list[int] = []
    slots: list[tuple[int, ...]] = []
    for step, old in enumerate(same):
        if old < 0:
            return None
        names = [profile.built.recipe for profile in instance.profiles[step]]
        call = calls.get(old)
        if call is None:
            recipes.append(0)
            slots.append(())
            continue
        if call["recipe"] not in names:
            return None
        recipes.append(names.index(call["recipe"]))
        leases = sorted(call["leases"], key=lambda x: int(x["slot"]))
        slots.append(tuple(int(x["site"]) for x in leases))
    usable = set(instance.usable)
    if not usable.issuperset(p for row in slots for p in row):
        return None
    starts = tuple(times.get(old, 0) for old in same)
    as_was = Placement(tuple(sites), tuple(recipes), tuple(slots), starts)
    if _is_valid(instance, as_was):
        return as_was
    order = sorted(range(instance.steps), key=lambda i: (starts[i], i))
    try:
        starts = schedule(instance, order, sites, recipes, slots)
    except (Misfit, KeyError):
        return None
    timed = dataclasses.replace(as_was, starts=starts)
    return timed if _is_valid(instance, timed) else None


def _is_valid(instance: Instance, placement: Placement) -> bool:
    try:
        evaluate(instance, placement)
    except Misfit:
        return False
    return True


def _nearly(
    instance: Instance,
    same: tuple[int, ...],
    calls: Mapping[int, Mapping[str, Any]],
    sites: Sequence[int],
) -> Placement | None:
    """Return a placement with the earlier sites and recipes, where they fit."""
    rows = []
    for step, row in enumerate(instance.profiles):
        every = tuple(range(len(row)))
        call = calls.get(same[step])
        kept = tuple(c for c in every if call and row[c].built.recipe == call["recipe"])
        rows.append(kept or every)
    everything = tuple(tuple(range(len(row))) for row in instance.profiles)
    for choice in (tuple(rows), everything):
        try:
            placement = decode(instance, sites, Taste(choice))
        except Misfit:
            continue
        if _is_valid(instance, placement):
            return placement
    return None


def _gaps(
    instance: Instance,
    earlier: Earlier,
    same: tuple[int, ...],
    times: Mapping[int, int],
    placement: Placement,
) -> list[int]:
    """Return the swaps before each two-body gate, in the order of the new numbers."""
    gap_of = [
        gap
        for gap, first, last in sorted(
            (
                (gap, int(first), int(last))
                for gap, runs in enumerate(earlier.data["route"]["gaps"])
                for first, last in runs
            ),
            key=lambda row: row[1],
        )
        for _ in range(first, last + 1)
    ]
    back = {old: step for step, old in enumerate(same)}
    sizes = {
        step: sum(
            pair.count
            for pair in instance.profiles[step][placement.recipes[step]].pairs
        )
        for step in range(instance.steps)
    }
    parts: dict[int, list[int]] = {}
    at = 0
    for old in sorted(times, key=lambda i: (times[i], i)):
        step = back.get(old, -1)
        if step < 0:
            return []
        parts[step] = gap_of[at : at + sizes[step]]
        at += sizes[step]
    order = sorted(range(instance.steps), key=lambda i: (placement.starts[i], i))
    return [gap for step in order for gap in parts.get(step, [])]


def moved_wires(instance: Instance, one: Placement, two: Placement) -> list[int]:
    """Return the wires that stay somewhere and whose sites differ."""
    return [
        w
        for w, wire in enumerate(instance.wires)
        if (wire.uses or not wire.is_known_zero) and one.sites[w] != two.sites[w]
    ]


def settle_moves(pool: Pool, start: Start) -> None:
    """Try the best plan with moved wires back at their earlier sites, one by one."""
    best = pool.best()
    if best is None or start.judged is None:
        return
    instance = pool.instance
    placement = best.placement
    moved = moved_wires(instance, placement, start.placement)
    if not 0 < len(moved) <= MOST_RETURNS:
        return
    pool.say("moves: which of them pay")
    while moved and not pool.is_over():
        offers = []
        for w in moved:
            back = _returned(instance, placement, w, start.placement.sites[w])
            if back is not None:
                left = len(moved_wires(instance, back, start.placement))
                if left < len(moved):
                    offers.append((pool.judge.estimate(back), w, back))
        if not offers:
            return
        placement = min(offers, key=lambda offer: offer[:2])[2]
        moved = moved_wires(instance, placement, start.placement)
        pool.route(placement)


def _returned(
    instance: Instance, placement: Placement, w: int, home: int
) -> Placement | None:
    """Return the placement with a wire's site exchanged for its earlier one."""
    to = list(range(len(instance.tables.one)))
    to[placement.sites[w]], to[home] = home, placement.sites[w]
    try:
        back = move(instance, placement, to)
    except Misfit:
        return None
    return back if _is_valid(instance, back) else None


def worth_moving(pool: Pool, start: Start | None) -> Judged | None:
    """Return the plan with the fewest moved wires that is as good as the best.

    As good: it fits as well, and the goal and the expected error are within the noise.
    """
    best = pool.best()
    if best is None or start is None or start.judged is None:
        return best
    if pool.instance.problem.goal != "error":
        return best
    most = best.figures.costs.total * (1.0 + NOISE)
    misses = pool.key(best)[0]
    rows = []
    for judged in pool.judged:
        if judged.figures.costs.total <= most and pool.key(judged)[0] == misses:
            moved = moved_wires(pool.instance, judged.placement, start.placement)
            rows.append((len(moved), pool.key(judged), judged))
    return min(rows, key=lambda row: row[:2])[2]


def note_of(pool: Pool, start: Start | None, chosen: Judged) -> str:
    """Say what was taken over from the earlier plan, and what moved."""
    if start is None:
        return "nothing could be taken over from the earlier plan"
    instance = pool.instance
    stay = [w for w in instance.wires if w.uses or not w.is_known_zero]
    moved = moved_wires(instance, chosen.placement, start.placement)
    new = sum(1 for old in start.same if old < 0)
    text = f"{len(moved)} of {len(stay)} wires moved against the earlier plan"
    if new:
        text += f", {new} of {instance.steps} steps are new"
    if start.judged is None:
        return f"{text}, which has no route here"
    old = start.judged.figures.costs.total
    gain = (old - chosen.figures.costs.total) / old if old else 0.0
    how = "on its own route" if start.kept_route else "routed anew"
    side = "less" if gain >= 0 else "more"
    return (
        f"{text}; {abs(gain):.1%} {side} expected error than the earlier plan has "
        f"here ({how}); gains below {NOISE:.0%} move no wire"
    )
