"""Better orders from a good one: solve one stretch of moves after the other exactly.

Between the two ends of a stretch only the values that it moves are open; what else is
there stays there.  A stretch is replaced where the exact search finds a cheaper way.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from placer.planner.cleanup.exact import search
from placer.planner.cleanup.game import Answer, Game, Target, replay
from placer.program.rewrite import Move

if TYPE_CHECKING:
    from collections.abc import Sequence

BY = "windows of an order, each solved by best-first search"


def improve(
    game: Game, answer: Answer, *, length: int, values: int, most: int, passes: int
) -> Answer:
    """Return an order that costs no more.

    `length` is the number of moves of a window, `values` the most values it may open,
    `most` the configurations looked at in each, `passes` how often all are tried.
    """
    if answer.moves is None or answer.cost is None:
        return answer
    moves = list(answer.moves)
    for number in range(passes):
        is_better = False
        at = (number % 2) * (length // 4)
        while at < len(moves):
            end = _reach(moves, at, length, values)
            new = _solved(game, moves, at, end, answer.limit, most)
            if new is not None:
                moves[at:end] = new
                is_better = True
            at += max(1, (end - at) // 2)
        if not is_better and number > 0:
            break
    cost, peak = replay(game, tuple(moves))
    return replace(answer, moves=tuple(moves), cost=cost, peak=peak, by=BY)


def _reach(moves: Sequence[Move], at: int, length: int, values: int) -> int:
    """Return where a window ends that moves at most so many values."""
    seen: set[int] = set()
    for end in range(at, min(len(moves), at + length)):
        action, number = moves[end]
        if action != "use":
            seen.add(number)
            if len(seen) > values:
                return max(end, at + 1)
    return min(len(moves), at + length)


def _solved(
    game: Game, moves: Sequence[Move], at: int, end: int, limit: int, most: int
) -> list[Move] | None:
    """Return a cheaper way through a window, if there is one."""
    live, records, passed = _state(game, moves[:at])
    after, left, uses = _state(game, moves[:end])
    opened = sorted({m.number for m in moves[at:end] if m.action != "use"})
    if not opened:
        return None
    local = {v: k for k, v in enumerate(opened)}
    still = live - set(opened)
    rows = []
    for v in opened:
        row = game.values[v]
        inputs = tuple(local[i] for i in row.inputs if i in local)
        first, last = row.window[0] - passed, row.window[1] - passed
        if not still.union(opened).issuperset(row.inputs):
            # Some input is not there in the whole window: it can only be dropped.
            first, last = 1, 0
        rows.append(replace(row, inputs=inputs, window=(first, last)))
    part = Game(
        tuple(rows),
        tuple(
            Target(tuple(local[v] for v in t.needs if v in local), t.time)
            for t in game.targets[passed:uses]
        ),
        kept=frozenset(local[v] for v in after if v in local),
        hold=game.hold,
        start=frozenset(local[v] for v in live if v in local),
        opened=frozenset(local[v] for v in records if v in local),
        left=frozenset(local[v] for v in left if v in local),
        others=sum(game.values[v].size for v in still),
    )
    old = tuple(
        Move(m.action, m.number - passed if m.action == "use" else local[m.number])
        for m in moves[at:end]
    )
    found = search(part, limit - part.others, most)
    if found.moves is None or found.cost is None or found.cost >= replay(part, old)[0]:
        return None
    return [
        Move(m.action, m.number + passed if m.action == "use" else opened[m.number])
        for m in found.moves
    ]


def _state(game: Game, moves: Sequence[Move]) -> tuple[set[int], set[int], int]:
    """Return what is there, which records are open, and how many targets are passed."""
    live, records, passed = set(game.start), set(game.opened), 0
    for action, number in moves:
        if action == "use":
            passed += 1
        elif action == "compute":
            live.add(number)
            records.discard(number)
        else:
            live.discard(number)
            if action == "drop":
                records.add(number)
    return live, records, passed
