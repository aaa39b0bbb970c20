"""Which order of computing and cleaning up is worth planning on the device.

In: a program as written, its values, a device.  Out: the game that stands for it, with
the recipes' own errors and times, the curve of least costs, and a few orders to plan:
as written, all at once, all at the end, and points of the curve.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from placer.planner.cleanup import game as games
from placer.planner.cleanup.curve import curve
from placer.planner.cleanup.greedy import at_end, at_once
from placer.planner.profile import profile_of
from placer.problem import choices_for
from placer.program.inverse import undone
from placer.tables import device_tables

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.device.model import Device
    from placer.planner.cleanup.game import Answer, Game
    from placer.planner.profile import Profile
    from placer.planner.work import Effort
    from placer.program.model import Operation, Program
    from placer.program.rewrite import Move
    from placer.program.values import ValueGraph
    from placer.tables import Tables

AS_WRITTEN = "as written"
AT_ONCE = "at once"
AT_END = "at end"


@dataclass(frozen=True, slots=True)
class Order:
    """An order to plan; without moves it is the program's own."""

    name: str
    moves: tuple[Move, ...]
    wires: int
    computed: int


class Pricing:
    """Nominal error and time of operations, by their cheapest recipe.

    Costs are those of median sites and links, with the part of a swap that a gate
    costs on the way (see 'Moves' in DEVELOPERS.md) for one link of distance.
    """

    def __init__(
        self, program: Program, device: Device, tables: Tables, only: Sequence[str]
    ) -> None:
        self.program = program
        self.device = device
        self.only = only
        self.known: dict[object, tuple[int, int]] = {}
        self.tables = tables
        usable = [s.id for s in device.sites if s.in_service]
        self.one = _middle([int(tables.one[p]) for p in usable])
        self.tee = _middle([int(tables.tee[p]) for p in usable])
        self.read = _middle([int(tables.read[p]) for p in usable])
        self.wipe = _middle([int(tables.wipe[p]) for p in usable])
        self.rate = _middle([int(tables.rate[p]) for p in usable])
        links = tables.two[tables.two >= 0]
        self.two = _middle([int(x) for x in links])
        high = tables.two2[tables.two2 >= 0]
        self.two2 = _middle([int(x) for x in high]) if len(high) else 0
        self.step = _middle([int(x) for x in tables.step[tables.step >= 0]])

    def of(self, operation: Operation) -> tuple[int, int]:
        """Return error and time of the cheapest recipe of an operation."""
        key = (
            operation.kind,
            operation.name,
            operation.params,
            operation.inverse,
            operation.signature,
            len(operation.wires),
        )
        if key not in self.known:
            rows = []
            for built in choices_for(operation, self.device, self.program, self.only):
                profile = profile_of(built, self.tables)
                rows.append((self._error(profile), profile.base_ns))
            self.known[key] = min(rows)
        return self.known[key]

    def _error(self, profile: Profile) -> int:
        gates = sum(
            pair.count * ((self.two2 if pair.mask[0] else self.two) + self.step)
            for pair in profile.pairs
        )
        waits = sum(profile.live_ns) * self.rate
        return (
            gates
            + sum(profile.ones) * self.one
            + sum(profile.tees) * self.tee
            + sum(profile.reads) * self.read
            + waits
        )


