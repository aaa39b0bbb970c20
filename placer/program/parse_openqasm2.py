"""OpenQASM 2 text to statements, by a small parser of our own.

OpenQASM 2 has fewer keywords than OpenQASM 3, so that its files cannot go through a
parser of version 3.  After a fault the parser goes on at the next statement.  Comments
of the form `// @placer.name key=value` on a line of their own count as annotations.
"""

from __future__ import annotations

import re
from collections.abc import Callable

from placer.errors import Fault, InputError
from placer.program.syntax import (
    Annotation,
    Barrier,
    BitDeclaration,
    Expression,
    GateCall,
    GateDefinition,
    Include,
    Item,
    Measurement,
    Operand,
    Parsed,
    QubitDeclaration,
    Reset,
    Statement,
    Unreadable,
)
from placer.program.tokens import Reader, Token, number, read_expression, shown

MOST_FAULTS = 200

Annotations = tuple[Annotation, ...]
KEYWORDS = frozenset(
    [
        "OPENQASM",
        "include",
        "qreg",
        "creg",
        "gate",
        "opaque",
        "measure",
        "reset",
        "barrier",
        "if",
    ]
)
_NOT_IN_2 = {
    "ctrl": "gate modifiers",
    "negctrl": "gate modifiers",
    "inv": "gate modifiers",
    "pow": "gate modifiers",
    "qubit": "word 'qubit'",
    "bit": "word 'bit'",
    "let": "aliases",
    "const": "constants",
    "for": "loops",
    "def": "subroutines",
}
# The plain case of a gate call, read in one step: name, numbers, operands.
_OPERAND = r"[a-z]\w*[ \t]*(?:\[[0-9]{1,9}\])?"
_SIMPLE = re.compile(
    rf"\s*([A-Za-z]\w*)[ \t]+({_OPERAND}[ \t]*(?:,[ \t]*{_OPERAND}[ \t]*)*);"
)


def parse_openqasm2(text: str, file: str) -> Parsed:
    """Return the statements of an OpenQASM 2 text.

    Raises
    ------
    InputError
        With every syntax fault found.
    """
    reader = Reader(text, file)
    faults: list[Fault] = []
    statements: list[Statement] = []
    faults.extend(_version_faults(reader))
    while len(faults) < MOST_FAULTS:
        statement = _simple(reader)
        if statement is not None:
            statements.append(statement)
            continue
        before = reader.position
        try:
            if reader.peek().kind == "end":
                break
            statements.append(_statement(reader, len(statements)))
            faults.extend(_notes_inside(reader))
        except InputError as error:
            faults.extend(error.faults)
            reader.notes.clear()
            # A fault at the end of a statement must not swallow the next one.
            read = text[before : reader.position]
            depth = read.count("{") - read.count("}")
            if depth > 0 or not read.rstrip().endswith((";", "}")):
                reader.skip_statement(depth)
    faults.extend(
        Fault(note.place, "annotation-place", f"'@{note.name}' has no statement")
        for note in reader.notes
    )
    if faults:
        raise InputError(faults)
    return Parsed("openqasm2", tuple(statements))


def _version_faults(reader: Reader) -> tuple[Fault, ...]:
    """Step over the version, which the caller has judged already."""
    try:
        if reader.peek().text == "OPENQASM":
            reader.take()
            reader.take()
            if not reader.accept(";"):
                found = shown(reader.peek())
                what = f"expected ';' after the version, found {found}"
                reader.fail(reader.peek(), what)
    except InputError as error:
        # A letter out of place is reported again by the statement it stands in.
        return tuple(fault for fault in error.faults if fault.code == "syntax")
    return ()


def _notes_inside(reader: Reader) -> list[Fault]:
    """Refuse annotations that were found in the middle of a statement."""
    faults = [
        Fault(
            note.place,
            "annotation-place",
            f"'@{note.name}' stands inside of a statement",
            "move it to the line before the statement it belongs to",
        )
        for note in reader.notes
    ]
    reader.notes.clear()
    return faults


def _simple(reader: Reader) -> GateCall | None:
    """Take a gate call without parameters and comments, or nothing."""
    match = _SIMPLE.match(reader.text, reader.position)
    if match is None or match[1] in KEYWORDS or match[1] in _NOT_IN_2 or reader.notes:
        return None
    operands = []
    offset = match.start(2)
    for part in match[2].split(","):
        name, bracket, index = part.partition("[")
        place = reader.places.at(offset + len(part) - len(part.lstrip()))
        offset += len(part) + 1
        indices: tuple[Expression, ...] = ()
        if bracket:
            value = int(index.strip()[:-1])
            indices = ((Item("number", "", value, 0, place),),)
        operands.append(Operand(name.strip(), indices, place))
    reader.jump(match.end())
    place = reader.places.at(match.start(1))
    return GateCall(match[1], (), (), tuple(operands), place)


def _statement(reader: Reader, count: int) -> Statement:
    token = reader.peek()
    # Annotations were noted while the token was looked for.
    notes = tuple(reader.notes)
    reader.notes.clear()
    if token.kind != "name":
        reader.fail(token, f"expected a statement, found {shown(token)}")
    if token.text in _NOT_IN_2 and token.text not in reader.gates:
        reader.fail(
            token,
            f"OpenQASM 2 has no {_NOT_IN_2[token.text]}",
            "declare 'OPENQASM 3;' in the first line",
            code="wrong-version",
        )
    if token.text == "OPENQASM":
        reader.fail(
            token,
            "the version must be the first statement, and stand once"
            if count
            else "the version must be written 'OPENQASM 2.0;'",
        )
    return _PARSERS.get(token.text, _gate_call)(reader, notes)


