"""A game as whole-number arrays, and the search step that compiled searches share."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from placer.compiled import inner

if TYPE_CHECKING:
    from placer.planner.cleanup.game import Game

LARGEST = 62
"""Values that fit into one mask."""


class Arrays(NamedTuple):
    """A game in arrays: per value its masks, costs and window; per position its needs.

    `order` lists the values so that each comes before what it is computed from;
    `later[k]` is what targets from k on need, `waits[k]` what waiting for them costs
    at least.  `least_compute` and `least_uncompute` are costs with the wait of the
    value's own wires and its inputs'.  `drop[v]` is -1 where a value cannot be dropped.
    `shut[k]` says that a window ends with target k, so that passing it takes something
    away.
    """

    size: Any
    inputs: Any
    order: Any
    least_compute: Any
    least_uncompute: Any
    waits: Any
    compute: Any
    uncompute: Any
    time: Any
    first: Any
    last: Any
    drop: Any
    drop_time: Any
    fix: Any
    needs: Any
    later: Any
    target_time: Any
    shut: Any
    kept: int
    hold: int
    left: int
    others: int


def arrays_of(game: Game) -> Arrays:
    """Return the arrays of a game with at most `LARGEST` values."""
    values, targets = game.values, game.targets
    count, ends = len(values), len(targets)
    inputs = [sum(1 << i for i in v.inputs) for v in values]
    moves = [least_wait(game, v) for v in range(count)]
    waits = [0] * (ends + 1)
    for k in range(ends - 1, -1, -1):
        held_then = game.others + sum(values[v].size for v in set(targets[k].needs))
        waits[k] = waits[k + 1] + game.hold * held_then * targets[k].time
    needs = [sum(1 << v for v in t.needs) for t in targets]
    later = [0] * (ends + 1)
    for k in range(ends - 1, -1, -1):
        later[k] = later[k + 1] | needs[k]
    shut = [0] * (ends + 1)
    for value in values:
        if value.window[1] < ends:
            shut[value.window[1]] = 1

    def row(items: list[int]) -> Any:
        return np.array(items, dtype=np.int64)

    return Arrays(
        size=row([v.size for v in values]),
        inputs=row(inputs),
        order=row(inputs_first(game)[::-1]),
        least_compute=row([v.compute + w for v, w in zip(values, moves, strict=True)]),
        least_uncompute=row(
            [v.uncompute + w for v, w in zip(values, moves, strict=True)]
        ),
        waits=row(waits),
        compute=row([v.compute for v in values]),
        uncompute=row([v.uncompute for v in values]),
        time=row([v.time for v in values]),
        first=row([v.window[0] for v in values]),
        last=row([v.window[1] for v in values]),
        drop=row([-1 if v.drop is None else v.drop for v in values]),
        drop_time=row([v.drop_time for v in values]),
        fix=row([v.fix for v in values]),
        needs=row(needs),
        later=row(later),
        target_time=row([t.time for t in targets]),
        shut=row(shut),
        kept=sum(1 << v for v in game.kept),
        hold=game.hold,
        left=sum(1 << v for v in game.left),
        others=game.others,
    )


def inputs_first(game: Game) -> list[int]:
    """Return the values so that each comes after what it is computed from."""
    order: list[int] = []
    done: set[int] = set()
    for root in range(len(game.values)):
        waiting = [root]
        while waiting:
            v = waiting[-1]
            missing = [i for i in game.values[v].inputs if i not in done]
            waiting += missing
            if not missing:
                waiting.pop()
                if v not in done:
                    done.add(v)
                    order.append(v)
    return order


def least_wait(game: Game, value: int) -> int:
    """Return what waiting costs at least while a value is computed or uncomputed.

    Its own wires and those of its inputs are held then, whatever else is.
    """
    row = game.values[value]
    held_then = game.others + row.size + sum(game.values[i].size for i in row.inputs)
    return game.hold * held_then * row.time


@inner
def to_go(game: Arrays, live: int, records: int, passed: int) -> int:
    """Return a cost that the way to the end cannot go below.

    What is there must be cleaned up from its inputs, so that these must be there too;
    what is needed or has a record must be computed, and cleaned up again.  What is
    there and may stay, as itself or as a record, asks nothing of its inputs.
    """
    stays = game.kept | game.left
    needed = live & ~stays
    needed |= records & ~game.left
    needed |= (game.later[passed] | game.kept) & ~live
    total: int = game.waits[passed]
    for v in game.order:
        bit = 1 << v
        if needed & bit == 0 or live & stays & bit != 0:
            continue
        needed |= game.inputs[v]
        if live & bit == 0:
            total += game.least_compute[v]
            if records & bit:
                total += game.fix[v]
        if stays & bit == 0:
            total += game.least_uncompute[v]
    return total


@inner
def held(game: Arrays, live: int) -> int:
    """Return how many wires hold the values of a mask."""
    total = 0
    for v in range(len(game.size)):
        if live >> v & 1:
            total += game.size[v]
    return total
