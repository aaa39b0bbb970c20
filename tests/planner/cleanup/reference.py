"""The cleanup game solved by brute force, and generated games; shares no solver code.

Configurations are triples (values there, open records, targets passed).  Dijkstra's
algorithm over all of them, written from the rules of the game alone.
"""

from __future__ import annotations

import heapq
import random
from collections import Counter

from placer.planner.cleanup.game import Game, Target, Value

Configuration = tuple[frozenset[int], frozenset[int], int]


def least_cost(game: Game, limit: int) -> int | None:
    """Return the least cost within a limit of wires, `None` where there is no way."""
    goal = (game.kept, frozenset[int](), len(game.targets))
    start: Configuration = (frozenset(), frozenset(), 0)
    best = {start: 0}
    waiting = [(0, 0, start)]
    count = 0
    while waiting:
        cost, _, state = heapq.heappop(waiting)
        if cost > best[state]:
            continue
        if state == goal:
            return cost
        for more, following in _moves(game, state, limit):
            if cost + more < best.get(following, 1 << 62):
                best[following] = cost + more
                count += 1
                heapq.heappush(waiting, (cost + more, count, following))
    return None


def _moves(game: Game, state: Configuration, limit: int):
    live, records, passed = state
    wires = sum(game.values[v].size for v in live)
    if passed < len(game.targets) and live.issuperset(game.targets[passed].needs):
        price = game.hold * wires * game.targets[passed].time
        yield price, (live, records, passed + 1)
    for v, value in enumerate(game.values):
        is_open = value.window[0] <= passed <= value.window[1]
        can_change = is_open and live.issuperset(value.inputs)
        if v in live:
            if can_change:
                price = value.uncompute + game.hold * wires * value.time
                yield price, (live - {v}, records, passed)
            if value.drop is not None and v not in records:
                price = value.drop + game.hold * wires * value.drop_time
                yield price, (live - {v}, records | {v}, passed)
        elif can_change and wires + value.size <= limit:
            price = value.compute + game.hold * (wires + value.size) * value.time
            price += value.fix if v in records else 0
            yield price, (live | {v}, records - {v}, passed)


def chain(length: int, *, measured: bool = False) -> Game:
    """Return a chain of values of which only the last is kept; every move costs 1."""
    drop = 1 if measured else None
    values = tuple(
        Value(1, (i - 1,) if i else (), drop=drop, fix=0) for i in range(length)
    )
    return Game(values, (), frozenset([length - 1]))


def tree(depth: int, draw: random.Random) -> Game:
    """Return a binary tree whose root is used once; costs and sizes are drawn."""
    values: list[Value] = []

    def grow(level: int) -> int:
        inputs = (grow(level - 1), grow(level - 1)) if level else ()
        cost = draw.randint(1, 9)
        values.append(Value(draw.choice([1, 1, 2]), inputs, cost, cost))
        return len(values) - 1

    root = grow(depth)
    return Game(tuple(values), (Target((root,)),))


def graph(draw: random.Random, largest: int, seen: Counter[str]) -> Game:
    """Return a random game; what kind it is, is counted in `seen`."""
    count = draw.randint(2, largest)
    targets = draw.randint(1, 4)
    measured = draw.random() < 0.4 and count <= 9
    windowed = draw.random() < 0.4
    hold = draw.choice([0, 0, 1, 2])
    values = []
    for number in range(count):
        few = draw.randint(0, min(number, 2))
        inputs = tuple(sorted(draw.sample(range(number), few)))
        first, last = 0, targets
        if windowed and draw.random() < 0.3:
            first = draw.randint(0, targets)
            last = draw.randint(first, targets)
        values.append(
            Value(
                draw.choice([1, 1, 1, 2, 3]),
                inputs,
                draw.randint(1, 9),
                draw.randint(1, 9),
                draw.randint(0, 3),
                (first, last),
                draw.randint(1, 4) if measured and draw.random() < 0.7 else None,
                draw.randint(0, 2),
                draw.randint(0, 2),
            )
        )
    rows = tuple(
        Target(
            tuple(sorted(draw.sample(range(count), draw.randint(1, min(2, count))))),
            draw.randint(0, 4),
        )
        for _ in range(targets)
    )
    kept = draw.sample(range(count), draw.choice([0, 0, 1, min(2, count)]))
    for name, drawn in (
        ("kept", any(values[v].inputs for v in kept)),
        ("measured", measured),
        ("windowed", windowed),
        ("several targets", targets > 1),
        ("waiting costs", hold > 0),
    ):
        seen[name] += drawn
    return Game(tuple(values), rows, frozenset(kept), hold)
