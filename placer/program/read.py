"""A program file to a program: which language it is in, and the reading of files."""

from __future__ import annotations

import sys
from pathlib import Path, PurePath

from placer.errors import InputError, Place
from placer.program.model import Program
from placer.program.read_qasm import read_qasm
from placer.program.read_yaml import read_yaml

YAML_ENDINGS = (".yaml", ".yml")


def read_program(text: str, path: str, *, open_inputs: bool = False) -> Program:
    r"""Return the program of a text; `path` says the language and stands in messages.

    A path that ends in `.yaml` or `.yml` is program YAML, all else is OpenQASM.  With
    `open_inputs`, registers that are not workspace may hold anything at the start.

    Raises
    ------
    InputError
        With every fault found in one pass.

    Examples
    --------
    >>> text = 'OPENQASM 2.0;\ninclude "qelib1.inc";\nqreg q[3];\nccx q[0],q[1],q[2];'
    >>> [call.kind for call in read_program(text, "toffoli.qasm").calls]
    ['mcx']
    """
    text = text.removeprefix("\ufeff")
    if not text.strip():
        raise InputError.at(Place(path), "empty-file", "the program is empty")
    if "\0" in text:
        raise InputError.at(Place(path), "bad-text", "the program is no text file")
    if PurePath(path).suffix.lower() in YAML_ENDINGS:
        return read_yaml(text, path, open_inputs=open_inputs)
    return read_qasm(text, path, open_inputs=open_inputs)


def load_program(path: str | Path, *, open_inputs: bool = False) -> Program:
    """Return the program of a file; `-` reads OpenQASM from standard input.

    Raises
    ------
    InputError
        If the file cannot be read, is no text, or has faults.
    """
    name = str(path)
    place = Place(name)
    try:
        data = sys.stdin.buffer.read() if name == "-" else Path(path).read_bytes()
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise InputError.at(
            place, "no-file", f"the program cannot be read: {reason}"
        ) from error
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise InputError.at(
            Place(name, line), "bad-text", "the program is no text in UTF-8"
        ) from error
    return read_program(text, name, open_inputs=open_inputs)
