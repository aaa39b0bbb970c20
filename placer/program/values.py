"""The values of a program: what its scopes compute, from what, and who needs it.

In: a flat program.  Out: a graph of values and of the operations that are there for
good, in order, each with the values it needs.  A value is the content of workspace
wires; scopes that compute the same from the same share one value.  When to compute and
clean up is decided elsewhere (`planner.cleanup`), and written out by `rewrite`.
"""

from __future__ import annotations

from bisect import bisect_left
from dataclasses import dataclass
from typing import TYPE_CHECKING

import networkx as nx

from placer.program.claims import Replay
from placer.program.making import Making, Makings, makings
from placer.program.rewrite import Move
from placer.program.roles import has_phase, written

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from placer.program.model import Program


@dataclass(frozen=True, slots=True)
class Value:
    """What workspace wires hold between their compute and their cleanup.

    `steps` are the operations of the program that compute it, in order; `wires` the
    workspace wires they write, as the program numbers them, of which those at the
    places in `spare` are |0> before and after.  `inputs` are other values that it is
    computed from.  Its other inputs are as it needs them while at least `window[0]`
    and at most `window[1]` uses have been passed.  `is_plain` says that it comes
    without phases, so that it may be dropped by measurement.  `line` is where it is
    first computed.
    """

    name: str
    steps: tuple[int, ...]
    wires: tuple[int, ...]
    spare: frozenset[int]
    inputs: tuple[int, ...]
    window: tuple[int, int]
    is_plain: bool
    line: int

    @property
    def size(self) -> int:
        """How many wires hold it."""
        return len(self.wires) - len(self.spare)


@dataclass(frozen=True, slots=True)
class Use:
    """Operations that stay where they are, one after the other, and what they need."""

    steps: tuple[int, ...]
    needs: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class ValueGraph:
    """Values and uses of a program.

    `held[step]` maps each workspace wire that a step touches to the value it belongs
    to there, and its place among the wires of that value.  `written` is the program's
    own order.
    """

    values: tuple[Value, ...]
    uses: tuple[Use, ...]
    held: Mapping[int, Mapping[int, tuple[int, int]]]
    written: tuple[Move, ...] = ()


def values_of(program: Program) -> ValueGraph:
    """Return the values of a program and the uses it makes of them."""
    if not program.scopes:
        return ValueGraph((), (), {})
    found = makings(program)
    windows = _windows(program, found)
    same = _same(program, found, windows)
    first = sorted(set(same))
    number = {making: k for k, making in enumerate(first)}
    value_of = [number[n] for n in same]
    held = {
        step: {
            wire: (value_of[n], found.makings[n].wires.index(wire))
            for wire, n in owners.items()
        }
        for step, owners in found.owners.items()
    }
    uses, passed = _uses(found, held, {w for n in first for w in windows[n]})
    names = _names(program, [found.makings[n] for n in first])
    spare = _spare(program, [found.makings[n] for n in first])
    values = tuple(
        Value(
            name=names[k],
            steps=tuple(found.makings[n].steps),
            wires=tuple(found.makings[n].wires),
            spare=spare[k],
            inputs=tuple(sorted({value_of[i] for i in found.makings[n].inputs})),
            window=(
                passed.index(windows[n][0]),
                bisect_left(passed, windows[n][1] + 1) - 1,
            ),
            is_plain=not any(
                has_phase(program.operations[s]) for s in found.makings[n].steps
            ),
            line=program.operations[found.makings[n].steps[0]].place.line,
        )
        for k, n in enumerate(first)
    )
    order = _written(program, found, value_of, values, uses)
    return ValueGraph(values, uses, held, order)


def _written(
    program: Program,
    found: Makings,
    value_of: Sequence[int],
    values: Sequence[Value],
    uses: Sequence[Use],
) -> tuple[Move, ...]:
    """Return the order of the source, each value there once at a time."""
    moves: list[Move] = []
    there: dict[int, int] = {}
    made = {making.steps[0]: value_of[n] for n, making in enumerate(found.makings)}
    first_of = {use.steps[0]: k for k, use in enumerate(uses)}
    cleaned: dict[int, list[int]] = {}
    for n, making in enumerate(found.makings):
        begin = program.scopes[making.home].cleanup[0]
        cleaned.setdefault(begin, []).append(value_of[n])

    def compute(value: int) -> None:
        there[value] = there.get(value, 0) + 1
        if there[value] == 1:
            moves.append(Move("compute", value))

    def clean(value: int) -> None:
        if there[value] > 1:
            there[value] -= 1
            return
        again = [i for i in values[value].inputs if not there.get(i)]
        for i in again:
            compute(i)
        there[value] = 0
        moves.append(Move("uncompute", value))
        for i in reversed(again):
            clean(i)

    for index in range(len(program.operations) + 1):
        for value in reversed(cleaned.get(index, ())):
            clean(value)
        if index in made:
            compute(made[index])
        if index in first_of:
            moves.append(Move("use", first_of[index]))
    return tuple(moves)


