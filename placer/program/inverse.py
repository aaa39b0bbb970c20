"""The operation that undoes an operation."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from placer.program.terms import inverse_base

if TYPE_CHECKING:
    from placer.program.model import OperationKind
    from placer.program.signature import Signature

_UNCHANGED = frozenset({"cx", "cy", "cz", "ch", "mcx", "mcz", "barrier"})


def undone(
    kind: OperationKind,
    name: str,
    params: tuple[float, ...],
    inverse: bool,
    signature: Signature | None,
) -> tuple[str, tuple[float, ...], bool, Signature | None]:
    """Return name, parameters, direction and signature of what undoes an operation.

    It must be no measurement or reset.
    """
    if signature is not None:
        return name, params, inverse, replace(signature, inverse=not signature.inverse)
    if kind == "and":
        return name, params, not inverse, None
    if kind == "gate" and name not in _UNCHANGED:
        return (*inverse_base(name, params), inverse, None)
    if kind == "mcp":
        return name, (-params[0],), inverse, None
    return name, params, inverse, None
