"""The least cost within a limit of wires, by a best-first search over configurations.

A configuration says which values are there, which records are open and how many targets
are passed.  The search expands the one with the least cost so far plus `to_go`, so that
the first end it takes out is optimal; stopped early, that sum is a lower bound.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from placer.compiled import compiled, inner
from placer.planner.cleanup.arrays import LARGEST, Arrays, arrays_of, held, to_go
from placer.planner.cleanup.game import Answer, replay
from placer.program.rewrite import Move

if TYPE_CHECKING:
    from placer.planner.cleanup.game import Game
    from placer.program.rewrite import Action

BY = "best-first search over all configurations"
ACTIONS: tuple[Action, ...] = ("compute", "uncompute", "drop", "use")
FIRST_ROOM = 1 << 13
_FOUND, _NONE, _STOPPED = range(3)


def search(game: Game, limit: int, most: int) -> Answer:
    """Return the best order within `limit` wires, looking at `most` configurations.

    Without moves, `proven` says that no order exists; else the search was stopped.
    """
    if len(game.values) > LARGEST or not _holds_ends(game, limit):
        return Answer(limit, None, None, None, len(game.values) <= LARGEST, BY)
    begin = (
        sum(1 << v for v in game.start),
        sum(1 << v for v in game.opened),
    )
    arrays = arrays_of(game)
    room = min(most, FIRST_ROOM)
    while True:
        state, cost, codes = _search(arrays, begin, len(game.targets), limit, room)
        if state != _STOPPED or room >= most:
            break
        room = min(most, 8 * room)
    if state == _NONE:
        return Answer(limit, None, None, None, True, BY)
    if state == _STOPPED:
        return Answer(limit, None, None, int(cost), False, BY)
    moves = tuple(Move(ACTIONS[c & 3], c >> 2) for c in map(int, codes))
    found, peak = replay(game, moves)
    return Answer(limit, moves, found, found, True, BY, peak)


def _holds_ends(game: Game, limit: int) -> bool:
    return sum(game.values[v].size for v in game.kept) <= limit


@inner
def _slot(table: Any, live: Any, records: Any, passed: Any, key: Any) -> Any:
    """Return the place of a configuration in the hash table, taken or free."""
    mask = len(table) - 1
    mixed = key[0] * 0x1E3779B97F4A7C15 ^ key[1] * 0x2545F4914F6CDD1D
    mixed ^= key[2] * 0x369DEA0F31A53F85
    mixed ^= (mixed >> 29) & 0x7FFFFFFFF
    place = mixed & mask
    while True:
        number = table[place]
        if number < 0:
            return place
        if (
            live[number] == key[0]
            and records[number] == key[1]
            and passed[number] == key[2]
        ):
            return place
        place = (place + 1) & mask


@inner
def _push(heap: Any, size: int, total: int, number: int) -> int:
    at = size
    while at > 0:
        up = (at - 1) >> 1
        if heap[up, 0] < total or (heap[up, 0] == total and heap[up, 1] > number):
            break
        heap[at, 0], heap[at, 1] = heap[up, 0], heap[up, 1]
        at = up
    heap[at, 0], heap[at, 1] = total, number
    return size + 1


@inner
def _pop(heap: Any, size: int) -> int:
    """Take the first entry out; of equal totals the latest comes first."""
    size -= 1
    total, number = heap[size, 0], heap[size, 1]
    at = 0
    while True:
        down = 2 * at + 1
        if down >= size:
            break
        if down + 1 < size and (
            heap[down + 1, 0] < heap[down, 0]
            or (
                heap[down + 1, 0] == heap[down, 0] and heap[down + 1, 1] > heap[down, 1]
            )
        ):
            down += 1
        if heap[down, 0] > total or (heap[down, 0] == total and heap[down, 1] < number):
            break
        heap[at, 0], heap[at, 1] = heap[down, 0], heap[down, 1]
        at = down
    heap[at, 0], heap[at, 1] = total, number
    return size


@inner
def successor(game: Arrays, code: int, state: Any, wires: int, limit: int) -> Any:
    """Return live, records, passed and the added cost of a move, -1 if it cannot be.

    `state` is (live, records, passed), `wires` how many wires are held before.
    """
    live, records, passed = state
    v, action = code >> 2, code & 3
    bit = 1 << v
    if action == 3:
        if live & game.needs[v] != game.needs[v]:
            return live, records, passed, -1
        return (
            live,
            records,
            passed + 1,
            game.hold * (wires + game.others) * game.target_time[v],
        )
    if action == 2:
        if game.drop[v] < 0 or live & bit == 0 or records & bit != 0:
            return live, records, passed, -1
        cost = game.drop[v] + game.hold * (wires + game.others) * game.drop_time[v]
        return live & ~bit, records | bit, passed, cost
    is_there = live & bit != 0
    if (
        is_there != (action == 1)
        or live & game.inputs[v] != game.inputs[v]
        or passed < game.first[v]
        or passed > game.last[v]
    ):
        return live, records, passed, -1
    if action == 1:
        cost = game.uncompute[v] + game.hold * (wires + game.others) * game.time[v]
        return live & ~bit, records, passed, cost
    wires += game.size[v]
    if wires > limit:
        return live, records, passed, -1
    cost = game.compute[v] + game.hold * (wires + game.others) * game.time[v]
    if records & bit:
        cost += game.fix[v]
    return live | bit, records & ~bit, passed, cost


class _Pool(NamedTuple):
    """All configurations seen: what they are, the cheapest way to each, what is done.

    `table` is the hash table of their numbers, `heap` the open ones by (total, number).
    """

    live: Any
    records: Any
    passed: Any
    paid: Any
    parent: Any
    code: Any
    done: Any
    table: Any
    heap: Any


@inner
def _pool(most: int) -> _Pool:
    width = 16
    while width < 4 * most:
        width *= 2
    return _Pool(
        np.zeros(most + 1, dtype=np.int64),
        np.zeros(most + 1, dtype=np.int64),
        np.zeros(most + 1, dtype=np.int64),
        np.zeros(most + 1, dtype=np.int64),
        np.full(most + 1, -1, dtype=np.int64),
        np.zeros(most + 1, dtype=np.int64),
        np.zeros(most + 1, dtype=np.bool_),
        np.full(width, -1, dtype=np.int64),
        np.zeros((4 * most + 16, 2), dtype=np.int64),
    )


@inner
def _way(pool: _Pool, number: int) -> Any:
    """Return the codes of the moves that lead to a configuration."""
    length = 0
    at = number
    while pool.parent[at] >= 0:
        length += 1
        at = pool.parent[at]
    codes = np.zeros(length, dtype=np.int64)
    at = number
    for place in range(length - 1, -1, -1):
        codes[place] = pool.code[at]
        at = pool.parent[at]
    return codes


@inner
def _only_use(game: Arrays, state: Any, ends: int) -> bool:
    """Whether passing the next target is as good a move as any.

    So it is with nothing to pay for waiting, where no window shuts with it.
    """
    live, _, passed = state
    return (
        passed < ends
        and game.hold == 0
        and game.shut[passed] == 0
        and live & game.needs[passed] == game.needs[passed]
    )


@inner
def _expand(
    game: Arrays, pool: _Pool, number: int, size: int, used: int, limit: int, ends: int
) -> Any:
    """Add what one move reaches; return the new sizes, -1 where there is no room.

    Sizes are those of the heap and of the pool.
    """
    state = (pool.live[number], pool.records[number], pool.passed[number])
    wires = held(game, state[0])
    count = 4 * len(game.size)
    first = count if _only_use(game, state, ends) else 0
    for move in range(first, count + (state[2] < ends)):
        chosen = state[2] << 2 | 3 if move == count else move
        if move < count and move & 3 == 3:
            continue
        a, b, c, cost = successor(game, chosen, state, wires, limit)
        if cost < 0:
            continue
        way = pool.paid[number] + cost
        place = _slot(pool.table, pool.live, pool.records, pool.passed, (a, b, c))
        other = pool.table[place]
        if other >= 0 and (pool.done[other] or pool.paid[other] <= way):
            continue
        if used >= len(pool.live) - 1 or size + 1 >= len(pool.heap):
            return -1, used
        if other < 0:
            other = used
            used += 1
            pool.table[place] = other
            pool.live[other], pool.records[other], pool.passed[other] = a, b, c
        pool.paid[other] = way
        pool.parent[other] = number
        pool.code[other] = chosen
        size = _push(pool.heap, size, way + to_go(game, a, b, c), other)
    return size, used


@compiled
def _search(game: Arrays, begin: Any, ends: int, limit: int, most: int) -> Any:
    """Return how the search ended, a cost or bound, and the codes of the moves."""
    pool = _pool(most)
    pool.live[0], pool.records[0] = begin
    state = (pool.live[0], pool.records[0], 0)
    pool.table[_slot(pool.table, pool.live, pool.records, pool.passed, state)] = 0
    size = _push(pool.heap, 0, to_go(game, state[0], state[1], 0), 0)
    used = 1
    none = np.zeros(0, dtype=np.int64)
    while size > 0:
        total, number = pool.heap[0, 0], pool.heap[0, 1]
        size = _pop(pool.heap, size)
        if pool.done[number]:
            continue
        pool.done[number] = True
        if (
            pool.live[number] == game.kept
            and pool.records[number] == game.left
            and pool.passed[number] == ends
        ):
            return _FOUND, pool.paid[number], _way(pool, number)
        size, used = _expand(game, pool, number, size, used, limit, ends)
        if size < 0:
            return _STOPPED, total, none
    return _NONE, 0, none
