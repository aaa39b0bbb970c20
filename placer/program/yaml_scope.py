"""Cleanup by mirror: the inverse of a compute part, and when it would be wrong."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from placer.errors import Fault
from placer.program.draft import Draft, DraftScope, Part, Step
from placer.program.inverse import undone
from placer.program.roles import written

_SWAPPED: dict[Part, Part] = {
    "": "",
    "compute": "cleanup",
    "body": "body",
    "cleanup": "compute",
}


def inverse_step(step: Step) -> Step:
    """Return the step that undoes a step, which must be no measurement or reset."""
    name, params, inverse, signature = undone(
        step.kind, step.name, step.params, step.inverse, step.signature
    )
    return step._replace(name=name, params=params, inverse=inverse, signature=signature)


def mirror(
    draft: Draft,
    compute: Sequence[Step],
    scope: int,
    fresh: Callable[[int, int], dict[int, int]],
) -> list[Step]:
    """Return the cleanup of a scope: its compute part, backwards.

    Scopes inside of the compute part are copied with workspace of their own, for which
    `fresh(old scope, new scope)` gives the new wire of each old one.
    """
    copies: dict[int, int] = {scope: scope}
    moved: dict[int, int] = {}
    for number in sorted({step.scope for step in compute} - {scope}):
        _copy_chain(draft, number, copies)
    for old, new in sorted(copies.items()):
        if old != new:
            moved.update(fresh(old, new))
    result = []
    for step in reversed(compute):
        part = "cleanup" if step.scope == scope else _SWAPPED[step.part]
        wires = tuple(moved.get(wire, wire) for wire in step.wires)
        step = inverse_step(step)
        result.append(step._replace(scope=copies[step.scope], part=part, wires=wires))
    return result


def _copy_chain(draft: Draft, number: int, copies: dict[int, int]) -> int:
    """Copy a scope and those between it and the one that is cleaned."""
    if number in copies:
        return copies[number]
    old = draft.scopes[number]
    is_direct = copies.get(old.parent) == old.parent
    parent = _copy_chain(draft, old.parent, copies)
    part: Part = "cleanup" if is_direct else _SWAPPED[old.part]
    new = len(draft.scopes)
    draft.scopes.append(DraftScope(new, parent, part, old.name, old.place))
    copies[number] = new
    return new


def body_faults(
    compute: Sequence[Step], body: Sequence[Step], names: Callable[[], Sequence[str]]
) -> list[Fault]:
    """Find steps of a body that spoil the cleanup: they change what it needs.

    `names` gives the names of the wires, once there is something to say.
    """
    needed: dict[int, Step] = {}
    for step in compute:
        if step.kind != "barrier":
            for wire in step.wires:
                needed.setdefault(wire, step)
    faults = []
    for step in body:
        for wire in () if step.is_frame else written(step):
            if wire in needed:
                first = needed[wire]
                faults.append(
                    Fault(
                        step.place,
                        "spoiled-cleanup",
                        f"'{step.name}' in the body changes {names()[wire]}, which the "
                        f"compute part uses in line {first.place.line} and the "
                        "cleanup needs unchanged",
                        "work on a copy, or move the step out of the scope",
                    )
                )
    return faults
