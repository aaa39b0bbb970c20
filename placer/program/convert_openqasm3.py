"""The tree of the reference parser to statements of `placer.program.syntax`.

What this version does not support becomes an `Unreadable` statement with a fault that
names the construct, so that one pass reports them all.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any, Literal, NoReturn

from openqasm3 import ast

from placer.errors import Fault, InputError, Place
from placer.program.syntax import (
    AliasDeclaration,
    Annotation,
    Barrier,
    BitDeclaration,
    ConstantDeclaration,
    Expression,
    GateCall,
    GateDefinition,
    Include,
    Index,
    Item,
    Loop,
    Measurement,
    Modifier,
    Operand,
    Pragma,
    QubitDeclaration,
    Reset,
    Several,
    Slice,
    Statement,
    Unreadable,
)
from placer.program.tokens import Places

Node = Any
"""A node of the reference parser, which has no type information of its own."""

# What is refused: type of node -> what it is called, what to do instead.
_PARTS = "plan the parts before and after it as programs of their own"
_CONSTANT = "use a const declaration with a value"
_REFUSED: dict[str, tuple[str, str]] = {
    "SubroutineDefinition": ("'def' subroutines are", "write a gate definition"),
    "WhileLoop": ("'while' loops are", "use a for loop over a constant range"),
    "BranchingStatement": ("'if' is", _PARTS),
    "SwitchStatement": ("'switch' is", _PARTS),
    "Box": ("'box' is", "write the statements without the box"),
    "DelayInstruction": ("'delay' is", "leave it out: the plan has times of its own"),
    "IODeclaration": ("'input' and 'output' are", _CONSTANT),
    "ExternDeclaration": ("'extern' functions are", _CONSTANT),
    "CalibrationGrammarDeclaration": ("'defcalgrammar' is", "leave it out"),
    "CalibrationStatement": ("'cal' blocks are", "leave it out"),
    "CalibrationDefinition": ("'defcal' is", "leave it out"),
    "ClassicalAssignment": ("assignments at run time are", _CONSTANT),
    "ReturnStatement": ("'return' is", "write a gate definition"),
    "BreakStatement": ("'break' is", "use a shorter range"),
    "ContinueStatement": ("'continue' is", "use a set of values"),
    "EndStatement": ("'end' is", "leave out what follows it"),
    "CompoundStatement": ("a block without a statement is", "leave out its braces"),
}
_TYPES: dict[str, Literal["int", "uint", "float", "angle", "bool"]] = {
    "IntType": "int",
    "UintType": "uint",
    "FloatType": "float",
    "AngleType": "angle",
    "BoolType": "bool",
}


def convert(tree: Node, text: str, places: Places) -> tuple[Statement, ...]:
    """Return the statements of a parsed program."""
    return _Converter(text, places).statements(tree.statements)


class _Converter:
    """Converts nodes; knows the text only to find the columns of names."""

    def __init__(self, text: str, places: Places) -> None:
        self.text = text
        self.places = places
        self.makers: dict[str, Callable[[Node], Statement]] = {
            "Include": self._include,
            "Pragma": self._pragma,
            "QubitDeclaration": self._qubits,
            "ConstantDeclaration": self._constant,
            "AliasStatement": self._alias,
            "QuantumGate": self._gate,
            "QuantumPhase": self._phase,
            "QuantumGateDefinition": self._definition,
            "QuantumMeasurementStatement": self._measurement,
            "QuantumReset": self._reset,
            "QuantumBarrier": self._barrier,
            "ForInLoop": self._loop,
            "ExpressionStatement": self._expression_statement,
        }

    def statements(self, nodes: Sequence[Node]) -> tuple[Statement, ...]:
        result: list[Statement] = []
        for node in nodes:
            try:
                if isinstance(node, ast.ClassicalDeclaration):
                    result.extend(self._classical(node))
                else:
                    result.append(self._statement(node))
            except InputError as error:
                names = _declared(node)
                result.append(Unreadable(names, error.faults, self.place(node)))
        return tuple(result)

    def _statement(self, node: Node) -> Statement:
        kind = type(node).__name__
        maker = self.makers.get(kind)
        if maker is None:
            what, help = _REFUSED.get(kind, (f"'{kind}' is", "leave it out"))
            self.refuse(node, f"{what} not supported", help)
        return maker(node)

    def place(self, node: Node) -> Place:
        """Return the place of a node."""
        span = node.span
        if span is None:
            return Place(self.places.file)
        if isinstance(node, ast.Identifier):
            # The parser gives single words their offset in place of the column.
            word, offset = node.name, span.start_column
            if self.text.startswith(word, offset):
                place = self.places.at(offset)
                if place.line == span.start_line:
                    return place
        return Place(self.places.file, span.start_line, span.start_column + 1)

    def notes(self, node: Node) -> tuple[Annotation, ...]:
        return tuple(
            Annotation(note.keyword, (note.command or "").strip(), self.place(note))
            for note in getattr(node, "annotations", ())
        )

    def refuse(self, node: Node, what: str, help: str = "") -> NoReturn:
        raise InputError([Fault(self.place(node), "unsupported", what, help)])

    def _include(self, node: Node) -> Statement:
        return Include(node.filename, self.place(node), self.notes(node))

    def _pragma(self, node: Node) -> Statement:
        text = f"pragma {(node.command or '').strip()}".strip()
        return Pragma(text, self.place(node))

    def _qubits(self, node: Node) -> Statement:
        size = None if node.size is None else self.expression(node.size)
        place = self.place(node.qubit)
        return QubitDeclaration(node.qubit.name, size, place, self.notes(node))

    def _classical(self, node: Node) -> list[Statement]:
        name, place, notes = node.identifier.name, self.place(node), self.notes(node)
        if not isinstance(node.type, ast.BitType):
            self.refuse(node, "variables of run time are not supported", _CONSTANT)
        size = None if node.type.size is None else self.expression(node.type.size)
        result: list[Statement] = [
            BitDeclaration(name, size, self.place(node.identifier), notes)
        ]
        value = node.init_expression
        if value is None:
            return result
        if not isinstance(value, ast.QuantumMeasurement):
            self.refuse(
                node,
                "a first value of classical bits is not supported",
                "declare the bits without a value",
            )
        target = Operand(name, (), place)
        return [*result, Measurement(self.operand(value.qubit), target, place)]

    def _constant(self, node: Node) -> Statement:
        kind = _TYPES.get(type(node.type).__name__)
        if kind is None:
            self.refuse(node, "constants of this type are not supported", "use float")
        size = getattr(node.type, "size", None)
        return ConstantDeclaration(
            node.identifier.name,
            kind,
            None if size is None else self.expression(size),
            self.expression(node.init_expression),
            self.place(node.identifier),
            self.notes(node),
        )

    def _alias(self, node: Node) -> Statement:
        parts: list[Operand] = []
        rest = node.value
        # Concatenations lean to the left.
        while isinstance(rest, ast.Concatenation):
            parts.append(self.operand(rest.rhs))
            rest = rest.lhs
        parts.append(self.operand(rest))
        name = node.target.name
        place = self.place(node.target)
        return AliasDeclaration(name, tuple(reversed(parts)), place, self.notes(node))

    def _gate(self, node: Node) -> Statement:
        if node.duration is not None:
            self.refuse(node, "a gate with a duration is not supported", "leave it out")
        if node.name.name == "nop":
            self.refuse(node, "'nop' is not supported", "leave it out")
        return GateCall(
            node.name.name,
            self._modifiers(node),
            tuple(self.expression(value) for value in node.arguments),
            tuple(self.operand(operand) for operand in node.qubits),
            self.place(node),
            self.notes(node),
        )

    def _phase(self, node: Node) -> Statement:
        return GateCall(
            "gphase",
            self._modifiers(node),
            (self.expression(node.argument),),
            tuple(self.operand(operand) for operand in node.qubits),
            self.place(node),
            self.notes(node),
        )

    def _modifiers(self, node: Node) -> tuple[Modifier, ...]:
        result = []
        for modifier in node.modifiers:
            count = modifier.argument
            value = None if count is None else self.expression(count)
            result.append(Modifier(modifier.modifier.name, value, self.place(modifier)))
        return tuple(result)

    def _definition(self, node: Node) -> Statement:
        return GateDefinition(
            node.name.name,
            tuple(name.name for name in node.arguments),
            tuple(name.name for name in node.qubits),
            self.statements(node.body),
            self.place(node.name),
            self.notes(node),
        )

    def _measurement(self, node: Node) -> Statement:
        target = None if node.target is None else self.operand(node.target)
        source = self.operand(node.measure.qubit)
        return Measurement(source, target, self.place(node), self.notes(node))

    def _reset(self, node: Node) -> Statement:
        return Reset(self.operand(node.qubits), self.place(node), self.notes(node))

    def _barrier(self, node: Node) -> Statement:
        operands = tuple(self.operand(operand) for operand in node.qubits)
        return Barrier(operands, self.place(node), self.notes(node))

    def _loop(self, node: Node) -> Statement:
        if type(node.type).__name__ not in ("IntType", "UintType"):
            self.refuse(node, "a loop over this type is not supported", "use int")
        over = node.set_declaration
        if isinstance(over, ast.RangeDefinition):
            values: Slice | Several = self._slice(over)
        elif isinstance(over, ast.DiscreteSet):
            values = self._several(over)
        else:
            self.refuse(
                node,
                "a loop over a value is not supported",
                "loop over a range [first:last] or a set {0, 2}",
            )
        body = self.statements(node.block)
        name = node.identifier.name
        return Loop(name, values, body, self.place(node), self.notes(node))

    def _expression_statement(self, node: Node) -> Statement:
        inner = node.expression
        if isinstance(inner, ast.Identifier) and inner.name == "nop":
            self.refuse(node, "'nop' is not supported", "leave it out")
        if isinstance(inner, ast.FunctionCall):
            what = f"the call of subroutine '{inner.name.name}' is not supported"
            self.refuse(node, what, "write a gate definition and call the gate")
        self.refuse(node, "a bare expression is not supported", "leave it out")

    def operand(self, node: Node) -> Operand:
        """Return a register with its indices."""
        place = self.place(node)
        if isinstance(node, ast.Identifier):
            return Operand(node.name, (), place)
        if isinstance(node, ast.IndexedIdentifier):
            indices = tuple(self._index(index) for index in node.indices)
            return Operand(node.name.name, indices, place)
        if not isinstance(node, ast.IndexExpression):
            what = "this is not a register or a part of one"
            self.refuse(node, what, "name a register")
        inner = self.operand(node.collection)
        indices = (*inner.indices, self._index(node.index))
        return Operand(inner.name, indices, inner.place)

    def _index(self, node: Node) -> Index:
        if isinstance(node, ast.DiscreteSet):
            return self._several(node)
        if len(node) != 1:
            self.refuse(node[0], "an index of several dimensions is not supported")
        if isinstance(node[0], ast.RangeDefinition):
            return self._slice(node[0])
        return self.expression(node[0])

    def _slice(self, node: Node) -> Slice:
        start, step, stop = (
            None if part is None else self.expression(part)
            for part in (node.start, node.step, node.end)
        )
        return Slice(start, step, stop, self.place(node))

    def _several(self, node: Node) -> Several:
        members = tuple(self.expression(value) for value in node.values)
        return Several(members, self.place(node))

    def expression(self, node: Node) -> Expression:
        """Return an expression in postfix order."""
        items: list[Item] = []
        self._collect(node, items)
        return tuple(items)

    def _collect(self, node: Node, items: list[Item]) -> None:
        place = self.place(node)
        if isinstance(node, ast.IntegerLiteral | ast.FloatLiteral | ast.BooleanLiteral):
            value = int(node.value) if isinstance(node.value, bool) else node.value
            items.append(Item("number", "", value, 0, place))
        elif isinstance(node, ast.Identifier):
            items.append(Item("name", node.name, 0, 0, place))
        elif isinstance(node, ast.UnaryExpression):
            self._collect(node.expression, items)
            items.append(Item("unary", node.op.name, 0, 1, place))
        elif isinstance(node, ast.BinaryExpression):
            self._collect(node.lhs, items)
            self._collect(node.rhs, items)
            items.append(Item("binary", node.op.name, 0, 2, place))
        elif isinstance(node, ast.FunctionCall):
            for argument in node.arguments:
                self._collect(argument, items)
            count = len(node.arguments)
            items.append(Item("call", node.name.name, 0, count, place))
        elif isinstance(node, ast.Cast) and type(node.type).__name__ in _TYPES:
            self._collect(node.argument, items)
            word = _TYPES[type(node.type).__name__]
            items.append(Item("call", word, 0, 1, place))
        else:
            kind = type(node).__name__
            self.refuse(node, f"'{kind}' in an expression is not supported")


def _declared(node: Node) -> tuple[str, ...]:
    """Return the names that a refused statement would have declared."""
    for attribute in ("identifier", "name", "target", "qubit"):
        name = getattr(node, attribute, None)
        if isinstance(name, ast.Identifier) and not isinstance(node, ast.QuantumGate):
            return (name.name,)
    return ()
