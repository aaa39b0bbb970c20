"""Improve a large placement window by window with the joint model.

A window is a run of steps in planned order.  Wires keep their sites; recipes, slots,
lenders and starts of the window's steps are chosen anew by CP-SAT, hinted by what is
there.  A window's answer is kept only if the whole placement, re-timed and re-costed,
is no dearer.
"""

from __future__ import annotations

import dataclasses
from typing import TYPE_CHECKING, Any, cast

import numpy as np

from placer.device.model import Budget
from placer.halt import NEVER, Halt
from placer.planner.joint import Open, solve
from placer.planner.placement import (
    Instance,
    Misfit,
    Placement,
    Wire,
    evaluate,
    local_sites,
    schedule,
)
from placer.tables import FAR_COST, Mask

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.tables import Tables

Choice = tuple[tuple[int, ...], ...]


@dataclasses.dataclass(frozen=True, slots=True)
class Size:
    """How large windows are: calls, sites on offer per step, recipes per step."""

    calls: int = 4
    sites: int = 10
    recipes: int = 4
    work: float = 0.3


def improve(
    instance: Instance,
    placement: Placement,
    recipes: Choice,
    *,
    windows: int,
    seed: int,
    size: Size | None = None,
    halt: Halt = NEVER,
) -> Placement:
    """Return a placement that costs no more, after up to `windows` windows.

    Windows slide over the program by half their length and start over at its end.
    """
    size = size or Size()
    coarse = _Coarse(instance.tables)
    best = placement
    best_cost = evaluate(instance, best).cost
    position = 0
    for number in range(windows):
        if halt.is_due():
            break
        order = _order(best)
        calls = [i for i in order if len(instance.profiles[i]) > 1]
        if not calls:
            return best
        first = calls[position % len(calls)]
        last = calls[min(position % len(calls) + size.calls, len(calls)) - 1]
        position += max(1, size.calls // 2)
        if position >= len(calls):
            position = number % max(1, size.calls // 2)
        steps = order[order.index(first) : order.index(last) + 1]
        if len(steps) > 4 * size.calls:
            continue
        changed = _solve_window(
            instance, best, recipes, steps, size, seed + number, coarse, halt
        )
        if changed is None:
            continue
        try:
            cost = evaluate(instance, changed).cost
        except Misfit:
            continue
        if cost < best_cost:
            best, best_cost = changed, cost
    return best


def _order(placement: Placement) -> list[int]:
    return sorted(range(len(placement.starts)), key=lambda i: (placement.starts[i], i))


def _solve_window(
    instance: Instance,
    placement: Placement,
    recipes: Choice,
    steps: Sequence[int],
    size: Size,
    seed: int,
    coarse: _Coarse,
    halt: Halt,
) -> Placement | None:
    steps = sorted(steps)
    offers = {i: _offers(instance, placement, i, recipes[i], size) for i in steps}
    near = {i: _near(instance, placement, i, size) for i in steps}
    small, wires = _cut(instance, placement, steps, near, coarse)
    hint = _hint(small, placement, steps, wires)
    try:
        evaluate(small, hint)
    except Misfit:
        return None
    choice = Open(
        tuple((placement.sites[w],) for w in wires),
        tuple(offers[i] for i in steps),
        tuple(near[i] for i in steps),
    )
    answer = solve(small, choice, work=size.work, seed=seed, hint=hint, halt=halt)
    if answer.placement is None:
        return None
    return _splice(instance, placement, steps, answer.placement)


def _offers(
    instance: Instance,
    placement: Placement,
    step: int,
    allowed: Sequence[int],
    size: Size,
) -> tuple[int, ...]:
    """Return the recipe in use and those with the least gates and decay."""
    row = instance.profiles[step]
    if len(row) == 1:
        return (0,)

    def price(c: int) -> tuple[int, int]:
        profile = row[c]
        gates = sum(p.count * instance.tables.gate_floor(p.mask) for p in profile.pairs)
        waiting = len(instance.operands[step]) + len(profile.built.slots)
        rate = int(np.median(instance.tables.rate[list(instance.usable)]))
        return gates + rate * waiting * profile.base_ns, c

    best = sorted(allowed, key=price)[: size.recipes]
    return tuple(sorted({*best, placement.recipes[step]}))


def _near(
    instance: Instance, placement: Placement, step: int, size: Size
) -> tuple[int, ...]:
    """Return the sites closest to a step's operands, and those of its slots now."""
    operands = [placement.sites[w] for w in instance.operands[step]]
    usable = np.array(instance.usable)
    reach = instance.tables.hop[usable][:, operands].sum(axis=1)
    rank = np.lexsort((usable, reach))
    near = [int(usable[k]) for k in rank if int(usable[k]) not in operands]
    return tuple(sorted({*near[: size.sites], *placement.slot_sites[step]}))


def _cut(
    instance: Instance,
    placement: Placement,
    steps: Sequence[int],
    near: dict[int, tuple[int, ...]],
    coarse: _Coarse,
) -> tuple[Instance, list[int]]:
    """Return the window as an instance of its own, and its wires' numbers."""
    order = _order(placement)
    rank = {step: k for k, step in enumerate(order)}
    begin = min(rank[i] for i in steps)
    end = max(rank[i] for i in steps)
    local = {step: k for k, step in enumerate(steps)}
    interesting = {p for row in near.values() for p in row}
    wires = []
    small = []
    for w, wire in enumerate(instance.wires):
        uses = tuple(local[i] for i in wire.uses if i in local)
        begun = not wire.is_known_zero or (wire.uses and rank[wire.uses[0]] < begin)
        gone = wire.is_workspace and wire.uses and rank[wire.uses[-1]] < begin
        is_near = placement.sites[w] in interesting
        if gone or (not uses and not (begun and is_near)):
            continue
        leaves = wire.is_workspace and bool(wire.uses) and rank[wire.uses[-1]] <= end
        wires.append(w)
        small.append(
            Wire(
                is_known_zero=not begun,
                is_workspace=leaves,
                is_lendable=wire.is_lendable,
                uses=uses,
                ends_known=leaves or (wire.ends_known and rank[wire.uses[-1]] <= end),
            )
        )
    number = {w: k for k, w in enumerate(wires)}
    cut = dataclasses.replace(
        instance,
        wires=tuple(small),
        operands=tuple(tuple(number[w] for w in instance.operands[i]) for i in steps),
        profiles=tuple(instance.profiles[i] for i in steps),
        follows=tuple(
            (local[a], local[b])
            for a, b in instance.follows
            if a in local and b in local
        ),
        tables=cast("Tables", coarse),
        problem=dataclasses.replace(instance.problem, budget=Budget()),
    )
    return cut, wires


class _Coarse:
    """The device tables with prices of pairs rounded to few distinct values.

    Unequal links give almost every pair of sites its own price, and each distinct
    price is a layer of the model.  A window's answer is re-costed exactly, so it may
    be found on rounded prices.
    """

    def __init__(self, tables: Tables) -> None:
        self._tables = tables
        self._rounded: dict[Mask, Any] = {}
        self._grain = max(1, int(np.median(tables.step)) if len(tables.step) else 1)

    def __getattr__(self, name: str) -> Any:
        return getattr(self._tables, name)

    def pair_cost(self, mask: Mask) -> Any:
        if mask not in self._rounded:
            exact = self._tables.pair_cost(mask)
            rounded = (exact + self._grain // 2) // self._grain * self._grain
            self._rounded[mask] = np.where(exact >= FAR_COST, exact, rounded)
        return self._rounded[mask]


def _hint(
    small: Instance, placement: Placement, steps: Sequence[int], wires: Sequence[int]
) -> Placement:
    sites = tuple(placement.sites[w] for w in wires)
    recipes = tuple(placement.recipes[i] for i in steps)
    slots = tuple(placement.slot_sites[i] for i in steps)
    order = sorted(range(len(steps)), key=lambda k: (placement.starts[steps[k]], k))
    return Placement(
        sites, recipes, slots, schedule(small, order, sites, recipes, slots)
    )


def _splice(
    instance: Instance, placement: Placement, steps: Sequence[int], part: Placement
) -> Placement | None:
    """Return the placement with the window's choices and order put in."""
    recipes = list(placement.recipes)
    slots = list(placement.slot_sites)
    for k, step in enumerate(steps):
        recipes[step] = part.recipes[k]
        slots[step] = part.slot_sites[k]
        where = local_sites(instance, step, placement.sites, slots[step])
        if len(set(where)) < len(where):
            return None
    order = _order(placement)
    inside = iter(sorted(range(len(steps)), key=lambda k: (part.starts[k], k)))
    window = set(steps)
    order = [steps[next(inside)] if i in window else i for i in order]
    try:
        starts = schedule(instance, order, placement.sites, recipes, slots)
    except (Misfit, KeyError):
        return None
    return Placement(placement.sites, tuple(recipes), tuple(slots), starts)
