"""The game behind cleanup: compute and clean up values so that each is there when used.

Values lie on workspace wires, targets are passed in order.  A value may be computed or
uncomputed while its inputs are there and its window is open; it may be dropped by
measurement at any time, which leaves a record that its next computing closes.  At the
end nothing is there but what is to be kept, and no record is open.  No solver here.
"""

from __future__ import annotations

from dataclasses import dataclass

from placer.program.rewrite import Move


@dataclass(frozen=True, slots=True)
class Value:
    """A value of the game.

    `size` is the number of wires that hold it (at least 1), `inputs` the values that
    must be there when it is computed or uncomputed.  Costs are whole numbers, `time` is
    what computing takes in ns (uncomputing takes as long).  It can be computed or
    uncomputed while at least `window[0]` and at most `window[1]` targets are passed.
    `drop` is the cost of measuring it away, `None` where that cannot be; `fix` what
    closing the record adds to its next computing.
    """

    size: int = 1
    inputs: tuple[int, ...] = ()
    compute: int = 1
    uncompute: int = 1
    time: int = 0
    window: tuple[int, int] = (0, 1 << 30)
    drop: int | None = None
    drop_time: int = 0
    fix: int = 0


@dataclass(frozen=True, slots=True)
class Target:
    """Something that is done once, with `needs` there; it takes `time` ns."""

    needs: tuple[int, ...] = ()
    time: int = 0


@dataclass(frozen=True, slots=True)
class Game:
    """Values, targets in order, what is there at the end, and the price of waiting.

    `hold` is the cost of one wire that holds a value for one ns; moves happen one
    after the other.  A value being computed or cleaned up is held as well.

    A part of a longer game may start with values there (`start`) and records open
    (`opened`), end with records open (`left`), and have `others`: further wires that
    are held all the time and count neither for the limit nor as values.
    """

    values: tuple[Value, ...]
    targets: tuple[Target, ...] = ()
    kept: frozenset[int] = frozenset()
    hold: int = 0
    start: frozenset[int] = frozenset()
    opened: frozenset[int] = frozenset()
    left: frozenset[int] = frozenset()
    others: int = 0


@dataclass(frozen=True, slots=True)
class Answer:
    """The moves found within a limit of wires, and what is known about them.

    `moves` and `cost` are `None` where no order was found; then `proven` says that
    none exists.  `bound` is a cost that no order goes below, `by` who says so.
    `peak` is the largest number of wires that hold values at a time.
    """

    limit: int
    moves: tuple[Move, ...] | None
    cost: int | None
    bound: int | None
    proven: bool
    by: str
    peak: int = 0


def replay(game: Game, moves: tuple[Move, ...]) -> tuple[int, int]:
    """Return cost and peak of moves.

    Raises
    ------
    ValueError
        If a move breaks the rules, or something is wrong at the end.
    """
    live = set(game.start)
    records = set(game.opened)
    passed = cost = 0
    peak = sum(game.values[v].size for v in live)
    for place, (action, number) in enumerate(moves):
        if action == "use":
            target = game.targets[number]
            if number != passed or not live.issuperset(target.needs):
                raise ValueError(f"move {place}: target {number} cannot be passed")
            held = sum(game.values[v].size for v in live)
            cost += game.hold * (held + game.others) * target.time
            passed += 1
            continue
        value = game.values[number]
        _check_move(game, place, Move(action, number), live, passed)
        before = sum(game.values[v].size for v in live)
        if action == "compute":
            live.add(number)
            cost += value.compute + (value.fix if number in records else 0)
            records.discard(number)
        else:
            live.remove(number)
            cost += value.uncompute if action == "uncompute" else value.drop or 0
            if action == "drop":
                records.add(number)
        held = max(before, sum(game.values[v].size for v in live))
        peak = max(peak, held)
        time = value.drop_time if action == "drop" else value.time
        cost += game.hold * (held + game.others) * time
    if passed != len(game.targets) or live != game.kept or records != game.left:
        raise ValueError("the end is not as it should be")
    return cost, peak


def _check_move(
    game: Game, place: int, move: Move, live: set[int], passed: int
) -> None:
    value = game.values[move.number]
    is_there = move.number in live
    if is_there == (move.action == "compute"):
        raise ValueError(f"move {place}: {move} of a value that is there: {is_there}")
    if move.action == "drop":
        if value.drop is None:
            raise ValueError(f"move {place}: value {move.number} cannot be dropped")
        return
    if not live.issuperset(value.inputs):
        raise ValueError(f"move {place}: an input of {move.number} is not there")
    if not value.window[0] <= passed <= value.window[1]:
        raise ValueError(f"move {place}: the window of {move.number} is shut")
