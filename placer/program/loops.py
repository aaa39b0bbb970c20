"""The values that a loop over constants runs through."""

from __future__ import annotations

from placer.errors import InputError
from placer.program.names import Names
from placer.program.syntax import Loop, Several

MOST_OPERATIONS = 1_000_000


def loop_values(names: Names, loop: Loop) -> list[int]:
    """Return the values of the loop variable in order.

    All loops of a program together may not turn more often than `MOST_OPERATIONS`.
    """
    values = _values(names, loop)
    names.turns += len(values)
    if names.turns > MOST_OPERATIONS:
        raise InputError.at(
            loop.place,
            "too-large",
            f"the loops of the program turn more than {MOST_OPERATIONS} times",
        )
    return values


def _values(names: Names, loop: Loop) -> list[int]:
    over = loop.over
    what = f"the value of '{loop.variable}'"
    if isinstance(over, Several):
        return [names.whole(member, what) for member in over.members]
    if over.start is None or over.stop is None:
        raise InputError.at(
            over.place,
            "bad-range",
            "the range of a loop needs a first and a last value",
        )
    first = names.whole(over.start, what)
    last = names.whole(over.stop, what)
    step = 1 if over.step is None else names.whole(over.step, "the step")
    if step and (last - first) * step < 0:
        return []
    return names.range(first, step, last, over.place)
