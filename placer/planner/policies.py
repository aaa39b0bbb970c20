"""Which recipes a fixed workspace policy allows at each step."""

from __future__ import annotations

from typing import TYPE_CHECKING

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
            plain = built.workspace == "none" and built.controls <= 2
            if plain or built.workspace == policy:
                kept.append(index)
        if not kept:
            op = instance.problem.program.operations[step]
            return (
                (),
                f"'{op.name}' with {op.controls} controls has no such recipe here",
            )
        rows.append(tuple(kept))
    return tuple(rows), ""
