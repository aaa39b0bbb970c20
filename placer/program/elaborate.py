"""Statements to a flat list of operations: names, sizes, broadcasts, loops, includes.

Every statement is tried; the faults of all of them come out together.  A name whose
declaration failed is not reported again where it is used.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from placer.errors import Fault, InputError, Place
from placer.program.annotation import (
    PAIRED,
    foreign,
    is_own,
    refuse_own,
    wire_notes,
    word_of,
)
from placer.program.draft import Draft, Step
from placer.program.gates import Gates
from placer.program.gatetable import INCLUDE_FILES
from placer.program.loops import MOST_OPERATIONS, loop_values
from placer.program.model import OperationKind, Start
from placer.program.names import Bits, Broken, Constant, Names, Wires
from placer.program.pairs import Pairs
from placer.program.syntax import (
    AliasDeclaration,
    Barrier,
    BitDeclaration,
    ConstantDeclaration,
    GateCall,
    GateDefinition,
    Include,
    Loop,
    Measurement,
    Operand,
    Parsed,
    Pragma,
    QubitDeclaration,
    Reset,
    Statement,
    Unreadable,
)

MOST_FAULTS = 200
MOST_WIRES = 1_000_000
Parser = Callable[[str, str], Parsed]


class _TooMany(Exception):  # noqa: N818 - ends the pass, never leaves this module
    """Nothing more is worth reading."""


@dataclass(slots=True)
class Elaboration:
    """A program being worked out.

    `skipped` counts statements that use a refused name; their fault is reported there.
    """

    dialect: str
    parse: Parser
    start: Start
    names: Names
    gates: Gates
    draft: Draft = field(default_factory=Draft)
    faults: list[Fault] = field(default_factory=list)
    files: list[Path] = field(default_factory=list)
    skipped: int = 0
    pairs: Pairs = field(init=False)

    def __post_init__(self) -> None:
        """Let the pairs see the draft."""
        self.pairs = Pairs(self.draft, self._scratch)

    def _scratch(self, name: str, place: Place) -> Sequence[int]:
        wires = self.names.wires(Operand(name, (), place)).wires
        for register in self.draft.registers:
            inside = register.first <= wires[0] < register.first + register.width
            if inside and not register.is_workspace:
                raise InputError.at(
                    place,
                    "not-scratch",
                    f"'{name}' is no workspace",
                    "write '@placer.workspace init=zero ends=zero' before its "
                    "declaration",
                )
        return wires

    def run(self, statements: Sequence[Statement]) -> None:
        """Work out statements at the outermost level."""
        try:
            self._statements(statements)
            self.faults.extend(self.pairs.left())
        except _TooMany:
            return
        finally:
            self.draft.notes.extend(self.gates.notes)

    def _statements(self, statements: Sequence[Statement]) -> None:
        for statement in statements:
            try:
                first = len(self.draft.steps)
                pair = None
                if isinstance(statement, _PAIRABLE):
                    pair = self.pairs.begin(statement.annotations)
                _WORKERS[type(statement)](self, statement)
                self.faults.extend(self.pairs.end(pair, first))
                self._check_notes(statement)
            except InputError as error:
                self.faults.extend(error.faults)
                self.skipped += not error.faults
                self._mark_broken(statement)
            if len(self.faults) > MOST_FAULTS:
                raise _TooMany
            if len(self.draft.steps) > MOST_OPERATIONS:
                self.faults.append(
                    Fault(
                        statement.place,
                        "too-large",
                        "the program expands to more than "
                        f"{MOST_OPERATIONS} operations",
                        "plan its parts as programs of their own",
                    )
                )
                raise _TooMany

    def _check_notes(self, statement: Statement) -> None:
        if not statement.annotations:
            return
        if not isinstance(statement, QubitDeclaration):
            refuse_own(
                note
                for note in statement.annotations
                if not isinstance(statement, _PAIRABLE)
                or not is_own(note)
                or word_of(note) not in PAIRED
            )
        if isinstance(statement, _WITHOUT_STEPS):
            self.draft.notes.extend(
                f"the annotation '@{note.name}' in line {note.place.line} is not "
                "handed on, since its statement has no operations"
                for note in statement.annotations
                if not is_own(note)
            )

    def _mark_broken(self, statement: Statement) -> None:
        """Keep the names of a refused declaration from being reported again."""
        names: tuple[str, ...] = ()
        if isinstance(statement, Unreadable):
            names = statement.names
        elif isinstance(statement, _DECLARATIONS):
            names = (statement.name,)
        for name in names:
            self.names.blocks[-1].setdefault(name, (Broken(), statement.place))
        if isinstance(statement, Unreadable | GateDefinition):
            gates = names if isinstance(statement, Unreadable) else (statement.name,)
            for name in gates:
                self.gates.own.setdefault(name, None)

    def _step(
        self,
        statement: Statement,
        kind: OperationKind,
        wires: tuple[int, ...],
        *,
        name: str = "",
        params: tuple[float, ...] = (),
        bit: str | None = None,
    ) -> None:
        self.draft.steps.append(
            Step(
                kind,
                name or kind,
                wires,
                params,
                statement.place,
                bit=bit,
                annotations=foreign(statement.annotations),
            )
        )

    def include(self, statement: Include) -> None:
        """Open the gate table, or read a file of the user's own in place."""
        if statement.file in INCLUDE_FILES:
            self.gates.has_library = True
            return
        path = (self.files[-1].parent / statement.file).resolve()
        if path in self.files:
            raise InputError.at(
                statement.place,
                "recursion",
                f"the file '{statement.file}' includes itself",
            )
        try:
            text = path.read_text(encoding="utf-8-sig")
        except (OSError, UnicodeDecodeError, ValueError) as error:
            reason = getattr(error, "strerror", None) or "it is no text file"
            raise InputError.at(
                statement.place,
                "include",
                f"the file '{statement.file}' cannot be read: {reason}",
                f"only {' and '.join(INCLUDE_FILES)} need no file of their own",
            ) from error
        self.draft.sources.append(text)
        name = str(Path(statement.place.file).parent / statement.file)
        parsed = self.parse(text, name)
        self.files.append(path)
        try:
            self._statements(parsed.statements)
        finally:
            self.files.pop()

    def qubits(self, statement: QubitDeclaration) -> None:
        """Declare a quantum register."""
        name = statement.name
        width = self.names.size(statement.size, name)
        notes = wire_notes(statement.annotations)
        if self.draft.wires + width > MOST_WIRES:
            raise InputError.at(
                statement.place, "too-large", f"more than {MOST_WIRES} qubits"
            )
        first = self.draft.wires
        entity = Wires(tuple(range(first, first + width)), statement.size is None)
        self.names.declare(name, entity, statement.place)
        self.draft.add_register(
            name,
            None if statement.size is None else width,
            "zero" if notes.is_workspace else self.start,
            statement.place,
            is_workspace=notes.is_workspace,
            is_lendable=notes.is_lendable,
        )

    def classical(self, statement: BitDeclaration) -> None:
        """Declare a classical register."""
        name = statement.name
        width = self.names.size(statement.size, name)
        is_single = statement.size is None
        bits = (name,) if is_single else tuple(f"{name}[{i}]" for i in range(width))
        self.names.declare(name, Bits(bits, is_single), statement.place)
        self.draft.bits.append((name, 0 if is_single else width))

    def constant(self, statement: ConstantDeclaration) -> None:
        """Declare a constant, in the range of its type."""
        name, kind = statement.name, statement.type
        value = self.names.value(statement.value)
        if kind in ("int", "uint", "bool") and isinstance(value, float):
            raise InputError.at(
                statement.place,
                "not-whole",
                f"'{name}' is of type {kind}, but its value is {value:g}",
            )
        if kind in ("float", "angle"):
            value = float(value)
        width = 2048
        if statement.width is not None:
            width = self.names.whole(statement.width, f"the width of '{name}'")
        low = -(2 ** (min(width, 2048) - 1)) if kind == "int" and width > 0 else 0
        high = 2 ** min(max(width, 0), 2048) if kind == "uint" else -low
        if kind == "bool":
            high = 2
        if kind in ("int", "uint", "bool") and not low <= value < high:
            raise InputError.at(
                statement.place,
                "out-of-range",
                f"'{name}' does not fit its type {kind}: its value is {value}",
            )
        self.names.declare(name, Constant(value), statement.place)

    def alias(self, statement: AliasDeclaration) -> None:
        """Declare another name for wires."""
        parts = [self.names.wires(part) for part in statement.parts]
        wires = tuple(wire for part in parts for wire in part.wires)
        if len(set(wires)) < len(wires):
            raise InputError.at(
                statement.place,
                "same-qubit",
                f"the alias '{statement.name}' holds a qubit twice",
            )
        is_single = len(parts) == 1 and parts[0].is_single
        self.names.declare(statement.name, Wires(wires, is_single), statement.place)

    def definition(self, statement: GateDefinition) -> None:
        """Declare a gate of the user's own."""
        self.gates.declare(statement)

    def call(self, statement: GateCall) -> None:
        """Apply a gate to each of the broadcast operands."""
        raws = self.gates.operations(statement)
        steps = self.draft.steps
        notes = foreign(statement.annotations)
        for wires in self._broadcast(statement, statement.operands):
            if len(set(wires)) < len(wires):
                raise InputError.at(
                    statement.place,
                    "same-qubit",
                    f"the gate '{statement.name}' gets the same qubit twice: "
                    f"{self._wire_name(_twice(wires))}",
                )
            for raw in raws:
                local = tuple(wires[i] for i in raw.wires)
                steps.append(
                    Step(
                        raw.kind,
                        raw.name,
                        local,
                        raw.params,
                        statement.place,
                        annotations=notes,
                    )
                )
            if len(steps) > MOST_OPERATIONS:
                return

    def _broadcast(
        self, statement: Statement, operands: Sequence[Operand]
    ) -> list[tuple[int, ...]]:
        """Return the wires of each application, single operands repeated."""
        parts = [self.names.wires(operand) for operand in operands]
        registers = [
            (operand, part)
            for operand, part in zip(operands, parts, strict=True)
            if not part.is_single
        ]
        if not registers:
            return [tuple(part.wires[0] for part in parts)]
        size = len(registers[0][1].wires)
        for operand, part in registers:
            if len(part.wires) != size:
                first = registers[0][0].name
                raise InputError.at(
                    statement.place,
                    "broadcast",
                    f"'{first}' has {size} qubits, '{operand.name}' has "
                    f"{len(part.wires)}",
                    "registers in one statement must have the same size",
                )
        return [
            tuple(part.wires[0 if part.is_single else i] for part in parts)
            for i in range(size)
        ]

    def _wire_name(self, wire: int) -> str:
        for register in self.draft.registers:
            place = wire - register.first
            if 0 <= place < register.width:
                if register.is_single:
                    return f"'{register.name}'"
                return f"'{register.name}[{place}]'"
        return f"wire {wire}"

    def measurement(self, statement: Measurement) -> None:
        """Measure wires, into bits of the same number if there are any."""
        wires = self.names.wires(statement.source).wires
        self._need_distinct(statement, wires)
        bits: tuple[str | None, ...] = (None,) * len(wires)
        if statement.target is not None:
            target = self.names.bits(statement.target)
            if len(target.bits) != len(wires):
                raise InputError.at(
                    statement.place,
                    "broadcast",
                    f"'{statement.source.name}' gives {len(wires)} results, "
                    f"'{statement.target.name}' takes {len(target.bits)}",
                )
            bits = target.bits
        for wire, bit in zip(wires, bits, strict=True):
            self._step(statement, "measure", (wire,), bit=bit)

    def reset(self, statement: Reset) -> None:
        """Bring wires to |0>."""
        wires = self.names.wires(statement.operand).wires
        self._need_distinct(statement, wires)
        for wire in wires:
            self._step(statement, "reset", (wire,))

    def barrier(self, statement: Barrier) -> None:
        """Order operations on some or all wires."""
        wires: tuple[int, ...] = tuple(range(self.draft.wires))
        if statement.operands:
            parts = [self.names.wires(operand) for operand in statement.operands]
            wires = tuple(wire for part in parts for wire in part.wires)
            self._need_distinct(statement, wires)
        if wires:
            self._step(statement, "barrier", wires)

    def _need_distinct(self, statement: Statement, wires: tuple[int, ...]) -> None:
        if len(set(wires)) < len(wires):
            raise InputError.at(
                statement.place,
                "same-qubit",
                f"the same qubit stands twice: {self._wire_name(_twice(wires))}",
            )

    def loop(self, statement: Loop) -> None:
        """Unroll a loop."""
        for value in loop_values(self.names, statement):
            constant = Constant(value)
            faults = len(self.faults)
            self.names.blocks.append({statement.variable: (constant, statement.place)})
            try:
                self._statements(statement.body)
            finally:
                self.names.blocks.pop()
            if len(self.faults) > faults:
                # The other turns would repeat most of these faults.
                return

    def pragma(self, statement: Pragma) -> None:
        """Keep a pragma for the output."""
        self.draft.kept.append(statement.text)

    def unreadable(self, statement: Unreadable) -> None:
        """Report what the parser refused."""
        raise InputError(statement.faults)


