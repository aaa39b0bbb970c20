"""Gate modifiers: their values, and what they make of the terms of a gate."""

from __future__ import annotations

from collections.abc import Sequence

from placer.errors import InputError
from placer.program.loops import MOST_OPERATIONS
from placer.program.names import Names
from placer.program.syntax import Expression, GateCall, Modifier
from placer.program.terms import Terms, controlled, inverse, power

Change = tuple[str, int]
"""A modifier with its value: ('ctrl', 2), ('negctrl', 1), ('inv', 1), ('pow', -3)."""


def changes_of(
    names: Names, modifiers: Sequence[Modifier], notes: list[str]
) -> tuple[Change, ...]:
    """Return the values of modifiers, in the order they are written.

    The specification is of two minds about `negctrl(n)`; `notes` say how it was read.
    """
    result: list[Change] = []
    for modifier in modifiers:
        value = 1
        if modifier.value is not None:
            value = _value(names, modifier, modifier.value)
        result.append((modifier.kind, value))
        if modifier.kind == "negctrl" and value > 1:
            note = f"negctrl({value}) was read as {value} nested negctrl"
            if note not in notes:
                notes.append(note)
    return tuple(result)


def _value(names: Names, modifier: Modifier, expression: Expression) -> int:
    if modifier.kind == "pow":
        value = names.value(expression)
        if isinstance(value, float) and not value.is_integer():
            raise InputError.at(
                modifier.place,
                "unsupported",
                f"pow({value:g}) is not supported, only whole powers are",
                "write the root as a gate of its own",
            )
        return int(value)
    count = names.whole(expression, f"the count of '{modifier.kind}'")
    if count < 1:
        raise InputError.at(
            modifier.place,
            "bad-count",
            f"{modifier.kind}({count}) needs a count of at least 1",
        )
    return count


def changed(terms: Terms, changes: Sequence[Change], call: GateCall) -> Terms:
    """Return terms under modifiers; the last one written acts first."""
    for kind, value in reversed(changes):
        if kind == "inv":
            terms = inverse(terms)
        elif kind == "pow":
            limit(max(len(terms), 1) * abs(value), call)
            terms = power(terms, value)
        else:
            limit(len(terms) + 2 * value, call)
            for _ in range(value):
                terms = controlled(terms, on_zero=kind == "negctrl")
    return terms


def limit(count: int, call: GateCall) -> None:
    """Refuse a gate that would become too many operations."""
    if count > MOST_OPERATIONS:
        raise InputError.at(
            call.place,
            "too-large",
            f"the gate '{call.name}' expands to more than {MOST_OPERATIONS} operations",
        )
