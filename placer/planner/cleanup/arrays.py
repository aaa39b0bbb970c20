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

    `closure[v]` holds v and everything it is computed from; `later[k]` what targets
    from k on need.  `drop[v]` is -1 where a value cannot be dropped.  `shut[k]` says
    that a window ends with target k, so that passing it takes something away.
    """

    size: Any
    inputs: Any
    closure: Any
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
    closure = [0] * count

    def close(v: int) -> int:
        if not closure[v]:
            closure[v] = 1 << v
            for i in values[v].inputs:
                closure[v] |= close(i)
        return closure[v]

    for v in range(count):
        close(v)
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
        closure=row(closure),
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


@inner
def to_go(game: Arrays, live: int, records: int, passed: int) -> int:
    """Return a cost that the way to the end cannot go below.

    What is there must be cleaned up from its inputs, so that these must be there too;
    what is needed or has a record must be computed, and cleaned up again.
    """
    # What may end as a record need not be cleaned up.
    wanted = live & ~game.kept & ~game.left
    wanted |= records & ~game.left
    wanted |= (game.later[passed] | game.kept) & ~live
    count = len(game.size)
    needed = 0
    for v in range(count):
        if wanted >> v & 1:
            needed |= game.closure[v]
    total = 0
    for v in range(count):
        if not needed >> v & 1:
            continue
        is_kept = (game.kept | game.left) >> v & 1
        if live >> v & 1:
            if not is_kept:
                total += game.uncompute[v]
        else:
            total += game.compute[v]
            if not is_kept:
                total += game.uncompute[v]
            if records >> v & 1:
                total += game.fix[v]
    return total


@inner
def held(game: Arrays, live: int) -> int:
    """Return how many wires hold the values of a mask."""
    total = 0
    for v in range(len(game.size)):
        if live >> v & 1:
            total += game.size[v]
    return total