def _twice(wires: Sequence[int]) -> int:
    return next(wire for i, wire in enumerate(wires) if wire in wires[:i])


_DECLARATIONS = (
    QubitDeclaration,
    BitDeclaration,
    ConstantDeclaration,
    AliasDeclaration,
)
_PAIRABLE = (GateCall, Loop)
_WITHOUT_STEPS = (*_DECLARATIONS, GateDefinition, Include, Loop)
_WORKERS: dict[type[Statement], Callable[..., None]] = {
    Include: Elaboration.include,
    QubitDeclaration: Elaboration.qubits,
    BitDeclaration: Elaboration.classical,
    ConstantDeclaration: Elaboration.constant,
    AliasDeclaration: Elaboration.alias,
    GateDefinition: Elaboration.definition,
    GateCall: Elaboration.call,
    Measurement: Elaboration.measurement,
    Reset: Elaboration.reset,
    Barrier: Elaboration.barrier,
    Loop: Elaboration.loop,
    Pragma: Elaboration.pragma,
    Unreadable: Elaboration.unreadable,
}


def elaborate(parsed: Parsed, parse: Parser, path: str, *, start: Start) -> Elaboration:
    """Work out a parsed text; faults are in the result."""
    names = Names(parsed.dialect)
    work = Elaboration(parsed.dialect, parse, start, names, Gates(names))
    work.files.append(Path.cwd() / "-" if path == "-" else Path(path).resolve())
    work.run(parsed.statements)
    return work
