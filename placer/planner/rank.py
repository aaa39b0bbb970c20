"""Which of two judged placements is better, by the goal that was asked for.

What fits comes first, then the goal, then the expected error, then the placement
cost; ties are broken by the choices themselves, the same way every time.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from placer.planner.verdict import overrun

if TYPE_CHECKING:
    from placer.plan import Figures
    from placer.planner.judge import Judged
    from placer.planner.placement import Instance
    from placer.problem import Problem

Choice = tuple[tuple[int, ...], ...]
Rank = tuple[bool, int, int, int, object]


def rank(judged: Judged, problem: Problem) -> Rank:
    """Return the rank of a judged placement; smaller is better."""
    placement = judged.placement
    tie = (placement.sites, placement.recipes, placement.slot_sites)
    total = judged.figures.costs.total
    if problem.goal == "estimate":
        return (False, judged.estimate, total, 0, tie)
    misses = overrun(judged.figures, problem.budget) > 0
    return (misses, aim(judged.figures, problem), total, judged.estimate, tie)


def aim(figures: Figures, problem: Problem) -> int:
    """Return what the goal makes least: the expected error where it is the goal."""
    if problem.goal == "time":
        return figures.time_ns
    if problem.goal == "sites":
        return figures.sites
    if problem.goal == "t-gates":
        return figures.t_gates
    return figures.costs.total


def in_the_spirit(instance: Instance, choice: Choice) -> Choice:
    """Return the open recipes without those that the goal rules out.

    For the fewest T gates these are, step by step, all recipes with more than the
    least; every other goal weighs whole plans.
    """
    if instance.problem.goal != "t-gates":
        return choice
    kept = []
    for row, profiles in zip(choice, instance.profiles, strict=True):
        least = min(sum(profiles[c].tees) for c in row)
        kept.append(tuple(c for c in row if sum(profiles[c].tees) == least))
    return tuple(kept)
