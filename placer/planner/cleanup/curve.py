"""The least cost of computing and cleaning up, for each number of workspace wires."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from placer.planner.cleanup import exact, greedy, windows
from placer.planner.cleanup.game import Answer

if TYPE_CHECKING:
    from placer.planner.cleanup.game import Game
    from placer.planner.work import Effort

PARTS = "every needed value computed and cleaned up once"


@dataclass(frozen=True, slots=True)
class Work:
    """How much is done for one limit, in counts.

    `states` are the configurations of the exact search, `runs` the greedy orders,
    `window_states` the configurations per window, `passes` over all windows, `points`
    the most limits of a curve.
    """

    states: int
    runs: int
    window_states: int
    passes: int
    points: int


WORK: dict[Effort, Work] = {
    "quick": Work(30_000, 4, 4_000, 2, 6),
    "normal": Work(1_000_000, 200, 60_000, 12, 24),
    "deep": Work(4_000_000, 2_000, 200_000, 30, 60),
}


def solve(game: Game, limit: int, effort: Effort = "normal") -> Answer:
    """Return the cheapest order found within `limit` wires, with a lower bound.

    The exact search is tried first; where it is stopped, greedy orders and windows
    give the order, and the bound is the larger of what the search has shown and the
    cost of every needed value computed and cleaned up once.
    """
    work = WORK[effort]
    answer = exact.search(game, limit, work.states)
    if answer.proven:
        return answer
    found = greedy.descend(game, limit, work.runs)
    found = windows.improve(
        game, found, length=40, values=14, most=work.window_states, passes=work.passes
    )
    parts = least(game)
    bound = parts if answer.bound is None else max(parts, answer.bound)
    is_met = found.cost is not None and found.cost == bound
    return replace(found, bound=bound, proven=is_met, by=f"{found.by}; bound: {PARTS}")


def least(game: Game) -> int:
    """Return a cost that no order of a whole game goes below, whatever the limit."""
    return sum(
        game.values[v].compute + (0 if v in game.kept else game.values[v].uncompute)
        for v in _used(game)
    )


def curve(game: Game, effort: Effort = "normal") -> tuple[Answer, ...]:
    """Return the answers from the fewest wires on that an order may fit.

    Limits grow to the peak of the order that keeps everything; an order found with
    fewer wires stands for more wires as well where it is cheaper.
    """
    full = greedy.at_end(game)
    top = full.peak if full.cost is not None else sum(v.size for v in game.values)
    answers: list[Answer] = []
    for limit in _limits(fewest(game), top, WORK[effort].points):
        answer = solve(game, limit, effort)
        last = answers[-1] if answers else None
        if last is not None and last.cost is not None:
            is_dearer = answer.cost is None or answer.cost > last.cost
            if is_dearer:
                answer = replace(answer, moves=last.moves, cost=last.cost)
                answer = replace(answer, peak=last.peak, proven=False)
        answers.append(answer)
    return tuple(answers)


def fewest(game: Game) -> int:
    """Return a number of wires that every order needs at some time."""
    values = game.values
    needs = [
        values[v].size + sum(values[i].size for i in values[v].inputs)
        for v in _used(game)
    ]
    needs += [sum(values[v].size for v in target.needs) for target in game.targets]
    return max(needs, default=0)


def _used(game: Game) -> list[int]:
    used = {v for target in game.targets for v in target.needs} | game.kept
    waiting = sorted(used)
    while waiting:
        for i in game.values[waiting.pop()].inputs:
            if i not in used:
                used.add(i)
                waiting.append(i)
    return sorted(used)


def _limits(low: int, high: int, most: int) -> list[int]:
    """Return at most so many limits between two, both included."""
    high = max(low, high)
    count = min(most, high - low + 1)
    if count == 1:
        return [high]
    return sorted({low + (high - low) * k // (count - 1) for k in range(count)})
