"""Computing and cleaning up of values: do a plan's moves leave the program as it was?

In: the program as written, its values, and the moves of a plan.  Out: findings.  The
moves are followed one by one: what is read must be there, what is cleaned up must be
cleaned up from what it was computed from, every record must be closed.  Then the
program as written and the program as planned run on the same random bits, outcomes of
measurements included, and must end alike, phases of the records included.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from placer.check.replay import (
    ALL_ON,
    FREE,
    MOST_FINDINGS,
    counting_bits,
    meaning,
    random_bits,
)
from placer.errors import InternalError
from placer.program.planned import planned_program
from placer.program.values import values_of

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.device.model import Device
    from placer.program.model import Operation, Program
    from placer.program.values import ValueGraph

Find = Callable[[str, str, str], None]
SEED = 4099


def follow_moves(
    program: Program, moves: Sequence[Sequence[str | int]], device: Device, find: Find
) -> Program | None:
    """Return the program as planned, or `None` if its moves are wrong."""
    graph = values_of(program)
    if not _Walk(program, graph, find).follow(moves):
        return None
    try:
        planned = planned_program(program, moves, device)
    except InternalError as error:
        find("cleanup-unreadable", "cleanup", str(error))
        return None
    return planned if _Twins(program, graph, planned, find).agree() else None


@dataclass(slots=True)
class _Walk:
    """The moves one by one: which values are there, which records are open."""

    program: Program
    graph: ValueGraph
    find: Find
    live: set[int] = field(default_factory=set)
    open: dict[int, int] = field(default_factory=dict)
    passed: int = 0
    found: int = 0

    def _say(self, rule: str, number: int, what: str) -> None:
        self.found += 1
        if self.found <= MOST_FINDINGS:
            self.find(rule, f"cleanup, move {number}", what)

    def follow(self, moves: Sequence[Sequence[str | int]]) -> bool:
        """Whether every move can be made, and all is gone at the end."""
        for number, (action, what) in enumerate(moves):
            rows = self.graph.uses if action == "use" else self.graph.values
            if not 0 <= int(what) < len(rows):
                text = f"'{action}' of {what}, there are {len(rows)}"
                self._say("cleanup-unreadable", number, text)
                return False
            if action == "use":
                self._use(number, int(what))
            else:
                self._change(number, str(action), int(what))
        end = len(moves)
        if self.passed != len(self.graph.uses):
            text = f"{self.passed} of {len(self.graph.uses)} uses are made"
            self._say("cleanup-unreadable", end, text)
        for value in sorted(self.live):
            self._say("value-left", end, f"{self._name(value)} is never cleaned up")
        for value, since in sorted(self.open.items()):
            text = f"{self._name(value)} is measured by move {since} and never fixed"
            self._say("record-open", end, text)
        return not self.found

    def _name(self, number: int) -> str:
        value = self.graph.values[number]
        return f"'{value.name}' (line {value.line})"

    def _line(self, use: int) -> int:
        return self.program.operations[self.graph.uses[use].steps[0]].place.line

    def _use(self, number: int, use: int) -> None:
        if use != self.passed:
            text = f"use {use} comes where use {self.passed} belongs"
            self._say("cleanup-unreadable", number, text)
        self.passed += 1
        for value in self.graph.uses[use].needs:
            if value not in self.live:
                text = f"line {self._line(use)} reads {self._name(value)}, "
                self._say("value-read-dead", number, f"{text}which is not there")

    def _change(self, number: int, action: str, value: int) -> None:
        is_new = action == "compute"
        if (value in self.live) == is_new:
            there = "there already" if is_new else "not there"
            text = f"'{action}' of {self._name(value)}, which is {there}"
            self._say("cleanup-unreadable", number, text)
            return
        if action == "drop":
            if value in self.open or not self.graph.values[value].is_plain:
                text = f"{self._name(value)} cannot be measured away here"
                self._say("cleanup-unreadable", number, text)
            self.open[value] = number
        else:
            self._inputs(number, action, value)
            self.open.pop(value, None)
        self.live ^= {value}

    def _inputs(self, number: int, action: str, value: int) -> None:
        row = self.graph.values[value]
        for needed in row.inputs:
            if needed not in self.live:
                text = f"'{action}' of {self._name(value)} reads {self._name(needed)}, "
                self._say("value-read-dead", number, f"{text}which is not there")
        first, last = row.window
        if not first <= self.passed <= last:
            use = first - 1 if self.passed < first else last
            when = "before" if self.passed < first else "after"
            text = f"'{action}' of {self._name(value)} comes {when} line "
            text += f"{self._line(use)}, which changes what it is computed from"
            self._say("cleanup-input-changed", number, text)


class _Twins:
    """The program as written and as planned, run on the same bits."""

    def __init__(
        self, program: Program, graph: ValueGraph, planned: Program, find: Find
    ) -> None:
        self.program = program
        self.planned = planned
        self.find = find
        self.uses = [step for use in graph.uses for step in use.steps]
        self.found = 0

    def _say(self, where: str, what: str) -> None:
        self.found += 1
        if self.found <= MOST_FINDINGS:
            self.find("cleanup-differs", where, what)

    def agree(self) -> bool:
        """Whether uses get and give the same bits and nothing is left at the end."""
        before, ends = self._written()
        self._planned(before, ends)
        return not self.found

    def _start(self, program: Program) -> list[int]:
        """Return the bits of all wires at the start; wires of one name start alike."""
        bits = [0] * len(program.wire_names)
        open_wires = [
            w
            for w in range(len(bits))
            if program.register_at(w).start == "unknown"
            and not program.register_at(w).workspace
        ]
        for place, wire in enumerate(open_wires):
            few = len(open_wires) <= FREE
            name = program.wire_names[wire]
            bits[wire] = (
                counting_bits(place) if few else random_bits(SEED, "input", name)
            )
        return bits

    def _written(self) -> tuple[dict[int, list[list[int]]], dict[str, int]]:
        bits = self._start(self.program)
        outcomes: dict[str, int] = {}
        wanted = set(self.uses)
        seen: dict[int, list[list[int]]] = {}
        for op in self.program.operations:
            got = [bits[w] for w in op.wires]
            gave = list(got)
            meaning(op, gave, SEED, outcomes)
            if op.index in wanted:
                seen[op.index] = [got, gave]
            for wire, value in zip(op.wires, gave, strict=True):
                bits[wire] = value
        return seen, dict(zip(self.program.wire_names, bits, strict=True))

    def _planned(self, seen: dict[int, list[list[int]]], ends: dict[str, int]) -> None:
        bits = self._start(self.planned)
        outcomes: dict[str, int] = {}
        held: dict[int, int] = {}
        uses = iter(self.uses)
        phase = 0
        for op in self.planned.operations:
            got = [bits[w] for w in op.wires]
            gave = list(got)
            if op.part == "":
                source = next(uses)
                self._twin(op, source, got, seen[source][0])
                gave = self._given(op, got, seen[source])
                if op.bit is not None:
                    outcomes[op.bit] = gave[0]
            else:
                meaning(op, gave, SEED, outcomes)
                phase ^= _phase(op, got, gave, outcomes, held)
            for wire, value in zip(op.wires, gave, strict=True):
                bits[wire] = value
        if phase:
            self._say("cleanup", "the records leave a phase that depends on a value")
        for number, name in enumerate(self.planned.wire_names):
            if self.planned.register_at(number).workspace:
                if bits[number]:
                    self._say(f"wire {name}", "it does not end in |0>")
            elif bits[number] != ends.get(name):
                self._say(f"wire {name}", "it ends with other values")

    def _twin(
        self, op: Operation, source: int, got: list[int], wanted: list[int]
    ) -> None:
        if op.kind != "barrier" and got != wanted:
            line = self.program.operations[source].place.line
            self._say(f"step {op.index} at line {line}", "it gets other values")

    def _given(self, op: Operation, got: list[int], seen: list[list[int]]) -> list[int]:
        return got if op.kind == "barrier" else list(seen[1])


def _phase(
    op: Operation,
    got: list[int],
    gave: list[int],
    outcomes: dict[str, int],
    held: dict[int, int],
) -> int:
    """Return where an operation of a record or its fix turns the sign.

    Measured in the X basis with outcome 1, a wire in state v leaves the sign (-1)^v.
    """
    if op.name == "h":
        held[op.wires[0]] = got[0]
    elif op.kind == "measure":
        return gave[0] & held.pop(op.wires[0], 0)
    elif op.kind == "reset":
        # Turned and reset unmeasured: a phase that nobody has written down.
        return held.pop(op.wires[0], 0)
    elif op.name == "z" and op.condition is not None:
        return outcomes.get(op.condition, 0) & got[0] & ALL_ON
    return 0
