"""Drafts: both gate levels of a piece of circuit, grown side by side.

A recipe is put together from pieces that know their Toffoli-level form and their
spelled-out form.  In comes nothing but wires; out come tuples of `Op`.  Wire layout and
slots are the business of the recipe modules.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass, field, replace

from placer.recipes.circuit import Op, SlotKind

_MIRRORS = {"t": "tdg", "tdg": "t", "s": "sdg", "sdg": "s", "sx": "sxdg", "sxdg": "sx"}
_ANGLED = frozenset({"p", "rx", "ry", "rz", "cp", "crx", "cry", "crz", "rzz", "mcp"})
_SELF_INVERSE = frozenset({"id", "x", "y", "z", "h", "cx", "cz", "ccx", "mcx", "mcz"})
_EIGHTHS = {1: ("t",), 2: ("s",), 3: ("s", "t"), 4: ("z",)}
_EIGHTHS_BACK = {1: ("tdg",), 2: ("sdg",), 3: ("sdg", "tdg")}


@dataclass(frozen=True, slots=True)
class Draft:
    """A piece of circuit at both levels."""

    coarse: tuple[Op, ...] = ()
    fine: tuple[Op, ...] = ()

    def __add__(self, other: Draft) -> Draft:
        """Return this piece followed by the other."""
        return Draft(self.coarse + other.coarse, self.fine + other.fine)

    def inverse(self) -> Draft:
        """Return the mirror image; measurements have none."""
        return Draft(mirror(self.coarse), mirror(self.fine))


@dataclass(frozen=True, slots=True)
class Job:
    """What a recipe is asked for: kind, number of controls, angle, direction."""

    kind: str
    controls: int
    angle: float = 0.0
    inverse: bool = False

    @property
    def target(self) -> int:
        """The wire after the controls."""
        return self.controls

    @property
    def first_slot(self) -> int:
        """The wire of the first slot."""
        return self.controls + 1


@dataclass(frozen=True, slots=True)
class Made:
    """What a recipe hands to the catalog.

    `as_one` says that the coarse circuit is to show the call as a single operation.
    """

    draft: Draft
    slots: tuple[SlotKind, ...] = ()
    bits: int = 0
    as_one: bool = False
    level2_wires: tuple[int, ...] = field(default=())


def mirror_op(op: Op) -> Op:
    """Return the inverse of one gate.

    Raises
    ------
    ValueError
        If the operation cannot be undone (a measurement).
    """
    if op.name == "level2":
        params = tuple(-value for value in op.params)
        return replace(op, params=params, enters=op.leaves, leaves=op.enters)
    if op.name in _SELF_INVERSE:
        return op
    if op.name in _MIRRORS:
        return replace(op, name=_MIRRORS[op.name])
    if op.name in _ANGLED:
        return replace(op, params=tuple(-value for value in op.params))
    raise ValueError(f"{op.name} has no mirror image")


def mirror(ops: Iterable[Op]) -> tuple[Op, ...]:
    """Return the inverse circuit."""
    return tuple(mirror_op(op) for op in reversed(tuple(ops)))


def join(pieces: Iterable[Draft]) -> Draft:
    """Return the pieces one after another."""
    listed = list(pieces)
    return Draft(
        tuple(op for piece in listed for op in piece.coarse),
        tuple(op for piece in listed for op in piece.fine),
    )


def same(kind: SlotKind, count: int) -> tuple[SlotKind, ...]:
    """Return so many slots of one kind."""
    return (kind,) * count


def both(name: str, *wires: int) -> Draft:
    """Return one plain gate that reads the same at both levels."""
    ops = (Op(name, wires),)
    return Draft(ops, ops)


def gates(*words: tuple[str, int] | tuple[str, int, int]) -> tuple[Op, ...]:
    """Return fine gates from (name, wire...) words."""
    return tuple(Op(word[0], word[1:]) for word in words)


def phase(angle: float, wire: int) -> tuple[Op, ...]:
    """Return the gates that give |1> a phase, as z, s, t and mirrors where exact."""
    eighths = angle / (math.pi / 4)
    if eighths == 0:
        return ()
    if eighths == round(eighths) and abs(eighths) <= 4:
        table = _EIGHTHS if eighths > 0 else {**_EIGHTHS_BACK, 4: ("z",)}
        return tuple(Op(name, (wire,)) for name in table[abs(round(eighths))])
    return (Op("p", (wire,), (angle,)),)


def tidy(ops: Iterable[Op]) -> tuple[Op, ...]:
    """Cancel gates that meet their own inverse on the very same wires.

    Only unconditional gates without marks are looked at; two gates meet when nothing
    stands between them on any of their wires.
    """
    kept: list[Op | None] = []
    last: dict[int, list[int]] = {}
    for op in ops:
        seats = [last.get(wire, [])[-1:] for wire in op.wires]
        previous = kept[seats[0][0]] if seats[0] else None
        if (
            previous is not None
            and all(seat == seats[0] for seat in seats)
            and len(previous.wires) == len(op.wires)
            and _undoes(previous, op)
        ):
            kept[seats[0][0]] = None
            for wire in op.wires:
                last[wire].pop()
            continue
        for wire in op.wires:
            last.setdefault(wire, []).append(len(kept))
        kept.append(op)
    return tuple(op for op in kept if op is not None)


def _undoes(first: Op, second: Op) -> bool:
    if first.name in ("measure", "reset", "level2"):
        return False
    if first.condition is not None or second.condition is not None:
        return False
    return mirror_op(first) == second
