"""Spell single gates in OpenQASM 3 with nothing but stdgates.inc and modifiers.

Names that stdgates.inc does not have are written with a modifier (`inv @ sx`,
`ctrl(2) @ z`), with the built-in `U`, or with a gate definition of our own.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from types import MappingProxyType
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from placer.program.model import Operation

DEFINITIONS: Mapping[str, str] = MappingProxyType(
    {
        "placer_rxx": (
            "gate placer_rxx(theta) a, b "
            "{ h a; h b; cx a, b; rz(theta) b; cx a, b; h b; h a; }"
        ),
        "placer_rzz": (
            "gate placer_rzz(theta) a, b { cx a, b; rz(theta) b; cx a, b; }"
        ),
    }
)
"""Gate definitions that the written text may need, by name."""

# Names that a classical register must not have: gates of stdgates.inc and of ours,
# keywords, types, built-in constants and functions of OpenQASM 3.
_WORDS = """
p x y z h s sdg t tdg sx rx ry rz cx cy cz cp crx cry crz ch swap ccx cswap cu CX
phase cphase id u1 u2 u3 U gphase placer_rxx placer_rzz
OPENQASM include defcalgrammar def cal defcal gate extern box let break continue
if else end return for while in switch case default nop pragma input output const
readonly mutable qreg qubit creg bool bit int uint float angle complex array void
duration stretch inv pow ctrl negctrl dim durationof delay reset measure barrier
true false im pi tau euler ns us ms dt sizeof arccos arcsin arctan ceiling cos exp
floor log mod popcount real imag rotl rotr sin sqrt tan
"""
RESERVED: frozenset[str] = frozenset(_WORDS.split())
_IDENTIFIER = re.compile(r"[^\W\d]\w*")

# Our gate name -> how stdgates.inc, a modifier or a definition says it.
_SPELLED: Mapping[str, str] = MappingProxyType(
    {
        "sxdg": "inv @ sx",
        "u": "U",
        "rzz": "placer_rzz",
        "rxx": "placer_rxx",
        "ccz": "ctrl(2) @ z",
    }
)
_MULTI: Mapping[str, str] = MappingProxyType({"mcx": "x", "mcz": "z", "mcp": "p"})


def gate_text(
    name: str, params: Sequence[float], sites: Sequence[int]
) -> tuple[str, str]:
    """Return the statement of one gate, and the definition that it needs or ''.

    Controls come first in `sites`.
    """
    spelled = _SPELLED.get(name, name)
    if name in _MULTI:
        spelled = controlled(_MULTI[name], len(sites) - 1)
    arguments = f"({', '.join(number(p) for p in params)})" if params else ""
    qubits = ", ".join(f"${site}" for site in sites)
    definition = spelled if spelled in DEFINITIONS else ""
    return f"{spelled}{arguments} {qubits};", definition


def call_gate(op: Operation, sites: Sequence[int]) -> str:
    """Return a whole call as one controlled gate: what it does to its operands."""
    base = {"mcz": "z", "mcp": "p"}.get(op.kind, "x")
    spelled = controlled(base, op.controls)
    arguments = f"({number(op.params[0])})" if op.kind == "mcp" else ""
    qubits = ", ".join(f"${site}" for site in sites[: op.controls + 1])
    return f"{spelled}{arguments} {qubits};"


def controlled(base: str, controls: int) -> str:
    """Return `base` (x, z or p) under a number of controls, by its usual name."""
    if controls <= 0:
        return base
    if controls == 1:
        return f"c{base}"
    if controls == 2 and base == "x":
        return "ccx"
    return f"ctrl({controls}) @ {base}"


def number(value: float) -> str:
    """Return a parameter so that reading it back gives the same float."""
    return repr(float(value))


def free_name(name: str, taken: set[str]) -> str:
    """Return an identifier near `name` that is neither reserved nor taken.

    The result is added to `taken`.
    """
    base = re.sub(r"\W", "_", name) or "bits"
    if not _IDENTIFIER.fullmatch(base):
        base = f"b_{base}"
    if base in RESERVED:
        base = f"{base}_bits"
    chosen = base
    count = 2
    while chosen in taken or chosen in RESERVED:
        chosen = f"{base}_{count}"
        count += 1
    taken.add(chosen)
    return chosen
