"""The fast way through flat files: one statement after the other, by patterns.

Reads declarations, gate calls on single qubits, measurements, resets and barriers in
OpenQASM 2 and 3, and makes the same draft as the full readers do.  At the first thing
that it does not know, or that looks wrong, it gives up: the full reader then says what
it is, or what is wrong with it.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass, field
from functools import lru_cache
from typing import TYPE_CHECKING

from placer.errors import Place
from placer.program.draft import Draft, Step
from placer.program.gatetable import ALWAYS, GATES, INCLUDE_FILES
from placer.program.loops import MOST_OPERATIONS
from placer.program.lowering import Raw, lower

if TYPE_CHECKING:
    from placer.program.model import Start

_NAME = r"[A-Za-z_][A-Za-z0-9_]*"
_QUBIT = rf"{_NAME}\[\d+\]"
_CALL = re.compile(
    rf"({_NAME})\s*(?:\(([^()]*)\))?\s+({_QUBIT}(?:\s*,\s*{_QUBIT})*)\s*\Z"
)
_MEASURE = re.compile(rf"measure\s+({_QUBIT})\s*(?:->\s*({_QUBIT}))?\s*\Z")
_INTO = re.compile(rf"({_QUBIT})\s*=\s*measure\s+({_QUBIT})\s*\Z")
_OLD = re.compile(rf"([qc])reg\s+({_NAME})\s*\[(\d+)\]\s*\Z")
_NEW = re.compile(rf"(qubit|bit)\s*\[(\d+)\]\s*({_NAME})\s*\Z")
_INCLUDE = re.compile(r'include\s*"([^"]*)"\s*\Z')
_VERSION = re.compile(r"OPENQASM\s+[0-9.]+\s*\Z")
_PLAIN = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?\Z")
_OF_PI = re.compile(r"(-?)(?:(\d+(?:\.\d+)?)\s*\*\s*)?pi(?:\s*/\s*(\d+(?:\.\d+)?))?\Z")
# What a flat file does not hold; one look at the whole text saves reading half of it.
_NOT_FLAT = re.compile(r"[{}@]|/\*|^\s*#|\bpragma\b|\bif\b|[^\x00-\x7f]", re.MULTILINE)
_LARGEST_ANGLE = 1e15
_DECLARING = frozenset(["qreg", "creg", "qubit", "bit", "include", "OPENQASM"])
# Register names that the full reader of OpenQASM 3 refuses or that mean something.
_WORDS = frozenset(
    re.findall(
        r"\w+",
        """
    OPENQASM include defcalgrammar def cal defcal gate extern box let break
    continue if else end return for while in switch case default pragma input
    output const readonly mutable qreg qubit creg bool bit int uint float angle
    complex array void duration stretch gphase inv pow ctrl negctrl durationof
    delay reset measure barrier nop true false pi tau euler im U CX opaque sin
    cos tan exp ln sqrt
