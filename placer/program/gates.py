"""Gates by name: the tables, gates of the user's own, and modifiers.

A definition is checked once, when it is declared; its terms are worked out for each
list of parameters that occurs.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

from placer.errors import Fault, InputError, Place, did_you_mean
from placer.program.annotation import foreign, refuse_own
from placer.program.gatetable import ALWAYS, FIXED, GATES, GLOBAL_PHASE, BuiltIn
from placer.program.loops import loop_values
from placer.program.lowering import Raw, lower
from placer.program.modifiers import Change, changed, changes_of, limit
from placer.program.names import Broken, Constant, Entity, Names, Silent
from placer.program.syntax import (
    Barrier,
    GateCall,
    GateDefinition,
    Loop,
    Statement,
    Unreadable,
)
from placer.program.terms import Term, Terms, moved

DEEPEST_GATE = 150
_CU3 = (
    "cu3 was read as in newer versions of qelib1.inc, where the upper left corner of "
    "the controlled matrix is real"
)


@dataclass(frozen=True, slots=True)
class OwnGate:
    """A gate of the user's own; `depth` counts definitions that call each other."""

    number: int
    depth: int
    definition: GateDefinition

    @property
    def params(self) -> int:
        """How many parameters it takes."""
        return len(self.definition.params)

    @property
    def wires(self) -> int:
        """How many wires it acts on."""
        return len(self.definition.wires)


