"""Circuits over operands and slots: the words that every recipe is written in.

A circuit acts on local wires: operands first (0 .. operands-1, a call's wires in their
order, target last), then one wire per slot.  Two levels of the same circuit exist:
*coarse* (Toffoli level) and *fine* (one-qubit gates, cx, cz, two-body level-2 gates,
measurement).  Nothing here knows a device.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

SlotKind = Literal["clean", "borrowed"]
Workspace = Literal["none", "clean", "borrowed", "level2"]

# Operation names beside the plain gates of placer.program.model.PLAIN_GATES.
# Coarse circuits may use every one; fine circuits only one-qubit gates, cx, cz,
# level2, measure and reset.
EXTRA_GATES: tuple[str, ...] = ("ccx", "mcx", "mcz", "mcp", "level2", "measure")

Level2Action = Literal["x01", "x12", "p1"]


@dataclass(frozen=True, slots=True)
class Op:
    """One gate on local wires.

    `bit` is the local classical bit that a `measure` writes; `condition` is the bit
    that must be 1 for the gate to happen; `listens` names a bit of the program that
    an earlier step measured and the gate waits for.  A `level2` gate acts on
    (control, target): when the control is in state `level`, `action` is done to the
    target: `x01` swaps |0> and |1>, `x12` swaps |1> and |2>, `p1` gives |1> the phase
    `params[0]`.
    `enters` and `leaves` name the wires that may be in |2> from this gate on, and the
    wires that no longer can be after it.
    """

    name: str
    wires: tuple[int, ...]
    params: tuple[float, ...] = ()
    bit: int | None = None
    condition: int | None = None
    level: int = 1
    action: Level2Action | None = None
    enters: tuple[int, ...] = ()
    leaves: tuple[int, ...] = ()
    listens: str | None = None


@dataclass(frozen=True, slots=True)
class Circuit:
    """A circuit on `operands` wires and `len(slots)` workspace wires."""

    operands: int
    slots: tuple[SlotKind, ...]
    ops: tuple[Op, ...]
    bits: int = 0

    @property
    def width(self) -> int:
        """Number of local wires, operands and slots."""
        return self.operands + len(self.slots)


@dataclass(frozen=True, slots=True)
class Recipe:
    """A published construction as the catalog lists it.

    `workspace` is the policy it belongs to; `smallest` and `largest` bound the number
    of controls (`largest` is `None` where there is no bound).  `source` cites author,
    year and, where known, arXiv number.
    """

    name: str
    title: str
    kinds: tuple[str, ...]
    workspace: Workspace
    smallest: int
    largest: int | None
    needs_measurement: bool
    source: str


@dataclass(frozen=True, slots=True)
class Built:
    """A recipe made concrete for one size: both levels of the circuit.

    `level2_wires` are the local wires that are in |2> at some time; their sites must
    offer level 2.
    """

    recipe: str
    kind: str
    controls: int
    workspace: Workspace
    needs_measurement: bool
    coarse: Circuit
    fine: Circuit
    level2_wires: tuple[int, ...] = ()

    @property
    def slots(self) -> tuple[SlotKind, ...]:
        """The workspace that this recipe asks for, slot by slot."""
        return self.fine.slots
