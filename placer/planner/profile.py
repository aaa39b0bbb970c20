"""What a built recipe means on a device before any site is chosen.

In: a recipe's fine circuit and the device's nominal times.  Out: base duration, pair
counts, one-qubit counts, live times (definitions: DEVELOPERS.md, 'The schedule of a
plan').  Sites and costs are applied elsewhere.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Callable

    from placer.recipes.circuit import Built, Op
    from placer.tables import Tables

Mask = tuple[bool, bool, bool]
"""Is it a level-2 gate; does the first, the second wire's site need level 2."""

QUBIT_GATE: Mask = (False, False, False)


@dataclass(frozen=True, slots=True)
class Pair:
    """Two local wires a < b that meet `count` times in gates of one kind."""

    a: int
    b: int
    mask: Mask
    count: int


@dataclass(frozen=True, slots=True)
class Profile:
    """Everything about one recipe that the placement cost needs.

    Per local wire: `ones` and `tees` (one-qubit gates), `reads`, `wipes`,
    `level2_ns`; per slot: `live_ns`.  `base_ns` is the base duration.
    """

    built: Built
    base_ns: int
    pairs: tuple[Pair, ...]
    ones: tuple[int, ...]
    tees: tuple[int, ...]
    reads: tuple[int, ...]
    wipes: tuple[int, ...]
    live_ns: tuple[int, ...]
    level2_ns: tuple[int, ...]


def profile_of(built: Built, tables: Tables) -> Profile:
    """Return the profile of a recipe under the nominal times of a device."""
    fine = built.fine
    width = fine.width
    ready = [0] * width
    first: list[int | None] = [None] * width
    bit_at: dict[int, int] = {}
    entered: dict[int, int] = {}
    level2_ns = [0] * width
    for op in fine.ops:
        start = max((ready[w] for w in op.wires), default=0)
        if op.condition is not None:
            start = max(start, bit_at[op.condition] + tables.conditional_ns)
        if op.listens is not None:
            start = max(start, tables.conditional_ns)
        end = start + _nominal(op, tables)
        for wire in op.wires:
            ready[wire] = end
            if first[wire] is None:
                first[wire] = start
        if op.name == "measure" and op.bit is not None:
            bit_at[op.bit] = end
        for wire in op.enters:
            entered[wire] = start
        for wire in op.leaves:
            level2_ns[wire] += end - entered.pop(wire)
    live = tuple(ready[w] - (first[w] or 0) for w in range(fine.operands, width))
    return Profile(
        built=built,
        base_ns=max(ready, default=0),
        pairs=_pairs(built),
        ones=_count(built, lambda op: _is_one(op) and op.name not in ("t", "tdg")),
        tees=_count(built, lambda op: op.name in ("t", "tdg")),
        reads=_count(built, lambda op: op.name == "measure"),
        wipes=_count(built, lambda op: op.name == "reset"),
        live_ns=live,
        level2_ns=tuple(level2_ns),
    )


def _nominal(op: Op, tables: Tables) -> int:
    named = {
        "barrier": 0,
        "measure": tables.readout_ns,
        "reset": tables.reset_ns,
        "level2": tables.level2_ns,
        "cx": tables.two_ns,
        "cz": tables.two_ns,
        "t": tables.tee_ns,
        "tdg": tables.tee_ns,
    }
    return named.get(op.name, tables.one_ns)


def _is_one(op: Op) -> bool:
    return op.name not in ("barrier", "measure", "reset", "level2", "cx", "cz")


def _count(built: Built, wanted: Callable[[Op], bool]) -> tuple[int, ...]:
    counts = [0] * built.fine.width
    for op in built.fine.ops:
        if wanted(op):
            counts[op.wires[0]] += 1
    return tuple(counts)


def _pairs(built: Built) -> tuple[Pair, ...]:
    high = set(built.level2_wires)
    counts: dict[tuple[int, int, Mask], int] = {}
    for op in built.fine.ops:
        if op.name not in ("cx", "cz", "level2"):
            continue
        a, b = sorted(op.wires)
        is_high = op.name == "level2"
        mask = (is_high, is_high and a in high, is_high and b in high)
        key = (a, b, mask)
        counts[key] = counts.get(key, 0) + 1
    return tuple(Pair(a, b, mask, n) for (a, b, mask), n in sorted(counts.items()))
