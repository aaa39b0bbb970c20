"""All recipes of a call, whatever its kind: multi-controlled or arithmetic.

In: an operation of a program.  Out: names in a fixed order, and `Built` circuits.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import TYPE_CHECKING

from placer.program.signature import ARITHMETIC_KINDS
from placer.recipes import arithmetic, catalog

if TYPE_CHECKING:
    from placer.program.model import Operation
    from placer.recipes.circuit import Built


_ROTATIONS = "no Toffoli and no T: rotations only, where rotations are the better gates"
_LONG = "short depth on wide registers; on two to four bits others are smaller"

KEPT_FOR: Mapping[str, str] = MappingProxyType(
    {
        "add-fourier": _ROTATIONS,
        "add-lookahead": _LONG,
        "add-lookahead-measured": _LONG,
        "add-ripple-none": "the fewest gates without workspace from three bits on",
        "add-ripple-one": "the fewest gates with one clean wire from three bits on",
        "borrowed-one-halves": "the published form that others are measured against",
        "compare-fourier": _ROTATIONS,
        "constant-fourier": _ROTATIONS,
        "none-gray": "the fewest two-qubit gates without workspace up to five controls",
        "none-linear": "linear depth without workspace; the best from six controls on",
        "none-quadratic": "few and large rotations, where small ones are out of reach",
    }
)
"""Why recipes stay that some other of equal needs beats in gates and depth."""


def kept_for(name: str) -> str:
    """Return why a recipe is offered though another one is smaller, at some sizes."""
    return KEPT_FOR.get(name.removeprefix("equal-"), "")


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