@dataclass(slots=True)
class Gates:
    """The gates in sight; `names` holds the constants that bodies may use.

    `used` are gates of the table that were called: they cannot change their meaning.
    """

    names: Names
    has_library: bool = False
    own: dict[str, OwnGate | None] = field(default_factory=dict)
    notes: list[str] = field(default_factory=list)
    used: set[str] = field(default_factory=set)
    count: int = 0
    _terms: dict[tuple[int, tuple[float, ...]], Terms] = field(default_factory=dict)
    _raws: dict[tuple[object, ...], tuple[Raw, ...]] = field(default_factory=dict)

    def find(self, name: str, place: Place) -> BuiltIn | OwnGate:
        """Return the gate of a name."""
        if name in self.own:
            gate = self.own[name]
            if gate is None:
                raise Silent
            return gate
        if name == "gphase" and self.names.dialect == "openqasm3":
            return GLOBAL_PHASE
        if name in ALWAYS:
            return ALWAYS[name]
        if self.has_library and name in GATES:
            self.used.add(name)
            if name == "cu3" and _CU3 not in self.notes:
                self.notes.append(_CU3)
            return GATES[name]
        self.own[name] = None
        is_v2 = self.names.dialect == "openqasm2"
        library = "qelib1.inc" if is_v2 else "stdgates.inc"
        if name in GATES:
            help = f'add include "{library}"; at the top'
        else:
            known = [word for word in self.own if word != name]
            help = did_you_mean(name, sorted([*known, *ALWAYS, *GATES]))
        raise InputError.at(
            place, "undeclared", f"the gate '{name}' is not declared", help
        )

    def declare(self, definition: GateDefinition) -> None:
        """Add a gate of the user's own, after a check of its body."""
        name, place = definition.name, definition.place
        if name in self.own and self.own[name] is not None:
            gate = self.own[name]
            line = gate.definition.place.line if gate is not None else 0
            raise InputError.at(
                place,
                "declared-twice",
                f"the gate '{name}' is declared already, in line {line}",
            )
        is_fixed = self.has_library and name in FIXED[self.names.dialect]
        is_fixed = is_fixed or name in ALWAYS or name in self.used
        if is_fixed or name == "gphase":
            raise InputError.at(
                place,
                "declared-twice",
                f"the gate '{name}' is one of the standard gates already",
                "choose another name, or leave the definition out",
            )
        faults = list(self._faults(definition))
        # Even a wrong gate is declared, so that its calls are not reported as well.
        self.own[name] = None
        if faults:
            raise InputError(faults)
        self.count += 1
        self.own[name] = OwnGate(self.count, self._depth(definition), definition)

    def _depth(self, definition: GateDefinition) -> int:
        """Return how deep definitions are nested below one, itself included."""
        depth = 1
        for call in _calls(definition.body):
            gate = self.own.get(call.name)
            if gate is not None:
                depth = max(depth, gate.depth + 1)
        if depth > DEEPEST_GATE:
            raise InputError.at(
                definition.place,
                "too-deep",
                f"the gate '{definition.name}' nests more than {DEEPEST_GATE} "
                "definitions",
            )
        return depth

    def check_call(
        self, call: GateCall, gate: BuiltIn | OwnGate, changes: Sequence[Change]
    ) -> None:
        """Check the numbers of parameters and operands of a call."""
        if len(call.params) != gate.params:
            raise InputError.at(
                call.place,
                "parameter-count",
                f"the gate '{call.name}' takes {_counted(gate.params, 'parameter')}, "
                f"found {len(call.params)}",
            )
        added = sum(count for kind, count in changes if kind in ("ctrl", "negctrl"))
        if len(call.operands) != gate.wires + added:
            width = _counted(gate.wires, "qubit")
            controls = f" and {_counted(added, 'control')}" if added else ""
            raise InputError.at(
                call.place,
                "operand-count",
                f"the gate '{call.name}' acts on {width}{controls}, "
                f"found {_counted(len(call.operands), 'operand')}",
            )

    def values(self, call: GateCall) -> tuple[float, ...]:
        """Return the parameters of a call."""
        result = []
        for expression in call.params:
            value = self.names.value(expression)
            if abs(value) > 1e15:
                raise InputError.at(
                    expression[-1].place,
                    "no-value",
                    f"the angle {float(min(max(value, -1e300), 1e300)):g} is too large",
                )
            result.append(float(value))
        return tuple(result)

    def operations(self, call: GateCall) -> tuple[Raw, ...]:
        """Return the operations of a call on local wires."""
        gate = self.find(call.name, call.place)
        changes = changes_of(self.names, call.modifiers, self.notes)
        self.check_call(call, gate, changes)
        values = self.values(call)
        key = (call.name, values, changes)
        if key not in self._raws:
            terms = changed(self._terms_of(gate, values, call), changes, call)
            self._raws[key] = lower(terms)
        return self._raws[key]

    def _terms_of(
        self, gate: BuiltIn | OwnGate, values: tuple[float, ...], call: GateCall
    ) -> Terms:
        if isinstance(gate, BuiltIn):
            return gate.terms(values)
        key = (gate.number, values)
        if key not in self._terms:
            definition = gate.definition
            saved = self.names.blocks
            # A body sees its own parameters and what is global.
            arguments: dict[str, tuple[Entity, Place]] = {
                name: (Constant(value), definition.place)
                for name, value in zip(definition.params, values, strict=True)
            }
            self.names.blocks = [saved[0], arguments]
            wires = {name: number for number, name in enumerate(definition.wires)}
            terms: list[Term] = []
            try:
                self._body(definition.body, wires, terms, call)
            finally:
                self.names.blocks = saved
            self._terms[key] = tuple(terms)
        return self._terms[key]

    def _body(
        self,
        body: Sequence[Statement],
        wires: dict[str, int],
        terms: list[Term],
        outer: GateCall,
    ) -> None:
        """Add the terms of the statements of a body.

        A barrier only orders, and is left out inside of gates.
        """
        for statement in body:
            if isinstance(statement, GateCall):
                gate = self.find(statement.name, statement.place)
                changes = changes_of(self.names, statement.modifiers, self.notes)
                self.check_call(statement, gate, changes)
                inner = self._terms_of(gate, self.values(statement), statement)
                inner = changed(inner, changes, statement)
                operands = [wires[operand.name] for operand in statement.operands]
                limit(len(terms) + len(inner), outer)
                terms.extend(moved(inner, operands))
            elif isinstance(statement, Loop):
                for value in loop_values(self.names, statement):
                    constant = Constant(value)
                    block: dict[str, tuple[Entity, Place]] = {
                        statement.variable: (constant, statement.place)
                    }
                    self.names.blocks.append(block)
                    try:
                        self._body(statement.body, wires, terms, outer)
                    finally:
                        self.names.blocks.pop()

    def _faults(self, definition: GateDefinition) -> Iterator[Fault]:
        """Find what is wrong with a definition before anybody calls it."""
        seen: set[str] = set()
        for name in (*definition.params, *definition.wires):
            if name in seen:
                yield Fault(
                    definition.place,
                    "declared-twice",
                    f"'{name}' stands twice among the arguments of '{definition.name}'",
                )
            seen.add(name)
        yield from self._body_faults(
            definition.body, definition, frozenset(definition.params)
        )

    def _body_faults(
        self,
        body: Sequence[Statement],
        definition: GateDefinition,
        values: frozenset[str],
    ) -> Iterator[Fault]:
        for statement in body:
            yield from self._note_faults(statement)
            if isinstance(statement, Unreadable):
                yield from statement.faults
            elif isinstance(statement, GateCall):
                yield from self._call_faults(statement, definition, values)
            elif isinstance(statement, Loop):
                inner = values | {statement.variable}
                yield from self._body_faults(statement.body, definition, inner)
            elif not isinstance(statement, Barrier):
                kind = type(statement).__name__
                yield Fault(
                    statement.place,
                    "gate-body",
                    f"{kind} cannot stand in the body of gate '{definition.name}'",
                )
            if isinstance(statement, GateCall | Barrier):
                yield from _operand_faults(statement, definition)

    def _note_faults(self, statement: Statement) -> Iterator[Fault]:
        """Refuse annotations of ours in a body; say that others are left out."""
        try:
            refuse_own(statement.annotations)
        except InputError as error:
            yield from error.faults
        self.notes.extend(
            f"the annotation '{note}' in the body of a gate is not handed on"
            for note in foreign(statement.annotations)
        )

    def _call_faults(
        self, call: GateCall, definition: GateDefinition, values: frozenset[str]
    ) -> Iterator[Fault]:
        if call.name == definition.name:
            yield Fault(call.place, "recursion", f"the gate '{call.name}' calls itself")
            return
        # Parameters have no value yet; what depends on them is judged at each call.
        self.names.blocks.append({name: (Broken(), call.place) for name in values})
        try:
            gate = self.find(call.name, call.place)
            for expression in call.params:
                for item in expression:
                    if item.kind == "name" and item.word not in values:
                        self.names.value((item,))
            self.check_call(
                call, gate, changes_of(self.names, call.modifiers, self.notes)
            )
        except InputError as error:
            yield from error.faults
        finally:
            self.names.blocks.pop()


def _operand_faults(
    statement: GateCall | Barrier, definition: GateDefinition
) -> Iterator[Fault]:
    seen: set[str] = set()
    for operand in statement.operands:
        name = operand.name
        if name.startswith("$"):
            what = f"the physical qubit '{name}' cannot stand in a gate body"
            yield Fault(operand.place, "gate-body", what)
        elif name not in definition.wires:
            yield Fault(
                operand.place,
                "undeclared",
                f"'{name}' is no argument of gate '{definition.name}'",
                did_you_mean(name, definition.wires),
            )
        elif operand.indices:
            what = f"the argument '{name}' of a gate takes no index"
            yield Fault(operand.place, "index", what)
        elif name in seen:
            what = f"'{name}' stands twice in one statement"
            yield Fault(operand.place, "same-qubit", what)
        seen.add(name)


def _counted(count: int, word: str) -> str:
    return f"{count} {word}" if count == 1 else f"{count} {word}s"


def _calls(body: Sequence[Statement]) -> Iterator[GateCall]:
    """Yield the gate calls of a body, loops included."""
    for statement in body:
        if isinstance(statement, GateCall):
            yield statement
        elif isinstance(statement, Loop):
            yield from _calls(statement.body)
