"""A program as frozen data: registers, wires, operations, scopes.

What comes out of a reader is flat: gate definitions, broadcasts, loops and scopes are
expanded, controlled gates are lowered to calls and plain gates, cleanup by mirror is
written out.  Nothing here knows a device or a recipe.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Literal, NewType

from placer.errors import Place
from placer.program.signature import ARITHMETIC_KINDS, Signature

WireId = NewType("WireId", int)

NOWHERE = Place("")
"""The place of a step that no source line wrote."""

Start = Literal["zero", "unknown"]
OperationKind = Literal[
    "gate",
    "mcx",
    "mcz",
    "mcp",
    "and",
    "add",
    "subtract",
    "sum",
    "add_constant",
    "less_than",
    "equal",
    "increment",
    "decrement",
    "lookup",
    "multiply_add",
    "measure",
    "reset",
    "barrier",
]
CONTROLLED_KINDS: tuple[str, ...] = ("mcx", "mcz", "mcp", "and")
CALL_KINDS: tuple[str, ...] = (*CONTROLLED_KINDS, *ARITHMETIC_KINDS)

# Plain gates that an operation of kind "gate" may name: wires, parameters.
# Angles are radians in the OpenQASM 3 convention (stdgates.inc); u(theta, phi, lambda).
PLAIN_GATES: Mapping[str, tuple[int, int]] = MappingProxyType(
    {
        "id": (1, 0),
        "x": (1, 0),
        "y": (1, 0),
        "z": (1, 0),
        "h": (1, 0),
        "s": (1, 0),
        "sdg": (1, 0),
        "t": (1, 0),
        "tdg": (1, 0),
        "sx": (1, 0),
        "sxdg": (1, 0),
        "rx": (1, 1),
        "ry": (1, 1),
        "rz": (1, 1),
        "p": (1, 1),
        "u": (1, 3),
        "cx": (2, 0),
        "cy": (2, 0),
        "cz": (2, 0),
        "ch": (2, 0),
        "cp": (2, 1),
        "crx": (2, 1),
        "cry": (2, 1),
        "crz": (2, 1),
        "swap": (2, 0),
        "rzz": (2, 1),
        "rxx": (2, 1),
    }
)


@dataclass(frozen=True, slots=True)
class Register:
    """A named group of wires.

    `start` says what the wires hold before the first operation.  `workspace` marks
    scratch that starts and ends in |0> (a claim that the reader has verified);
    such wires occupy a site only from their first to their last operation.
    `lendable` is False where the program forbids lending.  `pins` holds the site of
    each wire where the source names physical qubits, else `None`.
    """

    name: str
    width: int
    is_single: bool
    start: Start
    workspace: bool
    lendable: bool
    first: WireId
    place: Place
    pins: tuple[int, ...] | None = None


@dataclass(frozen=True, slots=True)
class Operation:
    """One step of the flat program.

    Calls (`mcx`, `mcz`, `mcp`, `and`) have their controls first and the target last in
    `wires`; there are at least two controls.  `and` computes the product into a target
    in |0>, and with `inverse` takes it away again.  `mcp` has its angle in `params`.
    Arithmetic calls have a `signature`, which says what their wires mean and whether
    they are inverted.
    A gate has its name from PLAIN_GATES.  `bit` is the classical bit of a measurement,
    as written in the source (`c[3]`).  A gate with a `condition`, named like a `bit`,
    happens only where that bit was measured as 1.  `scope` is the number of the
    innermost scope, -1 outside of all.  `part` says which part of that scope the step
    belongs to.
    """

    index: int
    kind: OperationKind
    name: str
    wires: tuple[WireId, ...]
    params: tuple[float, ...] = ()
    inverse: bool = False
    bit: str | None = None
    place: Place = NOWHERE
    scope: int = -1
    part: Literal["", "compute", "body", "cleanup"] = ""
    annotations: tuple[str, ...] = ()
    signature: Signature | None = None
    condition: str | None = None

    @property
    def is_call(self) -> bool:
        """Whether recipes compete for this step."""
        return self.kind in CALL_KINDS

    @property
    def controls(self) -> int:
        """Number of controls of a call."""
        if self.signature is not None:
            return self.signature.controls
        return len(self.wires) - 1

    @property
    def title(self) -> str:
        """The call in a few words, such as `mcx with 5 controls` or `add (8, 8)`."""
        if self.signature is None:
            return f"{self.kind} with {self.controls} controls"
        widths = ", ".join(str(width) for width in self.signature.widths)
        inverse = " inverted" if self.signature.inverse else ""
        more = f" with {self.controls} controls" if self.controls else ""
        return f"{self.kind} ({widths}){inverse}{more}"


@dataclass(frozen=True, slots=True)
class Scope:
    """A compute part, its body and its cleanup, as ranges of operation indices.

    `parent` is -1 for an outermost scope; `part` is the part of the parent that the
    scope stands in.  Ranges are half-open.
    """

    number: int
    parent: int
    name: str
    compute: tuple[int, int]
    body: tuple[int, int]
    cleanup: tuple[int, int]
    place: Place
    part: Literal["", "compute", "body", "cleanup"] = ""


@dataclass(frozen=True, slots=True)
class Program:
    """A flat program.

    `wire_names[w]` is the name in the source (`c[0]`, or `t` for a single qubit);
    `bits` lists classical registers as (name, width; 0 = single bit).  `kept` are
    pragmas to re-emit at the top of an output.  `assumed` says in words which start
    states were assumed.  `moves` says by which moves (`program.rewrite`) the values of
    the scopes are computed and cleaned up, `None` if as the source says.
    """

    name: str
    syntax: Literal["openqasm2", "openqasm3", "yaml"]
    registers: tuple[Register, ...]
    wire_names: tuple[str, ...]
    operations: tuple[Operation, ...]
    scopes: tuple[Scope, ...]
    bits: tuple[tuple[str, int], ...]
    kept: tuple[str, ...]
    assumed: str
    open_inputs: bool
    text: str
    path: str
    hash: str
    register_of: tuple[int, ...] = field(repr=False, default=())
    moves: tuple[tuple[str, int], ...] | None = None

    def register_at(self, wire: int) -> Register:
        """Return the register that a wire belongs to."""
        return self.registers[self.register_of[wire]]

    @property
    def calls(self) -> tuple[Operation, ...]:
        """The operations that recipes compete for, in program order."""
        return tuple(op for op in self.operations if op.is_call)
