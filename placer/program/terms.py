"""Gates as products of controlled one- and two-wire bases, with exact phase.

A `Term` acts on local wires 0, 1, ...; a gate is a sequence of terms.  Modifiers turn
sequences into sequences here, so that every gate, built in or defined by the user, is
controlled and inverted by the same few lines.  `placer.program.lowering` writes terms
out as operations.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple


class Term(NamedTuple):
    """One base gate under controls.

    `framed` terms come in pairs that undo each other when what stands between them
    does not act, so that they need no control of their own.
    """

    base: str
    params: tuple[float, ...]
    controls: tuple[int, ...]
    targets: tuple[int, ...]
    framed: bool = False


Terms = tuple[Term, ...]

SELF_INVERSE = frozenset({"id", "x", "y", "z", "h", "swap"})
_PARTNER = {
    "s": "sdg",
    "sdg": "s",
    "t": "tdg",
    "tdg": "t",
    "sx": "sxdg",
    "sxdg": "sx",
}
# Bases with one angle, for which a power multiplies the angle.
ONE_ANGLE = frozenset({"rx", "ry", "rz", "p", "gphase", "rzz", "rxx"})


def inverse_base(base: str, params: tuple[float, ...]) -> tuple[str, tuple[float, ...]]:
    """Return the base gate and parameters that undo a base gate, phase included."""
    if base in SELF_INVERSE:
        return base, params
    if base in _PARTNER:
        return _PARTNER[base], params
    if base == "u":
        theta, phi, lam = params
        return base, (-theta, -lam, -phi)
    return base, (-params[0],)


def inverse(terms: Sequence[Term]) -> Terms:
    """Return the terms that undo terms."""
    result = []
    for term in reversed(terms):
        base, params = inverse_base(term.base, term.params)
        result.append(term._replace(base=base, params=params))
    return tuple(result)


def controlled(terms: Sequence[Term], *, on_zero: bool = False) -> Terms:
    """Return terms under one more control, which becomes local wire 0.

    `on_zero` makes them act where the control is 0, by an `x` before and after.
    """
    result = []
    for term in terms:
        controls = tuple(wire + 1 for wire in term.controls)
        targets = tuple(wire + 1 for wire in term.targets)
        if not term.framed:
            controls = (0, *controls)
        result.append(term._replace(controls=controls, targets=targets))
    if on_zero:
        flip = Term("x", (), (), (0,), framed=True)
        return (flip, *result, flip)
    return tuple(result)


def power(terms: Sequence[Term], exponent: int) -> Terms:
    """Return terms applied `exponent` times; a negative exponent inverts."""
    if exponent < 0:
        return power(inverse(terms), -exponent)
    if len(terms) == 1:
        term = terms[0]
        if term.base in ONE_ANGLE:
            return (term._replace(params=(term.params[0] * exponent,)),)
        if term.base in SELF_INVERSE:
            return tuple(terms) * (exponent % 2)
    return tuple(terms) * exponent


def moved(terms: Sequence[Term], wires: Sequence[int]) -> Terms:
    """Return terms with local wire `i` renamed to `wires[i]`."""
    return tuple(
        term._replace(
            controls=tuple(wires[wire] for wire in term.controls),
            targets=tuple(wires[wire] for wire in term.targets),
        )
        for term in terms
    )
