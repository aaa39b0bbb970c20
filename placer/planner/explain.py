"""Say for each call why the other recipes lost.

In: the chosen placement.  Out: per step a list of (recipe, reason).  Reasons come from
pricing each recipe where the plan stands at that step; prices are estimates.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from placer.planner.decode import Offer, Taste, alternatives
from placer.planner.policies import everything_allowed
from placer.problem import every_recipe, why_not
from placer.units import COST_PER_NAT

if TYPE_CHECKING:
    from placer.planner.placement import Instance, Placement
    from placer.planner.profile import Profile

Reasons = tuple[tuple[str, str], ...]


def reasons(instance: Instance, placement: Placement) -> list[Reasons]:
    """Return per step why each other recipe was not taken."""
    taste = Taste(everything_allowed(instance))
    table = alternatives(instance, placement, taste)
    excluded: dict[tuple[object, ...], Reasons] = {}
    result: list[Reasons] = []
    problem = instance.problem
    for step, row in enumerate(instance.profiles):
        op = problem.program.operations[step]
        if not op.is_call:
            result.append(())
            continue
        size = (op.kind, op.controls, op.params, op.inverse, op.signature)
        if size not in excluded:
            excluded[size] = tuple(
                (built.recipe, reason)
                for built in every_recipe(op)
                if (
                    reason := why_not(
                        built, problem.device, problem.program, problem.only
                    )
                )
            )
        chosen = placement.recipes[step]
        result.append(_lost(row, chosen, table[step]) + excluded[size])
    return result


def _lost(row: tuple[Profile, ...], chosen: int, offers: list[Offer | None]) -> Reasons:
    own = offers[chosen] if chosen < len(offers) else None
    lost = []
    for c, profile in enumerate(row):
        if c == chosen:
            continue
        offer = offers[c] if c < len(offers) else None
        lost.append((profile.built.recipe, _reason(row[chosen], own, profile, offer)))
    return tuple(lost)


def _reason(
    winner: Profile, own: Offer | None, loser: Profile, offer: Offer | None
) -> str:
    if offer is None:
        if loser.built.level2_wires:
            return "no level 2, or no level-2 link in reach, where its operands sit"
        slots = loser.built.slots
        clean = sum(1 for kind in slots if kind == "clean")
        wanted = []
        if clean:
            wanted.append(f"{clean} clean")
        if len(slots) > clean:
            wanted.append(f"{len(slots) - clean} borrowed")
        need = " and ".join(wanted) or "no"
        return f"needs {need} sites, fewer are free then"
    gates = f"{_gates(loser)} two-body gates against {_gates(winner)}"
    if own is None:
        return gates
    difference = (offer.price - own.price) / COST_PER_NAT
    longer = offer.end - own.end
    time = f", {abs(longer)} ns {'later' if longer > 0 else 'sooner'}" if longer else ""
    if difference > 0:
        return f"dearer here by {difference:.2e} ({gates}{time})"
    return (
        f"cheaper alone by {-difference:.2e} in the estimate, dearer for the whole "
        f"({gates}{time})"
    )


def _gates(profile: Profile) -> int:
    return sum(pair.count for pair in profile.pairs)