def _middle(rows: list[int]) -> int:
    return sorted(rows)[(len(rows) - 1) // 2] if rows else 0


def game_of(
    program: Program, graph: ValueGraph, device: Device, only: Sequence[str] = ()
) -> games.Game:
    """Return the game of a program's values, priced for a device."""
    tables = device_tables(device)
    price = Pricing(program, device, tables, only)
    able = device.capabilities
    can_drop = able.mid_circuit_measurement and able.conditional_ns is not None
    values = []
    for value in graph.values:
        forth = [price.of(program.operations[s]) for s in value.steps]
        back = [price.of(_undoing(program.operations[s])) for s in value.steps]
        drop = None
        if can_drop and value.is_plain:
            drop = value.size * (price.read + 2 * price.one + price.wipe)
        values.append(
            games.Value(
                size=value.size,
                inputs=value.inputs,
                compute=sum(error for error, _ in forth),
                uncompute=sum(error for error, _ in back),
                time=sum(time for _, time in forth),
                window=value.window,
                drop=drop,
                drop_time=tables.one_ns + tables.readout_ns,
                fix=value.size * price.one,
            )
        )
    targets = tuple(
        games.Target(use.needs, _length(program, use.steps, price))
        for use in graph.uses
    )
    return games.Game(tuple(values), targets, hold=price.rate)


def _undoing(operation: Operation) -> Operation:
    name, params, inverse, signature = undone(
        operation.kind,
        operation.name,
        operation.params,
        operation.inverse,
        operation.signature,
    )
    return replace(
        operation, name=name, params=params, inverse=inverse, signature=signature
    )


def _length(program: Program, steps: Sequence[int], price: Pricing) -> int:
    """Return how long steps take when each starts as soon as its wires are free."""
    ready: dict[int, int] = {}
    for step in steps:
        operation = program.operations[step]
        begin = max((ready.get(w, 0) for w in operation.wires), default=0)
        end = begin + price.of(operation)[1]
        ready.update(dict.fromkeys(operation.wires, end))
    return max(ready.values(), default=0)


def orders_of(
    program: Program, game: Game, graph: ValueGraph, effort: Effort
) -> tuple[list[Order], tuple[Answer, ...]]:
    """Return the orders to plan, each once, and the curve of least costs.

    The program's own order comes first, then the two extremes, then the curve from
    few wires to many; an order that is there already, but for moves that have nothing
    to do with each other, is not listed again.
    """
    answers = curve(game, effort)
    orders = [Order(AS_WRITTEN, (), *_size(game, graph.written))]
    touched = _touched(program, graph)
    seen = {_normal(graph.written, touched)}
    named = [(AT_ONCE, at_once(game)), (AT_END, at_end(game))]
    named += [(f"within {_wires(a.peak)}", a) for a in answers]
    for name, answer in named:
        if answer.moves is None:
            continue
        normal = _normal(answer.moves, touched)
        if normal in seen:
            continue
        seen.add(normal)
        taken = {order.name for order in orders}
        if name in taken:
            continue
        orders.append(order_of(game, name, answer.moves))
    return orders, answers


def _wires(number: int) -> str:
    return f"{number} wire" + ("" if number == 1 else "s")


Touched = dict[tuple[bool, int], frozenset[object]]


def _touched(program: Program, graph: ValueGraph) -> Touched:
    """Return what each use and each value touches: wires, and values by number."""
    rows: Touched = {}
    for is_use, number, steps in (
        *((True, k, use.steps) for k, use in enumerate(graph.uses)),
        *((False, k, value.steps) for k, value in enumerate(graph.values)),
    ):
        things: set[object] = set() if is_use else {("value", number)}
        for step in steps:
            held = graph.held[step]
            for wire in program.operations[step].wires:
                things.add(("value", held[wire][0]) if wire in held else int(wire))
        rows[is_use, number] = frozenset(things)
    return rows


def _normal(moves: Sequence[Move], touched: Touched) -> tuple[tuple[Move, ...], ...]:
    """Return the moves in layers: each as early as what it shares things with allows.

    Orders with the same layers give the same program.
    """
    layer_of: dict[object, int] = {}
    layers: list[list[Move]] = []
    for made in moves:
        things = touched[made.action == "use", made.number]
        layer = max((layer_of.get(thing, 0) for thing in things), default=0)
        if layer == len(layers):
            layers.append([])
        layers[layer].append(made)
        layer_of.update(dict.fromkeys(things, layer + 1))
    return tuple(tuple(sorted(layer)) for layer in layers)


def order_of(game: Game, name: str, moves: Sequence[Move]) -> Order:
    """Return an order that is given by its moves."""
    return Order(name, tuple(moves), *_size(game, moves))


def _size(game: Game, moves: Sequence[Move]) -> tuple[int, int]:
    """Return the most wires that hold values at a time, and how many are computed."""
    held = most = computed = 0
    for action, number in moves:
        if action == "compute":
            computed += 1
            held += game.values[number].size
        elif action != "use":
            held -= game.values[number].size
        most = max(most, held)
    return most, computed
