"""A program in the making: what readers collect before it is frozen."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal, NamedTuple

from placer.errors import Place
from placer.program.model import OperationKind, Start
from placer.program.signature import Signature

Part = Literal["", "compute", "body", "cleanup"]


class Step(NamedTuple):
    """An operation without its number.

    An `is_frame` step is one of a pair that leaves its wire as it was.
    """

    kind: OperationKind
    name: str
    wires: tuple[int, ...]
    params: tuple[float, ...]
    place: Place
    inverse: bool = False
    bit: str | None = None
    scope: int = -1
    part: Part = ""
    annotations: tuple[str, ...] = ()
    is_frame: bool = False
    signature: Signature | None = None
    condition: str | None = None


@dataclass(slots=True)
class DraftRegister:
    """A register in the making."""

    name: str
    width: int
    is_single: bool
    start: Start
    is_workspace: bool
    is_lendable: bool
    first: int
    place: Place


@dataclass(slots=True)
class DraftScope:
    """A scope in the making; `part` is the part of its parent that it stands in."""

    number: int
    parent: int
    part: Part
    name: str
    place: Place


@dataclass(slots=True)
class Draft:
    """Everything that a reader collects."""

    registers: list[DraftRegister] = field(default_factory=list)
    wires: int = 0
    steps: list[Step] = field(default_factory=list)
    scopes: list[DraftScope] = field(default_factory=list)
    bits: list[tuple[str, int]] = field(default_factory=list)
    kept: list[str] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    sources: list[str] = field(default_factory=list)

    def add_register(
        self,
        name: str,
        width: int | None,
        start: Start,
        place: Place,
        *,
        is_workspace: bool = False,
        is_lendable: bool = True,
    ) -> tuple[int, ...]:
        """Add a register and return its wires; `width` is `None` for a single one."""
        first = self.wires
        size = 1 if width is None else width
        self.registers.append(
            DraftRegister(
                name,
                size,
                width is None,
                start,
                is_workspace,
                is_lendable,
                first,
                place,
            )
        )
        self.wires += size
        return tuple(range(first, first + size))