def _windows(program: Program, found: Makings) -> list[tuple[int, int]]:
    """Return per making between how many kept operations its outside is the same."""
    writes: dict[int, list[int]] = {}
    for position, step in enumerate(found.kept):
        for wire in written(program.operations[step]):
            writes.setdefault(wire, []).append(position)
    windows = []
    for making in found.makings:
        begin, end = 0, len(found.kept)
        for wire in making.outside:
            rows = writes.get(wire, [])
            at = bisect_left(rows, making.first)
            if at > 0:
                begin = max(begin, rows[at - 1] + 1)
            if at < len(rows):
                end = min(end, rows[at])
        windows.append((begin, end))
    return windows


def _same(
    program: Program, found: Makings, windows: Sequence[tuple[int, int]]
) -> list[int]:
    """Return for each making the first one that makes the same from the same."""
    graph = nx.DiGraph()
    graph.add_nodes_from(range(len(found.makings)))
    graph.add_edges_from(
        (i, n) for n, making in enumerate(found.makings) for i in sorted(making.inputs)
    )
    known: dict[object, int] = {}
    same = list(range(len(found.makings)))
    for n in nx.lexicographical_topological_sort(graph):
        making = found.makings[n]
        rows = []
        for step in making.steps:
            operation = program.operations[step]
            owners = found.owners[step]
            where = tuple(
                _where(wire, owners.get(wire), n, found.makings, same)
                for wire in operation.wires
            )
            rows.append(
                (
                    operation.kind,
                    operation.name,
                    operation.params,
                    operation.inverse,
                    operation.signature,
                    where,
                )
            )
        same[n] = known.setdefault((windows[n], tuple(rows)), n)
    return same


def _where(
    wire: int, owner: int | None, n: int, rows: Sequence[Making], same: Sequence[int]
) -> tuple[int, int]:
    """Name a wire so that twins name theirs alike."""
    if owner is None:
        return -2, wire
    place = rows[owner].wires.index(wire)
    return (-1, place) if owner == n else (same[owner], place)


def _uses(
    found: Makings,
    held: Mapping[int, Mapping[int, tuple[int, int]]],
    borders: set[int],
) -> tuple[tuple[Use, ...], list[int]]:
    """Return the uses, and how many kept operations lie before each and at the end."""
    uses: list[Use] = []
    passed = []
    for position, step in enumerate(found.kept):
        needs = tuple(sorted({value for value, _ in held[step].values()}))
        if uses and uses[-1].needs == needs and position not in borders:
            uses[-1] = Use((*uses[-1].steps, step), needs)
        else:
            passed.append(position)
            uses.append(Use((step,), needs))
    return tuple(uses), [*passed, len(found.kept)]


def _names(program: Program, rows: Sequence[Making]) -> list[str]:
    names: list[str] = []
    for making in rows:
        wires = sorted(making.wires)
        register = program.register_at(wires[0])
        end = register.first + register.width
        if wires == list(range(register.first, end)):
            name = register.name
        elif len(wires) == 1:
            name = program.wire_names[wires[0]]
        else:
            first, last = program.wire_names[wires[0]], program.wire_names[wires[-1]]
            name = f"{first}..{last}"
        twice = sum(1 for other in names if other.partition("'")[0] == name)
        names.append(name if not twice else f"{name}'{twice + 1}")
    return names


def _spare(program: Program, rows: Sequence[Making]) -> list[frozenset[int]]:
    """Return per making the places of wires that are back in |0> when it is made."""
    result: list[frozenset[int]] = [frozenset()] * len(rows)
    last = {row.steps[-1]: k for k, row in enumerate(rows) if len(row.wires) > 1}
    if not last:
        return result
    replay = Replay(program, frozenset())
    for operation in program.operations:
        replay.run(operation)
        if operation.index in last:
            k = last[operation.index]
            bits = [replay.bits[wire] for wire in rows[k].wires]
            back = frozenset(p for p, b in enumerate(bits) if not b.any())
            # A value that is never anything but 0 here still has wires.
            result[k] = back if len(back) < len(bits) else frozenset()
    return result
