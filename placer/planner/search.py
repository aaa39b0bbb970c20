"""The staged search: decode, anneal, re-price, window by window, again.

In: an instance and the open recipes.  Out: good placements, best estimate first.  All
work is counted in moves and rounds, never in seconds.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from placer.halt import NEVER, Halt
from placer.planner.anneal import anneal, flow_of, move, neighbours_of
from placer.planner.decode import Taste, decode
from placer.planner.placement import Misfit, evaluate
from placer.planner.zeroswap import zero_swap

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.planner.placement import Instance, Placement

Choice = tuple[tuple[int, ...], ...]


@dataclass(frozen=True, slots=True)
class Candidate:
    """A valid placement and its placement cost."""

    estimate: int
    placement: Placement


@dataclass(frozen=True, slots=True)
class Amount:
    """How much work a search may do: rounds per start, annealing moves per round.

    `scales` weigh distance against all else, one start each; `delay` weighs time.
    `embeds` are the nodes of one search for sites that need no swap at all.
    """

    rounds: int
    moves: int
    scales: tuple[float, ...]
    delay: float = 1.0
    embeds: int = 0


def search(
    instance: Instance,
    recipes: Choice,
    *,
    amount: Amount,
    seed: int,
    starts: Sequence[Placement] = (),
    lent_only: frozenset[int] = frozenset(),
    halt: Halt = NEVER,
) -> list[Candidate]:
    """Return placements found from scratch and from given ones, best first.

    Steps in `lent_only` take no workspace but what a wire lends.  When the halt is
    due, what was found so far is returned.
    """
    found: dict[tuple[object, ...], Candidate] = {}
    links = neighbours_of(instance)
    for number, scale in enumerate(amount.scales):
        taste = Taste(
            recipes,
            move_scale=scale,
            delay_scale=amount.delay,
            lent_only=lent_only,
        )
        sites = _first_sites(instance, recipes)
        earlier: Placement | None = None
        if starts:
            earlier = starts[number % len(starts)]
            sites = list(earlier.sites)
        for round_number in range(amount.rounds):
            if found and halt.is_due():
                break
            try:
                placement = decode(instance, sites, taste, earlier, halt=halt)
            except Misfit:
                break
            _keep(instance, placement, found)
            is_fresh = not starts and round_number < (amount.rounds + 1) // 2
            heat = 1.0 if is_fresh else 0.1
            if is_fresh and amount.embeds and number == round_number == 0:
                moved = _unswapped(instance, placement, amount.embeds, seed, found)
                if moved is not None:
                    placement, heat = moved, 0.0
            to = anneal(
                flow_of(instance, placement, scale),
                instance.usable,
                links,
                moves=amount.moves,
                seed=seed * 1009 + number * 101 + round_number,
                heat=heat,
            )
            try:
                placement = move(instance, placement, [int(p) for p in to])
            except Misfit:
                break
            _keep(instance, placement, found)
            earlier = placement
            sites = list(placement.sites)
    ranked = sorted(found.items(), key=lambda item: (item[1].estimate, item[0]))
    return [candidate for _, candidate in ranked]


def _unswapped(
    instance: Instance,
    placement: Placement,
    nodes: int,
    seed: int,
    found: dict[tuple[object, ...], Candidate],
) -> Placement | None:
    """Return the placement at sites that need no swap, if they are found."""
    to = zero_swap(instance, placement, nodes=nodes, seed=seed)
    if to is None:
        return None
    try:
        moved = move(instance, placement, [int(p) for p in to])
    except Misfit:
        return None
    _keep(instance, moved, found)
    return moved


def _keep(
    instance: Instance,
    placement: Placement,
    found: dict[tuple[object, ...], Candidate],
) -> None:
    key = (placement.sites, placement.recipes, placement.slot_sites)
    if key in found:
        return
    try:
        found[key] = Candidate(evaluate(instance, placement).cost, placement)
    except Misfit:
        return


def _first_sites(instance: Instance, recipes: Choice) -> list[int]:
    """Return a compact first guess: wires in order of use, sites in order of reach.

    Where a step can only be done in level 2, sites that offer it come first.
    """
    tables = instance.tables
    needs_level2 = any(
        all(instance.profiles[i][c].built.level2_wires for c in row)
        for i, row in enumerate(recipes)
    )
    usable = instance.usable

    def lacks(p: int) -> bool:
        return needs_level2 and int(tables.rate2[p]) < 0

    inside = [p for p in usable if not lacks(p)] or list(usable)
    centre = min(inside, key=lambda p: (int(tables.hop[p, inside].sum()), p))
    near = sorted(usable, key=lambda p: (lacks(p), int(tables.hop[centre, p]), p))
    order = sorted(
        range(len(instance.wires)),
        key=lambda w: (instance.wires[w].is_workspace, -len(instance.wires[w].uses), w),
    )
    sites = [near[0]] * len(instance.wires)
    for rank, w in enumerate(order):
        sites[w] = near[rank % len(near)]
    return sites
