"""OpenQASM text to a program: which version, then parse, work out, assemble.

Flat files take a fast way, `flat`.  Of all others the syntax is in `parse_openqasm2`
and `parse_openqasm3`, the meaning in `elaborate`.  Start
states in `assemble`, the check of claims in `claims`.
"""

from __future__ import annotations

import re

from placer.errors import InputError, InternalError
from placer.program.assemble import Syntax, assemble
from placer.program.claims import check_claims
from placer.program.elaborate import Parser, elaborate
from placer.program.flat import read_flat
from placer.program.model import Program, Start
from placer.program.parse_openqasm2 import parse_openqasm2
from placer.program.parse_openqasm3 import parse_openqasm3
from placer.program.tokens import Reader

_COMMENT = re.compile(r"//[^\n]*|/\*.*?\*/", re.DOTALL)
_OLD_WORDS = re.compile(r'^\s*(?:qreg|creg)\b|\binclude\s*"qelib1\.inc"', re.MULTILINE)
_IDLE_COMMENT = re.compile(r"^\s*(//\s*@placer\b)", re.MULTILINE)
_PARSERS: dict[str, Parser] = {"2": parse_openqasm2, "3": parse_openqasm3}
_VERSIONS = {"2": "2", "2.0": "2", "3": "3", "3.0": "3", "3.1": "3"}


def read_qasm(text: str, path: str, *, open_inputs: bool = False) -> Program:
    """Return the program of an OpenQASM 2 or 3 text.

    Raises
    ------
    InputError
        With every fault found in one pass.
    """
    version = _version(text, path)
    start: Start = "zero" if version == "2" and not open_inputs else "unknown"
    draft = read_flat(text, path, version, start=start)
    if draft is not None:
        dialect: Syntax = "openqasm2" if version == "2" else "openqasm3"
        program = assemble(draft, dialect, text, path, open_inputs=open_inputs)
        check_claims(program)
        return program
    return read_fully(text, path, version, start, open_inputs=open_inputs)


def read_fully(
    text: str, path: str, version: str, start: Start, *, open_inputs: bool
) -> Program:
    """Return the program of a text by the full reader of its version ('2' or '3')."""
    parse = _PARSERS[version]
    parsed = parse(text, path)
    work = elaborate(parsed, parse, path, start=start)
    if work.faults:
        raise InputError(work.faults)
    if work.skipped:
        raise InternalError(f"{path}: a statement was skipped without a fault")
    if version == "3":
        work.draft.notes.extend(_idle_comments(text))
    program = assemble(work.draft, parsed.dialect, text, path, open_inputs=open_inputs)
    check_claims(program)
    return program


def _idle_comments(text: str) -> list[str]:
    """Return notes on comments that look like annotations but are none."""
    return [
        f"the comment in line {text.count(chr(10), 0, match.start(1)) + 1} is no "
        "annotation in OpenQASM 3, which needs '@' without '//'"
        for match in _IDLE_COMMENT.finditer(text)
    ]


def _version(text: str, path: str) -> str:
    """Return '2' or '3', from the first statement or from the words in use."""
    reader = Reader(text, path)
    try:
        first = reader.peek()
        has_version = first.text == "OPENQASM"
    except InputError:
        has_version = False
    if has_version:
        reader.take()
        token = reader.take()
        if token.text not in _VERSIONS:
            reader.fail(
                token,
                f"version {token.text!r} of OpenQASM is not supported",
                "supported are 2.0, 3.0 and 3.1",
                code="version",
            )
        return _VERSIONS[token.text]
    return "2" if _OLD_WORDS.search(_COMMENT.sub("", text)) else "3"
