"""What each operation of a program is for: it makes a value, uses it, or takes it back.

In: a program with scopes.  Out: per operation whether it computes something that the
scope's own cleanup undoes, cleans it up, or is there for good.  A scope whose compute
part cannot be moved (it changes more than workspace, or branches) counts as if its
steps stood there without a scope.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

from placer.program.claims import BRANCHING, DIAGONAL
from placer.program.signature import changed

if TYPE_CHECKING:
    from placer.program.draft import Step
    from placer.program.model import Operation, Program

Role = Literal["make", "use", "clean"]
_FIXED = frozenset(["measure", "reset", "barrier"])


@dataclass(frozen=True, slots=True)
class Part:
    """The role of an operation, and the scopes that it makes something for.

    `scope` is the outermost one, `home` the innermost, whose cleanup takes it back
    first; -1 where it makes nothing.
    """

    role: Role
    scope: int = -1
    home: int = -1


def part_of(program: Program, operation: Operation, fixed: frozenset[int]) -> Part:
    """Return the role of an operation; `fixed` scopes are looked through."""
    chain: list[tuple[int, str]] = []
    number, part = operation.scope, str(operation.part)
    while number >= 0:
        scope = program.scopes[number]
        if number not in fixed:
            chain.append((number, part))
        number, part = scope.parent, scope.part
    if any(part == "cleanup" for _, part in chain):
        return Part("clean")
    making = [number for number, part in chain if part == "compute"]
    if making:
        return Part("make", making[-1], making[0])
    return Part("use")


def name_of(operation: Operation | Step) -> str:
    """Return the name of a gate, else the kind of a step."""
    return operation.name if operation.kind == "gate" else operation.kind


def is_bitwise(operation: Operation) -> bool:
    """Whether an operation permutes basis states, up to phases, for any outcome."""
    name = name_of(operation)
    if name in _FIXED or name in BRANCHING or operation.condition is not None:
        return False
    return operation.kind != "gate" or name in DIAGONAL or name in _PERMUTING


_PERMUTING = frozenset(["x", "y", "cx", "cy", "swap"])


def has_phase(operation: Operation) -> bool:
    """Whether an operation may change phases."""
    name = name_of(operation)
    return name in DIAGONAL - {"id"} or name in ("y", "cy")


def written(operation: Operation | Step) -> tuple[int, ...]:
    """Return the wires whose basis value an operation may change or disturb.

    A measurement counts: it ends the superposition that a cleanup would need.
    """
    if operation.signature is not None:
        return tuple(operation.wires[w] for w in changed(operation.signature))
    name = name_of(operation)
    if name == "barrier" or (name in DIAGONAL and name != "measure"):
        return ()
    if name in ("swap", "rxx", "measure", "reset"):
        return operation.wires
    return operation.wires[-1:]
