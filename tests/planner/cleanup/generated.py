"""Sixty values and limits that bind: a set of generated games, kept by its seeds.

Three families: binary trees, chains of blocks (twenty blocks of three values, each
read by the next and every fifth by a target), and random graphs whose values read up to
three of the twelve before them.  Costs 5 to 20, sizes 1 to 3.
"""

from __future__ import annotations

import random

from placer.planner.cleanup.game import Game, Target, Value

FAMILIES = ("tree", "blocks", "random")
SHARES = (1.0, 0.9, 0.8, 0.65)
SEEDS = (0, 1)


def large(family: str, seed: int) -> Game:
    """Return a game of a family with about sixty values."""
    draw = random.Random(f"{family}:{seed}")
    if family == "tree":
        return _tree(draw)
    return _blocks(draw) if family == "blocks" else _random(draw)


def _value(draw: random.Random, inputs: tuple[int, ...]) -> Value:
    cost = draw.randint(5, 20)
    return Value(draw.choice([1, 1, 2, 3]), inputs, cost, cost)


def _tree(draw: random.Random) -> Game:
    # Numbered from the leaves: value 59 is the root, as in a heap read backwards.
    values = []
    for number in range(60):
        place = 59 - number
        inputs = tuple(59 - i for i in (2 * place + 2, 2 * place + 1) if i < 60)
        values.append(_value(draw, inputs))
    return Game(tuple(values), (Target((59,)),))


def _blocks(draw: random.Random) -> Game:
    values: list[Value] = []
    targets = []
    for block in range(20):
        first = len(values)
        below = (first - 1,) if block else ()
        values.append(_value(draw, below))
        values.append(_value(draw, below))
        values.append(_value(draw, (first, first + 1)))
        if block % 5 == 4:
            targets.append(Target((first + 2,)))
    return Game(tuple(values), tuple(targets))


def _random(draw: random.Random) -> Game:
    values: list[Value] = []
    for number in range(60):
        few = min(number, draw.choice([0, 1, 1, 2, 2, 3]))
        near = range(max(0, number - 12), number)
        values.append(
            _value(draw, tuple(sorted(draw.sample(near, min(few, len(near))))))
        )
    read = {i for value in values for i in value.inputs}
    ends = [v for v in range(60) if v not in read]
    targets = [Target((v,)) for v in ends]
    targets += [Target(tuple(sorted(draw.sample(ends, min(2, len(ends))))))]
    return Game(tuple(values), tuple(targets))
