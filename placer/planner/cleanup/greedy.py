"""An order for any game: compute what is needed next, and make room when there is none.

What goes first when room is short is what is needed again last; a value whose inputs
are gone has them computed again, if there is room for that.  A random tie-break per run
gives different orders; the cheapest is kept.  Finds orders, proves nothing.
"""

from __future__ import annotations

import random
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from placer.planner.cleanup.arrays import inputs_first
from placer.planner.cleanup.game import Answer, replay
from placer.program.rewrite import Move

if TYPE_CHECKING:
    from collections.abc import Iterable

    from placer.planner.cleanup.game import Game

BY = "greedy orders"
DEEPEST = 60
MOST_MOVES = 4_000
MOST_CALLS = 6_000


class _Stuck(Exception):  # noqa: N818 - a run that ends early, no error
    """There is no room for what is needed."""


def descend(game: Game, limit: int, runs: int, seed: int = 0) -> Answer:
    """Return the cheapest of some greedy orders within `limit` wires."""
    best: Answer | None = None
    for number in range(runs):
        moves = _Run(game, limit, random.Random(f"{seed}:{number}"), number).play()
        if moves is None:
            continue
        cost, peak = replay(game, moves)
        if best is None or best.cost is None or cost < best.cost:
            best = Answer(limit, moves, cost, None, False, BY, peak)
    return best or Answer(limit, None, None, None, False, BY)


def at_once(game: Game) -> Answer:
    """Return the order that cleans up every value right after each use."""
    return _fixed(game, is_eager=True, by="all at once")


def at_end(game: Game) -> Answer:
    """Return the order that keeps every value until nothing needs it any more.

    A value whose window shuts before that is cleaned up, and computed again.
    """
    return _fixed(game, is_eager=False, by="all at the end")


def _fixed(game: Game, *, is_eager: bool, by: str) -> Answer:
    most = sum(value.size for value in game.values)
    run = _Run(game, most, random.Random(0), 0)
    run.is_eager = is_eager
    run.keeps_all = not is_eager
    moves = run.play()
    if moves is None:
        return Answer(most, None, None, None, False, by)
    cost, peak = replay(game, moves)
    return Answer(peak, moves, cost, None, False, by, peak)


