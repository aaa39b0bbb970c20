"""The gates of the standard include files, as terms.

One table holds the union of what `qelib1.inc` (Cross et al. 2017, arXiv:1707.03429,
and the longer versions in use since) and `stdgates.inc` (OpenQASM 3 specification)
define.  Where versions differ, a comment says which one is meant.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from placer.program.terms import Term, Terms, controlled

PI = math.pi
Params = tuple[float, ...]


@dataclass(frozen=True, slots=True)
class BuiltIn:
    """A gate of the table: how many parameters and wires, and its terms."""

    params: int
    wires: int
    terms: Callable[[Params], Terms]


def _base(base: str, params: int = 0, controls: int = 0) -> BuiltIn:
    wires = 2 if base in ("swap", "rzz", "rxx") else 1
    targets = tuple(range(controls, controls + wires))
    above = tuple(range(controls))

    def terms(values: Params) -> Terms:
        return (Term(base, values, above, targets),)

    return BuiltIn(params, controls + wires, terms)


def _phase_of_all(angle: float) -> Term:
    return Term("gphase", (angle,), (), ())


def _u(values: Params) -> Terms:
    """U of OpenQASM 3 has the phase exp(i theta/2) over the matrix with real corner."""
    return (_phase_of_all(values[0] / 2), Term("u", values, (), (0,)))


def _u2(values: Params) -> Terms:
    """stdgates.inc: gphase(-(phi + lambda + pi/2)/2); U(pi/2, phi, lambda)."""
    return _u3((PI / 2, *values))


def _u3(values: Params) -> Terms:
    """stdgates.inc: gphase(-(phi + lambda + theta)/2); U(theta, phi, lambda)."""
    _, phi, lam = values
    return (_phase_of_all(-(phi + lam) / 2), Term("u", values, (), (0,)))


def _u0(_: Params) -> Terms:
    """Wait for a number of gate lengths; as a unitary it is the identity."""
    return (Term("id", (), (), (0,)),)


def _cu(values: Params) -> Terms:
    """cu(theta, phi, lambda, gamma): exp(i gamma) times u where the control is 1."""
    phase = controlled((_phase_of_all(values[3]),))
    return (*phase, Term("u", values[:3], (0,), (1,)))


def _word(text: str) -> Callable[[Params], Terms]:
    """Return terms of a list of plain gates such as `h 2; t 2; cx 1 2`."""
    terms = []
    for step in text.split(";"):
        name, *wires = step.split()
        numbers = tuple(int(wire) for wire in wires)
        is_cx = name == "cx"
        terms.append(Term("x" if is_cx else name, (), numbers[:-1], numbers[-1:]))
    result = tuple(terms)
    return lambda _: result


# Toffoli gates up to relative phase: Maslov 2016, arXiv:1508.03273.
_RCCX = "h 2; t 2; cx 1 2; tdg 2; cx 0 2; t 2; cx 1 2; tdg 2; h 2"
_RC3X = (
    "h 3; t 3; cx 2 3; tdg 3; h 3; cx 0 3; t 3; cx 1 3; tdg 3; cx 0 3; t 3; cx 1 3;"
    "tdg 3; h 3; t 3; cx 2 3; tdg 3; h 3"
)

ALWAYS: dict[str, BuiltIn] = {
    "U": BuiltIn(3, 1, _u),
    "CX": _base("x", controls=1),
}
"""Gates that need no include file."""

GATES: dict[str, BuiltIn] = {
    **{
        name: _base(name)
        for name in ("id", "x", "y", "z", "h", "s", "sdg", "t", "tdg", "sx", "sxdg")
    },
    **{name: _base(name, 1) for name in ("rx", "ry", "rz", "p", "rzz", "rxx")},
    "phase": _base("p", 1),
    "u1": _base("p", 1),
    "u": BuiltIn(3, 1, _u),
    "u2": BuiltIn(2, 1, _u2),
    "u3": BuiltIn(3, 1, _u3),
    "u0": BuiltIn(1, 1, _u0),
    "swap": _base("swap"),
    **{f"c{name}": _base(name, controls=1) for name in ("x", "y", "z", "h", "sx")},
    **{f"c{name}": _base(name, 1, 1) for name in ("rx", "ry", "rz", "p")},
    "cphase": _base("p", 1, 1),
    "cu1": _base("p", 1, 1),
    # Newer tables: the controlled matrix with real upper left corner.  The table of
    # 2017 differs by a phase (phi + lambda)/2 on the control.
    "cu3": _base("u", 3, 1),
    "cu": BuiltIn(4, 2, _cu),
    "ccx": _base("x", controls=2),
    "ccz": _base("z", controls=2),
    "cswap": _base("swap", controls=1),
    "c3x": _base("x", controls=3),
    "c4x": _base("x", controls=4),
    "c3sqrtx": _base("sx", controls=3),
    "rccx": BuiltIn(0, 3, _word(_RCCX)),
    "rc3x": BuiltIn(0, 4, _word(_RC3X)),
}
"""Gates of the include files."""

GLOBAL_PHASE = BuiltIn(1, 0, lambda values: (_phase_of_all(values[0]),))
"""`gphase(angle)`."""

# Names that every version of an include file defines: a second definition is a mistake.
# Other names of the table may be defined by the program, whose definition then counts.
FIXED: dict[str, frozenset[str]] = {
    "openqasm2": frozenset(
        [
            "u3",
            "u2",
            "u1",
            "cx",
            "id",
            "x",
            "y",
            "z",
            "h",
            "s",
            "sdg",
            "t",
            "tdg",
            "rx",
            "ry",
            "rz",
            "cz",
            "cy",
            "ch",
            "ccx",
            "crz",
            "cu1",
            "cu3",
        ]
    ),
    "openqasm3": frozenset(
        [
            "p",
            "x",
            "y",
            "z",
            "h",
            "s",
            "sdg",
            "t",
            "tdg",
            "sx",
            "rx",
            "ry",
            "rz",
            "cx",
            "cy",
            "cz",
            "cp",
            "crx",
            "cry",
            "crz",
            "ch",
            "swap",
            "ccx",
            "cswap",
            "cu",
            "phase",
            "cphase",
            "id",
            "u1",
            "u2",
            "u3",
        ]
    ),
}
INCLUDE_FILES = ("stdgates.inc", "qelib1.inc")