def _include(reader: Reader, notes: Annotations) -> Statement:
    place = reader.place(reader.take())
    token = reader.take()
    if token.kind != "text":
        reader.fail(token, f"expected a file name in quotes, found {shown(token)}")
    _semicolon(reader, "the include")
    return Include(token.text[1:-1], place, notes)


def _register(reader: Reader, notes: Annotations) -> Statement:
    word = reader.take()
    name = _identifier(reader, "the name of a register")
    if reader.peek().text != "[":
        reader.fail(
            reader.peek(),
            f"register '{name.text}' has no size",
            f"write {word.text} {name.text}[1];",
        )
    reader.take()
    size = read_expression(reader)
    reader.expect("]", "after the size")
    _semicolon(reader, "the declaration")
    make = QubitDeclaration if word.text == "qreg" else BitDeclaration
    return make(name.text, size, reader.place(name), notes)


def _gate_definition(reader: Reader, notes: Annotations) -> Statement:
    reader.take()
    name = _identifier(reader, "the name of a gate")
    reader.gates.add(name.text)
    params: list[str] = []
    if reader.accept("(") and not reader.accept(")"):
        params = _names(reader, "the name of a parameter")
        reader.expect(")", "after the parameters")
    wires = _names(reader, "the name of a qubit")
    reader.expect("{", "before the body of the gate")
    body: list[Statement] = []
    while not reader.accept("}"):
        token = reader.peek()
        if token.text == "barrier":
            body.append(_barrier(reader, ()))
            continue
        if token.kind == "end":
            reader.expect("}", f"after the body of gate '{name.text}'")
        if token.kind != "name" or token.text in KEYWORDS:
            reader.fail(token, f"{shown(token)} cannot stand in the body of a gate")
        body.append(_gate_call(reader, ()))
    return GateDefinition(
        name.text, tuple(params), tuple(wires), tuple(body), reader.place(name), notes
    )


def _names(reader: Reader, what: str) -> list[str]:
    names = [_identifier(reader, what).text]
    while reader.accept(","):
        names.append(_identifier(reader, what).text)
    return names


def _gate_call(reader: Reader, notes: Annotations) -> Statement:
    name = reader.take()
    place = reader.place(name)
    if reader.peek().text == "@":
        reader.fail(name, "OpenQASM 2 has no gate modifiers", code="wrong-version")
    params: list[Expression] = []
    if reader.accept("(") and not reader.accept(")"):
        params.append(read_expression(reader))
        while reader.accept(","):
            params.append(read_expression(reader))
        reader.expect(")", "after the parameters")
    operands = _operands(reader)
    _semicolon(reader, f"the call of '{name.text}'")
    return GateCall(name.text, (), tuple(params), operands, place, notes)


def _measure(reader: Reader, notes: Annotations) -> Statement:
    place = reader.place(reader.take())
    source = _operand(reader)
    reader.expect("->", "after the measured qubits")
    target = _operand(reader)
    _semicolon(reader, "the measurement")
    return Measurement(source, target, place, notes)


def _reset(reader: Reader, notes: Annotations) -> Statement:
    place = reader.place(reader.take())
    operand = _operand(reader)
    _semicolon(reader, "the reset")
    return Reset(operand, place, notes)


def _barrier(reader: Reader, notes: Annotations) -> Statement:
    place = reader.place(reader.take())
    operands = () if reader.peek().text == ";" else _operands(reader)
    _semicolon(reader, "the barrier")
    return Barrier(operands, place, notes)


def _opaque(reader: Reader, _: Annotations) -> Statement:
    word = reader.take()
    name = reader.name("the name of a gate")
    reader.skip_statement()
    fault = Fault(
        reader.place(word),
        "unsupported",
        f"'opaque' gates are not supported, found '{name.text}'",
        "declare the gate or mark it as a black box",
    )
    return Unreadable((name.text,), (fault,), fault.place)


def _if(reader: Reader, _: Annotations) -> Statement:
    word = reader.take()
    reader.skip_statement()
    fault = Fault(
        reader.place(word),
        "unsupported",
        "'if' is not supported",
        "plan the parts before and after it as programs of their own",
    )
    return Unreadable((), (fault,), fault.place)


def _operands(reader: Reader) -> tuple[Operand, ...]:
    operands = [_operand(reader)]
    while reader.accept(","):
        operands.append(_operand(reader))
    return tuple(operands)


def _operand(reader: Reader) -> Operand:
    name = reader.take()
    place = reader.place(name)
    if name.kind not in ("name", "pin"):
        reader.fail(name, f"expected a register or a qubit, found {shown(name)}")
    if not reader.accept("["):
        return Operand(name.text, (), place)
    token = reader.take()
    if token.kind != "number" or not token.text.isdigit():
        reader.fail(token, f"expected a whole number as index, found {shown(token)}")
    index = Item("number", "", number(token, reader), 0, reader.place(token))
    reader.expect("]", "after the index")
    return Operand(name.text, ((index,),), place)


def _identifier(reader: Reader, what: str) -> Token:
    token = reader.name(what)
    if token.text in KEYWORDS or token.text == "pi":
        reader.fail(
            token,
            f"'{token.text}' is a word of the language, not {what}",
            "choose another name",
            code="keyword",
        )
    return token


def _semicolon(reader: Reader, after: str) -> None:
    reader.expect(";", f"after {after}")


_PARSERS: dict[str, Callable[[Reader, Annotations], Statement]] = {
    "include": _include,
    "qreg": _register,
    "creg": _register,
    "gate": _gate_definition,
    "measure": _measure,
    "reset": _reset,
    "barrier": _barrier,
    "opaque": _opaque,
    "if": _if,
}