@dataclass(slots=True)
class _Run:
    """One run: what is there, what has been done, and how taste decides."""

    game: Game
    limit: int
    random: random.Random
    number: int
    live: set[int] = field(default_factory=set)
    records: set[int] = field(default_factory=set)
    moves: list[Move] = field(default_factory=list)
    passed: int = 0
    calls: int = 0
    is_eager: bool = False
    keeps_all: bool = False
    depth: list[int] = field(default_factory=list)
    wanted: list[int] = field(default_factory=list)

    def __post_init__(self) -> None:
        """Find how much lies below each value, and what each target needs somehow."""
        values = self.game.values
        below = [0] * len(values)
        self.depth = [0] * len(values)
        for v in inputs_first(self.game):
            below[v] = 1 << v
            for i in values[v].inputs:
                below[v] |= below[i]
                self.depth[v] = max(self.depth[v], self.depth[i])
            self.depth[v] += 1
        for target in self.game.targets:
            mask = 0
            for v in target.needs:
                mask |= below[v]
            self.wanted.append(mask)

    def play(self) -> tuple[Move, ...] | None:
        """Return the moves of a whole game, `None` where it gets stuck."""
        try:
            for number, target in enumerate(self.game.targets):
                self._tidy(number)
                for value in sorted(target.needs, key=self._depth, reverse=True):
                    self._reach(value, frozenset(target.needs), 0)
                self._shut(number, frozenset(target.needs))
                self.moves.append(Move("use", number))
                self.passed += 1
                if self.is_eager:
                    self._finish(frozenset())
            for value in sorted(self.game.kept):
                self._reach(value, self.game.kept, 0)
            self._finish(self.game.kept)
        except _Stuck:
            return None
        return tuple(self.moves)

    def _depth(self, value: int) -> int:
        return self.depth[value]

    def _held(self) -> int:
        return sum(self.game.values[v].size for v in self.live)

    def _do(self, action: str, value: int) -> None:
        if len(self.moves) > MOST_MOVES:
            raise _Stuck
        if action == "compute":
            self.live.add(value)
            self.moves.append(Move("compute", value))
        else:
            self.live.discard(value)
            self.moves.append(Move("uncompute", value))

    def _is_open(self, value: int) -> bool:
        first, last = self.game.values[value].window
        return first <= self.passed <= last

    def _reach(self, value: int, pinned: frozenset[int], depth: int) -> None:
        """Compute a value and, before it, what it is computed from."""
        if value in self.live:
            return
        self.calls += 1
        if self.calls > MOST_CALLS:
            raise _Stuck
        if depth > DEEPEST or not self._is_open(value):
            raise _Stuck
        row = self.game.values[value]
        pinned |= {value, *row.inputs}
        for i in sorted(row.inputs, key=self._depth, reverse=True):
            self._reach(i, pinned, depth + 1)
        self._room(row.size, pinned, depth)
        if not self.live.issuperset(row.inputs):
            raise _Stuck
        # Making room may have computed it already.
        if value not in self.live:
            self._do("compute", value)

    def _room(self, size: int, pinned: frozenset[int], depth: int) -> None:
        while self._held() + size > self.limit:
            for value in self._unwanted(pinned):
                if self._remove(value, pinned, depth):
                    break
            else:
                raise _Stuck

    def _unwanted(self, pinned: Iterable[int]) -> list[int]:
        """Return what may go, what is needed again last (or cheapest) first."""
        free = sorted(self.live - set(pinned))
        noise = 0.0 if self.number == 0 else 0.6

        def rank(value: int) -> tuple[float, int]:
            row = self.game.values[value]
            ready = all(i in self.live for i in row.inputs)
            needed = any(value in self.game.values[w].inputs for w in self.live)
            price = (row.compute + row.uncompute) / row.size
            wait = self._next_need(value)
            score = (
                wait - 0.05 * price + self.random.uniform(-1, 1) * noise * (wait + 1)
            )
            return (score + (1000 if ready and not needed else 0), value)

        return sorted(free, key=rank, reverse=True)

    def _next_need(self, value: int) -> float:
        """Return how many targets lie before the next that needs a value somehow."""
        for number in range(self.passed, len(self.game.targets)):
            if self.wanted[number] >> value & 1:
                return float(number - self.passed)
        return float(len(self.game.targets) + 1)

    def _remove(self, value: int, pinned: frozenset[int], depth: int) -> bool:
        """Clean up a value; its inputs are computed again where they are gone."""
        if depth > DEEPEST or not self._is_open(value):
            return False
        inputs = self.game.values[value].inputs
        if not self.live.issuperset(inputs):
            saved = (set(self.live), len(self.moves))
            try:
                for i in inputs:
                    self._reach(i, pinned | {value, *inputs}, depth + 20)
            except _Stuck:
                self.live = saved[0]
                del self.moves[saved[1] :]
                return False
        if value not in self.live or not self.live.issuperset(inputs):
            return False
        self._do("uncompute", value)
        return True

    def _tidy(self, number: int) -> None:
        """Clean up what no later target needs in any way, unless all is kept."""
        if self.keeps_all:
            return
        later: set[int] = set(self.game.kept)
        for target in self.game.targets[number:]:
            later.update(target.needs)
        waiting = list(later)
        while waiting:
            for i in self.game.values[waiting.pop()].inputs:
                if i not in later:
                    later.add(i)
                    waiting.append(i)
        for value in sorted(self.live - later, key=self._depth, reverse=True):
            inputs = self.game.values[value].inputs
            if all(i in self.live for i in inputs) and self._is_open(value):
                self._do("uncompute", value)

    def _shut(self, number: int, needs: frozenset[int]) -> None:
        """Clean up what could not be cleaned up once this target is passed."""
        ending = {
            v for v in self.live - needs if self.game.values[v].window[1] == number
        }
        # Whatever is computed from an ending value must go before it.
        self._clear(ending, needs)

    def _clear(self, values: set[int], kept: frozenset[int]) -> None:
        """Clean up values, those first that most others lie below."""
        for value in sorted(values, key=self._depth, reverse=True):
            gone = value not in self.live or value in kept
            if not gone and not self._remove(value, kept | {value}, 0):
                raise _Stuck

    def _finish(self, kept: frozenset[int]) -> None:
        """Clean up until nothing else is there, what was computed again as well."""
        while self.live - kept:
            self._clear(self.live - kept, kept)
