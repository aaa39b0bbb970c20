"""A recipe in nominal times, and what has to meet in it; nothing of a placement."""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

if TYPE_CHECKING:
    from placer.check.numbers import Numbers
    from placer.recipes.circuit import Built, Op

Kind = tuple[bool, bool, bool]
"""Level 2 or not; whether the lower, the higher local wire needs it on its site."""

TWO_BODY = ("cx", "cz", "level2")


class Base(NamedTuple):
    """Length, live time of each slot, time in level 2 of each local wire, in ns.

    `pairs` counts the two-body gates by pair of local wires and kind.
    """

    length: int
    live: dict[int, int]
    high: dict[int, int]
    pairs: dict[tuple[int, int, Kind], int]


def _nominal(op: Op, numbers: Numbers) -> int:
    """Return the nominal time of a fine operation."""
    times = {
        "barrier": 0,
        "cx": numbers.two_ns,
        "cz": numbers.two_ns,
        "level2": numbers.high_ns,
        "t": numbers.tee_ns,
        "tdg": numbers.tee_ns,
        "measure": numbers.read_ns,
        "reset": numbers.wipe_ns,
    }
    return times.get(op.name, numbers.one_ns)


def base_of(built: Built, numbers: Numbers) -> Base:
    """Return what a recipe takes when every operation starts as soon as it can."""
    known = numbers.bases.get(id(built))
    if known is None:
        # The recipe is kept beside its base, so its id cannot be used again.
        known = numbers.bases[id(built)] = (built, _make_base(built, numbers))
    return known[1]


def _make_base(built: Built, numbers: Numbers) -> Base:
    free: dict[int, int] = {}
    begin: dict[int, int] = {}
    answered: dict[int, int] = {}
    entered: dict[int, int] = {}
    high: dict[int, int] = {}
    for op in built.fine.ops:
        at = max([free.get(w, 0) for w in op.wires], default=0)
        if op.condition is not None:
            at = max(at, answered.get(op.condition, 0) + numbers.latency_ns)
        if op.listens is not None:
            at = max(at, numbers.latency_ns)
        done = at + _nominal(op, numbers)
        for w in op.wires:
            begin.setdefault(w, at)
            free[w] = done
        if op.bit is not None:
            answered[op.bit] = done
        for w in op.enters:
            entered.setdefault(w, at)
        for w in op.leaves:
            high[w] = high.get(w, 0) + done - entered.pop(w, done)
    live = {}
    for slot in range(len(built.slots)):
        w = built.fine.operands + slot
        live[slot] = free.get(w, 0) - begin.get(w, 0)
    return Base(max(free.values(), default=0), live, high, _meetings(built))


def _meetings(built: Built) -> dict[tuple[int, int, Kind], int]:
    """Count a recipe's two-body gates by pair of local wires and kind."""
    counts: dict[tuple[int, int, Kind], int] = {}
    for op in built.fine.ops:
        if op.name not in TWO_BODY:
            continue
        a, b = min(op.wires), max(op.wires)
        high = op.name == "level2"
        needs = built.level2_wires if high else ()
        kind = (high, a in needs, b in needs)
        counts[a, b, kind] = counts.get((a, b, kind), 0) + 1
    return counts