""",
    )
)


class _Unknown(Exception):  # noqa: N818 - the way back to the full reader
    """Something that this reader does not know."""


def read_flat(text: str, path: str, version: str, *, start: Start) -> Draft | None:
    """Return the draft of a flat file, `None` where the full reader is needed."""
    if _NOT_FLAT.search(text):
        return None
    reader = _Flat(path, version == "2", start)
    try:
        for number, line in enumerate(text.split("\n"), start=1):
            reader.line(line, number)
        reader.finish()
    except _Unknown:
        return None
    return reader.draft


@dataclass(slots=True)
class _Flat:
    """Where the reading stands."""

    path: str
    is_old: bool
    start: Start
    draft: Draft = field(default_factory=Draft)
    wires: dict[str, int] = field(default_factory=dict)
    bits: set[str] = field(default_factory=set)
    names: set[str] = field(default_factory=set)
    has_library: bool = False
    is_open: bool = False
    operands: dict[str, tuple[int, ...]] = field(default_factory=dict)

    def line(self, line: str, number: int) -> None:
        """Read the statements of one line; each must end in it."""
        line = line.partition("//")[0]
        at = 0
        while True:
            end = line.find(";", at)
            rest = line[at:] if end < 0 else line[at:end]
            statement = rest.strip()
            if end < 0:
                if statement:
                    raise _Unknown
                return
            if statement:
                column = at + len(rest) - len(rest.lstrip()) + 1
                self._statement(statement, Place(self.path, number, column))
            at = end + 1

    def finish(self) -> None:
        """Leave files without qubits, or too large, to the full reader."""
        if not self.wires or len(self.draft.steps) > MOST_OPERATIONS:
            raise _Unknown

    def _statement(self, text: str, place: Place) -> None:
        word = text.partition(" ")[0]
        if word in ("measure", "barrier", "reset") or "=" in text:
            self._other(word, text, place)
            return
        match = None if word in _DECLARING else _CALL.match(text)
        if match is None:
            self._declaration(text, place)
            return
        name, params, operands = match.groups()
        wires = self._wires(operands)
        for raw in self._raws(name, params, len(wires)):
            local = tuple(wires[i] for i in raw.wires)
            self.draft.steps.append(Step(raw.kind, raw.name, local, raw.params, place))

    def _raws(self, name: str, params: str | None, count: int) -> tuple[Raw, ...]:
        known = name in ALWAYS or (self.has_library and name in GATES)
        # cu3 comes with a note on its meaning.
        if not known or name == "cu3":
            raise _Unknown
        found = _lowered(name, params or "", count)
        if found is None or (params is not None and not params.strip()):
            raise _Unknown
        return found

    def _wires(self, operands: str) -> tuple[int, ...]:
        found = self.operands.get(operands)
        if found is None:
            try:
                found = tuple(self.wires[o.strip()] for o in operands.split(","))
            except KeyError:
                raise _Unknown from None
            if len(set(found)) < len(found):
                raise _Unknown
            self.operands[operands] = found
        return found

    def _other(self, word: str, text: str, place: Place) -> None:
        if word == "barrier":
            wires = self._wires(text[7:].strip())
            self.draft.steps.append(Step("barrier", "barrier", wires, (), place))
            return
        if word == "reset":
            (wire,) = self._one(text[5:].strip())
            self.draft.steps.append(Step("reset", "reset", (wire,), (), place))
            return
        match = _MEASURE.match(text)
        if match is not None:
            source, bit = match.groups()
        else:
            match = _INTO.match(text)
            if match is None or self.is_old:
                raise _Unknown
            bit, source = match.groups()
        if bit is not None and bit not in self.bits:
            raise _Unknown
        (wire,) = self._one(source)
        self.draft.steps.append(Step("measure", "measure", (wire,), (), place, bit=bit))

    def _one(self, operand: str) -> tuple[int]:
        if operand not in self.wires:
            raise _Unknown
        return (self.wires[operand],)

    def _declaration(self, text: str, place: Place) -> None:
        if _VERSION.match(text) and not self.is_open:
            self.is_open = True
            return
        self.is_open = True
        match = _INCLUDE.match(text)
        if match is not None:
            if match.group(1) not in INCLUDE_FILES:
                raise _Unknown
            self.has_library = True
            return
        match = _OLD.match(text)
        if match is not None:
            kind, name, size = match.groups()
        else:
            match = _NEW.match(text)
            if match is None or self.is_old:
                raise _Unknown
            kind, size, name = match.groups()
        width = int(size)
        if name in self.names or name in _WORDS or not 1 <= width <= 100_000:
            raise _Unknown
        self.names.add(name)
        at = match.start(2 if kind in ("q", "c") else 3)
        place = Place(self.path, place.line, place.column + at)
        if kind in ("q", "qubit"):
            first = self.draft.add_register(name, width, self.start, place)[0]
            self.wires.update((f"{name}[{i}]", first + i) for i in range(width))
        else:
            self.draft.bits.append((name, width))
            self.bits.update(f"{name}[{i}]" for i in range(width))


@lru_cache(maxsize=65_536)
def _lowered(name: str, params: str, count: int) -> tuple[Raw, ...] | None:
    """Return the operations of a call on local wires, `None` where unsure."""
    gate = ALWAYS[name] if name in ALWAYS else GATES[name]
    values = []
    for part in params.split(",") if params else []:
        value = _value(part.strip())
        if value is None:
            return None
        values.append(value)
    if len(values) != gate.params or count != gate.wires:
        return None
    return lower(gate.terms(tuple(values)))


def _value(text: str) -> float | None:
    """Return a number or a multiple of pi, `None` for any other expression."""
    if _PLAIN.match(text):
        value = float(text)
    else:
        match = _OF_PI.match(text)
        if match is None:
            return None
        sign, factor, divisor = match.groups()
        value = math.pi if factor is None else float(factor) * math.pi
        if divisor is not None:
            if float(divisor) == 0:
                return None
            value /= float(divisor)
        value = -value if sign else value
    return value if abs(value) <= _LARGEST_ANGLE else None
