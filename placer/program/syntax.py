"""Statements of a program text, as every parser of the OpenQASM family hands them on.

Names are not looked up and nothing is evaluated yet: that is the work of
`placer.program.elaborate`.  Expressions are kept in postfix order, so that evaluating
one never recurses.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, NamedTuple

from placer.errors import Fault, Place

ItemKind = Literal["number", "name", "unary", "binary", "call"]
Number = int | float


class Item(NamedTuple):
    """One item of an expression in postfix order.

    A number has its `value`; a name, an operator and a function have their `word`; a
    function also have their `arity`.
    """

    kind: ItemKind
    word: str
    value: Number
    arity: int
    place: Place


Expression = tuple[Item, ...]


class Slice(NamedTuple):
    """An index range; both ends belong to it, as the OpenQASM 3 specification says."""

    start: Expression | None
    step: Expression | None
    stop: Expression | None
    place: Place


class Several(NamedTuple):
    """An index set `{0, 2, 5}`."""

    members: tuple[Expression, ...]
    place: Place


Index = Expression | Slice | Several


class Operand(NamedTuple):
    """A register, a part of it, or a physical qubit `$n`."""

    name: str
    indices: tuple[Index, ...]
    place: Place


class Annotation(NamedTuple):
    """An annotation: its dotted name without the @, and the rest of its line."""

    name: str
    rest: str
    place: Place


class Modifier(NamedTuple):
    """A gate modifier; `value` is the argument of ctrl, negctrl or pow."""

    kind: Literal["ctrl", "negctrl", "inv", "pow"]
    value: Expression | None
    place: Place


@dataclass(frozen=True, slots=True)
class Include:
    """`include "file";`."""

    file: str
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class QubitDeclaration:
    """A quantum register; `size` is `None` for a single qubit."""

    name: str
    size: Expression | None
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class BitDeclaration:
    """A classical register; `size` is `None` for a single bit."""

    name: str
    size: Expression | None
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class ConstantDeclaration:
    """A compile-time constant; `width` is the number of bits of its type, if given."""

    name: str
    type: Literal["int", "uint", "float", "angle", "bool"]
    width: Expression | None
    value: Expression
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class AliasDeclaration:
    """`let name = part ++ part;`."""

    name: str
    parts: tuple[Operand, ...]
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class GateCall:
    """A gate on operands; a global phase has the name `gphase`."""

    name: str
    modifiers: tuple[Modifier, ...]
    params: tuple[Expression, ...]
    operands: tuple[Operand, ...]
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class GateDefinition:
    """A gate of the user's own, with its body."""

    name: str
    params: tuple[str, ...]
    wires: tuple[str, ...]
    body: tuple[Statement, ...]
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class Measurement:
    """A measurement into bits, or into nothing."""

    source: Operand
    target: Operand | None
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class Reset:
    """Bring qubits to |0>."""

    operand: Operand
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class Barrier:
    """Order only; no operands mean all qubits."""

    operands: tuple[Operand, ...]
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class Loop:
    """`for` over a constant range or set."""

    variable: str
    over: Slice | Several
    body: tuple[Statement, ...]
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class Pragma:
    """A pragma, to be handed on unchanged."""

    text: str
    place: Place
    annotations: tuple[Annotation, ...] = ()


@dataclass(frozen=True, slots=True)
class Unreadable:
    """A refused construct; the names it declares are not reported as missing later."""

    names: tuple[str, ...]
    faults: tuple[Fault, ...]
    place: Place
    annotations: tuple[Annotation, ...] = ()


Statement = (
    Include
    | QubitDeclaration
    | BitDeclaration
    | ConstantDeclaration
    | AliasDeclaration
    | GateCall
    | GateDefinition
    | Measurement
    | Reset
    | Barrier
    | Loop
    | Pragma
    | Unreadable
)


@dataclass(frozen=True, slots=True)
class Parsed:
    """A parsed text: its dialect and its statements."""

    dialect: Literal["openqasm2", "openqasm3"]
    statements: tuple[Statement, ...]
