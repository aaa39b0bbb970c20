"""A program with its values computed and cleaned up in another order.

In: a program, its values and a list of moves.  Out: the flat program that does the
moves one after the other.  Each time that a value is computed it gets wires of its own.
Whether the moves make sense is not asked here, only whether they can be written down.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Literal, NamedTuple

from placer.errors import InternalError
from placer.program.inverse import undone
from placer.program.model import NOWHERE, Operation, Program, Register, WireId

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.program.values import Value, ValueGraph

Action = Literal["compute", "uncompute", "drop", "use"]


class Move(NamedTuple):
    """One move: what is done, and with which value (for `use`: which use).

    `drop` measures the wires of a value in the X basis.  What that leaves is a phase
    that depends on the value; it is fixed when the value is computed the next time.
    """

    action: Action
    number: int


def rewritten(
    program: Program, graph: ValueGraph, moves: Sequence[Move], *, has_reset: bool
) -> Program:
    """Return the program that does the moves.

    `has_reset` says whether a measured wire is taken to |0> by a reset, else by an x
    that waits for its outcome.

    Raises
    ------
    InternalError
        If a move cannot be written down: it needs a value that is not there.
    """
    writer = _Writer(program, graph, has_reset)
    for move in moves:
        writer.write(move)
    return writer.program(tuple(moves))


@dataclass(slots=True)
class _Writer:
    """Where the writing stands; new wires are numbered as they come.

    `live` gives the new wire of each place of the values that are there, `records` the
    bits of open records, `renumbered` the new number of wires of no value.
    """

    source: Program
    graph: ValueGraph
    has_reset: bool
    registers: list[Register] = field(default_factory=list)
    names: list[str] = field(default_factory=list)
    renumbered: dict[int, int] = field(default_factory=dict)
    operations: list[Operation] = field(default_factory=list)
    live: dict[int, list[int]] = field(default_factory=dict)
    records: dict[int, list[str]] = field(default_factory=dict)
    bits: list[tuple[str, int]] = field(default_factory=list)
    taken: set[str] = field(default_factory=set)

    def __post_init__(self) -> None:
        """Keep the registers that are more than wires of values."""
        inside = {wire for value in self.graph.values for wire in value.wires}
        used: set[int] = set()
        for step, held in self.graph.held.items():
            operation = self.source.operations[step]
            used.update(w for w in operation.wires if w not in held)
            inside.update(held)
        self.bits = list(self.source.bits)
        self.taken = {name for name, _ in self.bits}
        for register in self.source.registers:
            wires = range(register.first, register.first + register.width)
            if all(w in inside and w not in used for w in wires):
                continue
            first = self._register(register, register.name, register.width)
            self.renumbered.update(zip(wires, first, strict=True))

    def _register(self, like: Register, name: str, width: int) -> list[int]:
        first = len(self.names)
        is_single = like.is_single if width == like.width else width == 1
        self.registers.append(
            replace(
                like, name=name, width=width, is_single=is_single, first=WireId(first)
            )
        )
        self.taken.add(name)
        if is_single:
            self.names.append(name)
        else:
            self.names += [f"{name}[{k}]" for k in range(width)]
        return list(range(first, first + width))

    def _fresh(self, name: str) -> str:
        """Return a name that nothing has yet."""
        number, found = 1, name
        while found in self.taken:
            number += 1
            found = f"{name}#{number}"
        return found

    def write(self, move: Move) -> None:
        """Write one move down."""
        if move.action == "use":
            for step in self.graph.uses[move.number].steps:
                self._again(step, is_value=False, is_undone=False)
            return
        value = self.graph.values[move.number]
        if move.action == "compute":
            if move.number in self.live:
                raise InternalError(f"'{value.name}' is computed twice")
            self._compute(move.number, value)
        elif move.number not in self.live:
            raise InternalError(f"'{value.name}' is not there to clean up")
        elif move.action == "uncompute":
            self._run(value, is_undone=True)
            del self.live[move.number]
        else:
            self._drop(move.number, value)

    def _compute(self, number: int, value: Value) -> None:
        like = self.source.register_at(value.wires[0])
        name = self._fresh(value.name)
        wires = self._register(like, name, len(value.wires))
        self.live[number] = wires
        self._run(value, is_undone=False)
        record = self.records.pop(number, None)
        if record is not None:
            for wire, bit in zip(self._holding(number), record, strict=True):
                self._add("gate", "z", wire, value, condition=bit)

    def _holding(self, number: int) -> list[int]:
        value = self.graph.values[number]
        wires = self.live[number]
        return [w for place, w in enumerate(wires) if place not in value.spare]

    def _run(self, value: Value, *, is_undone: bool) -> None:
        for step in reversed(value.steps) if is_undone else value.steps:
            self._again(step, is_value=True, is_undone=is_undone)

    def _again(self, step: int, *, is_value: bool, is_undone: bool) -> None:
        """Write an operation of the source, or what undoes it, on the new wires."""
        operation = self.source.operations[step]
        wires = []
        for wire in operation.wires:
            held = self.graph.held[step].get(wire)
            if held is None:
                if wire in self.renumbered:
                    wires.append(WireId(self.renumbered[wire]))
                continue
            number, place = held
            if number not in self.live:
                name = self.graph.values[number].name
                raise InternalError(f"step {step} reads '{name}', which is not there")
            wires.append(WireId(self.live[number][place]))
        name, params = operation.name, operation.params
        inverse, signature = operation.inverse, operation.signature
        if is_undone:
            name, params, inverse, signature = undone(
                operation.kind, name, params, inverse, signature
            )
        self.operations.append(
            replace(
                operation,
                index=len(self.operations),
                name=name,
                wires=tuple(wires),
                params=params,
                inverse=inverse,
                signature=signature,
                scope=-1,
                part=("cleanup" if is_undone else "compute") if is_value else "",
            )
        )

    def _drop(self, number: int, value: Value) -> None:
        if number in self.records:
            raise InternalError(f"'{value.name}' is dropped while a record is open")
        wires = self._holding(number)
        name = self._fresh("record")
        self.taken.add(name)
        self.bits.append((name, len(wires)))
        self.records[number] = [f"{name}[{k}]" for k in range(len(wires))]
        for wire, bit in zip(wires, self.records[number], strict=True):
            self._add("gate", "h", wire, value)
            self._add("measure", "measure", wire, value, bit=bit)
            if self.has_reset:
                self._add("reset", "reset", wire, value)
            else:
                self._add("gate", "x", wire, value, condition=bit)
        del self.live[number]

    def _add(
        self,
        kind: Literal["gate", "measure", "reset"],
        name: str,
        wire: int,
        value: Value,
        *,
        bit: str | None = None,
        condition: str | None = None,
    ) -> None:
        place = self.source.operations[value.steps[0]].place if value.steps else NOWHERE
        self.operations.append(
            Operation(
                len(self.operations),
                kind,
                name,
                (WireId(wire),),
                bit=bit,
                place=place,
                part="cleanup",
                condition=condition,
            )
        )

    def program(self, moves: tuple[Move, ...]) -> Program:
        """Return the finished program."""
        return replace(
            self.source,
            registers=tuple(self.registers),
            wire_names=tuple(self.names),
            operations=tuple(self.operations),
            scopes=(),
            bits=tuple(self.bits),
            register_of=tuple(
                number
                for number, register in enumerate(self.registers)
                for _ in range(register.width)
            ),
            moves=moves,
        )
