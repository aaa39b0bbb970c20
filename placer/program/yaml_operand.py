"""Names of wires and angles in program YAML.

An operand is `a`, `a[2]`, `a[0:3]` (both ends belong to it), or the same with a dot,
`a.2`, which needs no quotes inside of `[...]`.  `not a[2]` or `!a[2]` is a control that
acts on 0.  A list of operands is a YAML list, or one text with commas.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import NamedTuple

from placer.errors import Fault, InputError, Place, did_you_mean
from placer.program.expression import evaluate
from placer.program.tokens import Reader, read_expression
from placer.yamlnode import Node

_OPERAND = re.compile(
    r"(?P<zero>!|not[ ]+)?\s*(?P<name>[A-Za-z_]\w*)"
    r"(?:\[(?P<first>[0-9]{1,7})(?::(?P<last>[0-9]{1,7}))?\]"
    r"|\.(?P<dot>[0-9]{1,7})(?::(?P<stop>[0-9]{1,7}))?)?",
    re.ASCII,
)
NAME = re.compile(r"[A-Za-z_]\w{0,63}", re.ASCII)
RESERVED = frozenset({"all", "not"})
LARGEST_ANGLE = 1e15


class Operand(NamedTuple):
    """The wires of one operand; `on_zero` marks a control that acts on 0."""

    wires: tuple[int, ...]
    is_single: bool
    on_zero: bool
    place: Place


def operands(node: Node, names: Mapping[str, tuple[int, ...]]) -> list[Operand]:
    """Return the operands of a node: a list, or a text with commas.

    Raises
    ------
    InputError
        With every operand that is not understood or does not exist.
    """
    faults: list[Fault] = []
    pieces: list[tuple[Node, str]] = []
    for item in node.items if node.is_sequence else (node,):
        text = item.text(faults)
        if text is not None:
            pieces.extend((item, piece.strip()) for piece in text.split(","))
    result = []
    for item, piece in pieces:
        try:
            result.append(_operand(item.place, piece, names))
        except InputError as error:
            faults.extend(error.faults)
    if not pieces and not faults:
        node.fault(faults, "missing", f"{node.label} names no qubit")
    if faults:
        raise InputError(faults)
    return result


def _operand(place: Place, text: str, names: Mapping[str, tuple[int, ...]]) -> Operand:
    match = _OPERAND.fullmatch(text)
    if match is None:
        raise InputError.at(
            place,
            "operand",
            f"{text[:60]!r} is not the name of a qubit or a register",
            "write a, a[0] or a[0:3]; inside of [...] write a.0 or quotes",
        )
    name = match["name"]
    if name not in names:
        raise InputError.at(
            place,
            "undeclared",
            f"the register '{name}' is not declared",
            did_you_mean(name, sorted(names)),
        )
    wires = names[name]
    first = match["first"] or match["dot"]
    on_zero = match["zero"] is not None
    if first is None:
        return Operand(wires, len(wires) == 1, on_zero, place)
    last = match["last"] or match["stop"]
    low, high = int(first), int(last or first)
    if max(low, high) >= len(wires):
        raise InputError.at(
            place,
            "index",
            f"{name}[{max(low, high)}] does not exist: '{name}' has width {len(wires)}",
            f"use an index from 0 to {len(wires) - 1}",
        )
    if low > high:
        raise InputError.at(place, "bad-range", f"the range {low}:{high} is empty")
    return Operand(wires[low : high + 1], last is None, on_zero, place)


def angle(node: Node) -> float:
    """Return an angle in radians: a number, or a formula such as `-3*pi/8`.

    Raises
    ------
    InputError
        If it has no finite value.
    """
    faults: list[Fault] = []
    text = node.text(faults)
    if text is None:
        raise InputError(faults)
    try:
        reader = Reader(text, node.place.file)
        expression = read_expression(reader)
        token = reader.peek()
        if token.kind != "end":
            reader.fail(token, f"{token.text!r} is unexpected")
        value = evaluate(expression, _no_names, "yaml")
    except InputError as error:
        what = error.faults[0].what
        raise InputError.at(
            node.place,
            "angle",
            f"{node.shown} is not an angle: {what}",
            "write radians, such as 0.25 or pi/4",
        ) from error
    if abs(value) > LARGEST_ANGLE:
        raise InputError.at(node.place, "angle", f"the angle {node.shown} is too large")
    return float(value)


def _no_names(name: str, place: Place) -> float:
    raise InputError.at(place, "undeclared", f"'{name}' has no value")
