"""All recipes of a call, whatever its kind: multi-controlled or arithmetic.

In: an operation of a program.  Out: names in a fixed order, and `Built` circuits.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from placer.program.signature import ARITHMETIC_KINDS
from placer.recipes import arithmetic, catalog

if TYPE_CHECKING:
    from placer.program.model import Operation
    from placer.recipes.circuit import Built


def names_for(op: Operation) -> tuple[str, ...]:
    """Return the names of every recipe that exists for a call."""
    if op.signature is not None:
        return arithmetic.recipe_names(op.signature)
    return catalog.recipe_names(op.kind, op.controls, op.inverse)


def build_for(name: str, op: Operation) -> Built:
    """Return a recipe made concrete for a call.

    Raises
    ------
    ValueError
        If the recipe does not exist for it.
    """
    if op.signature is not None:
        return arithmetic.build(name, op.signature)
    angle = op.params[0] if op.params else 0.0
    return catalog.build(name, op.kind, op.controls, angle, op.inverse)


def is_plain(built: Built) -> bool:
    """Whether there is no workspace to choose: a plain gate, or two controls, no slot.

    Such a recipe belongs to every policy.
    """
    few = built.kind not in ARITHMETIC_KINDS and built.controls <= 2
    return few and built.workspace == "none"
