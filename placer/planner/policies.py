"""Which recipes a fixed workspace policy allows at each step."""

from __future__ import annotations

from typing import TYPE_CHECKING

from placer.problem import every_recipe, why_not
from placer.recipes.library import is_plain

if TYPE_CHECKING:
    from placer.planner.placement import Instance

Choice = tuple[tuple[int, ...], ...]


def everything_allowed(instance: Instance) -> Choice:
    """Return all recipes of every step."""
    return tuple(tuple(range(len(row))) for row in instance.profiles)


def allowed(instance: Instance, policy: str) -> tuple[Choice, str]:
    """Return the recipes of a policy per step, and why it cannot be, if it cannot.

    A call of two controls without slots has no workspace to choose: its plain recipe
    belongs to every policy.
    """
    rows = []
    for step, row in enumerate(instance.profiles):
        kept = []
        for index, profile in enumerate(row):
            built = profile.built
            if is_plain(built) or built.workspace == policy:
                kept.append(index)
        if not kept:
            kept = _stand_ins(instance, step, policy)
        if not kept:
            return (), _missing(instance, step, policy)
        rows.append(tuple(kept))
    return tuple(rows), ""


def _stand_ins(instance: Instance, step: int, policy: str) -> list[int]:
    """Return recipes for arithmetic that nobody has built with a policy's workspace.

    Recipes without workspace stand in, or all where there are none.
    """
    op = instance.problem.program.operations[step]
    exists = any(built.workspace == policy for built in every_recipe(op))
    if op.signature is None or exists:
        return []
    row = instance.profiles[step]
    bare = [c for c, profile in enumerate(row) if profile.built.workspace == "none"]
    return bare or list(range(len(row)))


def _missing(instance: Instance, step: int, policy: str) -> str:
    """Say why a step has no recipe of a policy: the easiest one and what it lacks."""
    problem = instance.problem
    op = problem.program.operations[step]
    call = f"'{op.title}'"
    for built in sorted(every_recipe(op), key=lambda b: len(b.slots)):
        if built.workspace != policy:
            continue
        reason = why_not(built, problem.device, problem.program, problem.only)
        if reason:
            return f"{call}: {built.recipe} {_joined(reason)}"
    return f"{call} has no such recipe"


def _joined(reason: str) -> str:
    return reason if reason.startswith(("needs", "excluded")) else f"fails: {reason}"
