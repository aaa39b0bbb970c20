"""What a built recipe costs, counted from its circuits.

In: a `Built`.  Out: gate counts, depths and live times, all as integers.  Nothing is
taken from a formula, and no device is known.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

from placer.recipes.circuit import Built, Circuit, Op

_CLIFFORD = frozenset({"id", "x", "y", "z", "h", "s", "sdg", "sx", "sxdg"})
_KEPT_WHOLE = ("mcx", "mcz", "mcp")
_T = ("t", "tdg")


@dataclass(frozen=True, slots=True)
class Counts:
    """Sizes of a recipe.

    `toffoli`, `kept_whole` (multi-controlled operations that stay one at that level, of
    any size), `toffoli_depth` and `coarse_depth` belong to the coarse circuit; all else
    belongs to the fine one.
    `two_qubit` counts unconditional cx and cz, `two_qubit_conditional` those behind a
    measurement.  `rotations` counts one-qubit gates outside Clifford+T.  Depths are of
    the earliest schedule, in which only the named gates (or all) take one slot each.
    `live_toffoli[i]` runs from the end of the first coarse operation on slot i to the
    start of the last, in Toffoli slots; `live_gates[i]` is the same for the two-body
    gates of the fine circuit, in gate slots.  `level2_sum` and `level2_longest` say
    how long wires are in |2> when all controls are 1, `level2_window` how long they may
    be on some input, in slots of two-body gates.
    """

    toffoli: int
    kept_whole: int
    toffoli_depth: int
    coarse_depth: int
    two_qubit: int
    two_qubit_conditional: int
    two_qubit_depth: int
    t: int
    t_depth: int
    rotations: int
    depth: int
    measurements: int
    clean: int
    borrowed: int
    live_toffoli: tuple[int, ...]
    live_gates: tuple[int, ...]
    level2_gates: int = 0
    level2_depth: int = 0
    level2_sum: int = 0
    level2_longest: int = 0
    level2_window: int = 0


def count(built: Built) -> Counts:
    """Return the sizes of a built recipe.

    Examples
    --------
    >>> from placer.recipes.catalog import build
    >>> sizes = count(build("clean-ladder", "mcx", 5))
    >>> sizes.toffoli, sizes.two_qubit, sizes.t
    (7, 24, 31)
    """
    coarse, fine = built.coarse, built.fine
    names = Counter(op.name for op in fine.ops)
    pairs = [op for op in fine.ops if op.name in ("cx", "cz")]
    conditional = sum(op.condition is not None for op in pairs)
    kinds = Counter(fine.slots)
    total, longest, window = _residence(built)
    return Counts(
        toffoli=sum(op.name == "ccx" for op in coarse.ops),
        kept_whole=sum(op.name in _KEPT_WHOLE for op in coarse.ops),
        toffoli_depth=depth(coarse.ops, _is_toffoli),
        coarse_depth=depth(coarse.ops),
        two_qubit=len(pairs) - conditional,
        two_qubit_conditional=conditional,
        two_qubit_depth=depth(fine.ops, _is_two_body),
        t=names["t"] + names["tdg"],
        t_depth=depth(fine.ops, _is_t),
        rotations=sum(_is_rotation(op) for op in fine.ops),
        depth=depth(fine.ops),
        measurements=names["measure"],
        clean=kinds["clean"],
        borrowed=kinds["borrowed"],
        live_toffoli=_live(coarse, _is_toffoli, lambda _: True),
        live_gates=_live(fine, lambda _: True, _is_two_body),
        level2_gates=names["level2"],
        level2_depth=depth(fine.ops, _is_level2),
        level2_sum=total,
        level2_longest=longest,
        level2_window=window,
    )


def _is_toffoli(op: Op) -> bool:
    return op.name == "ccx"


def _is_two_body(op: Op) -> bool:
    return len(op.wires) == 2


def _is_t(op: Op) -> bool:
    return op.name in _T


def _is_level2(op: Op) -> bool:
    return op.name == "level2"


def _is_rotation(op: Op) -> bool:
    return (
        len(op.wires) == 1
        and op.name not in _CLIFFORD
        and op.name not in _T
        and op.name not in ("measure", "reset")
    )


def schedule(
    ops: Iterable[Op], takes_time: Callable[[Op], bool]
) -> list[tuple[int, int]]:
    """Return (start, end) of every gate in the earliest schedule.

    A gate takes one slot if `takes_time` says so, else none.  A conditional gate waits
    for its measurement.
    """
    wires: dict[int, int] = {}
    bits: dict[int, int] = {}
    times: list[tuple[int, int]] = []
    for op in ops:
        waits = [wires.get(wire, 0) for wire in op.wires]
        if op.condition is not None:
            waits.append(bits.get(op.condition, 0))
        start = max(waits)
        end = start + takes_time(op)
        wires.update((wire, end) for wire in op.wires)
        if op.bit is not None:
            bits[op.bit] = end
        times.append((start, end))
    return times


def depth(ops: Sequence[Op], takes_time: Callable[[Op], bool] | None = None) -> int:
    """Return the depth of the earliest schedule; by default every gate counts."""
    times = schedule(ops, takes_time or (lambda _: True))
    return max((end for _, end in times), default=0)


def _live(
    circuit: Circuit, takes_time: Callable[[Op], bool], counts: Callable[[Op], bool]
) -> tuple[int, ...]:
    """Return for each slot the time between its first and its last gate that counts."""
    times = schedule(circuit.ops, takes_time)
    live: list[int] = []
    for wire in range(circuit.operands, circuit.width):
        mine = [
            time
            for op, time in zip(circuit.ops, times, strict=True)
            if wire in op.wires and counts(op)
        ]
        live.append(max(0, mine[-1][0] - mine[0][1]) if mine else 0)
    return tuple(live)


def _residence(built: Built) -> tuple[int, int, int]:
    """Return (sum, longest) time in |2> on all ones, and the sum of the windows."""
    ops = built.fine.ops
    times = schedule(ops, _is_level2)
    state = dict.fromkeys(range(built.controls), 1)
    since: dict[int, int] = {}
    stays: Counter[int] = Counter()
    opened: dict[int, int] = {}
    window = 0
    for op, (start, end) in zip(ops, times, strict=True):
        opened.update((wire, start) for wire in op.enters)
        window += sum(end - opened.pop(wire) for wire in op.leaves)
        if op.name != "level2" or state.get(op.wires[0], 0) != op.level:
            continue
        wire = op.wires[1]
        before = state.get(wire, 0)
        state[wire] = _moved(before, op.action)
        if state[wire] == 2 and before != 2:
            since[wire] = end
        elif before == 2 and state[wire] != 2:
            stays[wire] += start - since.pop(wire)
    return stays.total(), max(stays.values(), default=0), window


def _moved(level: int, action: str | None) -> int:
    """Return the level of a wire after an action was done to it."""
    pair = {"x01": (0, 1), "x12": (1, 2)}.get(action or "", ())
    return sum(pair) - level if level in pair else level
