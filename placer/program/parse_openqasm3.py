"""OpenQASM 3 text to statements, by the reference parser of the language.

The reference parser says little about what it refuses; its errors become faults with a
place here.  What it accepts is handed to `placer.program.convert_openqasm3`.
"""

from __future__ import annotations

import contextlib
import io
import re

import openqasm3
from openqasm3.parser import QASM3ParsingError

from placer.errors import InputError, Place
from placer.program.convert_openqasm3 import convert
from placer.program.syntax import Parsed
from placer.program.tokens import Places

_KEYWORDS = frozenset(
    [
        "OPENQASM",
        "include",
        "defcalgrammar",
        "def",
        "cal",
        "defcal",
        "gate",
        "extern",
        "box",
        "let",
        "break",
        "continue",
        "if",
        "else",
        "end",
        "return",
        "for",
        "while",
        "in",
        "switch",
        "case",
        "default",
        "pragma",
        "input",
        "output",
        "const",
        "readonly",
        "mutable",
        "qreg",
        "qubit",
        "creg",
        "bool",
        "bit",
        "int",
        "uint",
        "float",
        "angle",
        "complex",
        "array",
        "void",
        "duration",
        "stretch",
        "gphase",
        "inv",
        "pow",
        "ctrl",
        "negctrl",
        "durationof",
        "delay",
        "reset",
        "measure",
        "barrier",
        "true",
        "false",
    ]
)
_PLACE_IN_MESSAGE = re.compile(r"L([0-9]+):C([0-9]+): (.*)", re.DOTALL)
_COMMENT = re.compile(r"//[^\n]*|/\*.*?\*/", re.DOTALL)


def parse_openqasm3(text: str, file: str) -> Parsed:
    """Return the statements of an OpenQASM 3 text.

    Raises
    ------
    InputError
        With the first syntax fault; the reference parser stops there.
    """
    if not _COMMENT.sub("", text).strip():
        return Parsed("openqasm3", ())
    try:
        # The lexer prints to stderr before it raises.
        with contextlib.redirect_stderr(io.StringIO()):
            tree = openqasm3.parse(text)
    except QASM3ParsingError as error:
        raise _explained(error, file) from error
    except RecursionError as error:
        raise _too_deep(text, file) from error
    except (AttributeError, ValueError, KeyError, TypeError, IndexError) as error:
        raise InputError.at(
            Place(file, 1, 1),
            "syntax",
            "the text is not understood",
            "look for a statement that is cut short",
        ) from error
    try:
        return Parsed("openqasm3", convert(tree, text, Places(text, file)))
    except RecursionError as error:
        raise _too_deep(text, file) from error


def _too_deep(text: str, file: str) -> InputError:
    return InputError.at(
        Places(text, file).at(_deepest(text)),
        "too-deep",
        "an expression or a block is nested too deeply",
        "split the expression with const declarations",
    )


def _deepest(text: str) -> int:
    """Return the offset of the innermost bracket, comments not counted."""
    depth = most = offset = 0
    for match in re.finditer(r"//[^\n]*|/\*.*?\*/|[\[\](){}]", text, re.DOTALL):
        sign = match.group()
        if len(sign) == 1:
            depth += 1 if sign in "([{" else -1
        if depth > most:
            most, offset = depth, match.start()
    return offset


def _explained(error: QASM3ParsingError, file: str) -> InputError:
    """Return the fault behind an error of the reference parser."""
    match = _PLACE_IN_MESSAGE.match(str(error))
    if match is not None:
        place = Place(file, int(match[1]), int(match[2]) + 1)
        return InputError.at(place, "syntax", " ".join(match[3].split())[:200])
    cause = error.__cause__
    inner = cause.args[0] if cause is not None and cause.args else None
    token = getattr(inner, "offendingToken", None)
    if token is None:
        return InputError.at(Place(file, 1, 1), "syntax", "the text is not understood")
    place = Place(file, token.line, token.column + 1)
    word = token.text
    if word == "<EOF>":
        return InputError.at(
            place,
            "syntax",
            "the text ends in the middle of a statement",
            "look for a missing ';' or '}', or an annotation with no statement",
        )
    return InputError.at(place, "syntax", f"{word[:60]!r} is unexpected", _help(word))


def _help(word: str) -> str:
    if word in _KEYWORDS:
        return (
            f"'{word}' is a word of the language: it cannot name anything, and "
            "a ';' may be missing before it"
        )
    if word == ",":
        return "declare one register in a statement"
    if word == "opaque":
        return "declare the gate or mark it as a black box"
    return "look for a missing ';' before it"
