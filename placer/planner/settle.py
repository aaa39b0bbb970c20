"""Plan every order of cleanup that is worth it on the device, and take the best.

In: a problem as written and what was asked for.  Out: the engine's outcome for the
order taken, and what became of the values.  All orders are planned with little work
first, the best of them again with all of it; deep, also those a reader compares with.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

from placer.errors import InputError, NoPlan, OutOfTime
from placer.plan import Cleanup, CurvePoint, OrderRow, ValueRow
from placer.planner.loop import run
from placer.planner.orders import (
    AS_WRITTEN,
    AT_END,
    AT_ONCE,
    game_of,
    order_of,
    orders_of,
)
from placer.planner.rank import aim
from placer.planner.verdict import overrun
from placer.problem import make_problem
from placer.program.planned import moves_of, planned_program
from placer.program.rewrite import Move
from placer.program.values import values_of

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from placer.halt import Halt
    from placer.planner.cleanup.game import Answer, Game
    from placer.planner.loop import Effort, Outcome
    from placer.planner.orders import Order
    from placer.planner.warm import Earlier
    from placer.problem import Problem
    from placer.program.values import ValueGraph

Asked = Literal["as-written", "at-once", "at-end", "optimised"]
COMPARED = (AS_WRITTEN, AT_ONCE, AT_END)
AGAIN: dict[str, int] = {"quick": 0, "normal": 2, "deep": 4}


@dataclass(frozen=True, slots=True)
class Tried:
    """An order with what planning it gave, or why it gave nothing."""

    order: Order
    outcome: Outcome | None
    reason: str
    effort: Effort


def settle(
    problem: Problem,
    *,
    asked: Asked,
    effort: Effort,
    seed: int,
    progress: Callable[[str], None],
    halt: Halt | None = None,
    earlier: Earlier | None = None,
) -> tuple[Outcome, Cleanup | None]:
    """Return the outcome of the best order, and what is said about the others.

    `problem` holds the program as written.  A program without values has no order to
    choose; it is planned as it is.

    Raises
    ------
    NoPlan, OutOfTime, InputError
        If no order can be planned: the reason of the program's own order.
    """
    graph = values_of(problem.program)
    if not graph.values:
        found = run(
            problem,
            effort=effort,
            seed=seed,
            progress=progress,
            halt=halt,
            earlier=earlier,
        )
        return found, None
    progress("cleanup: least cost for each number of wires")
    game = game_of(problem.program, graph, problem.device, problem.only)
    orders, curve = orders_of(problem.program, game, graph, effort)
    wanted = _asked_for(orders, asked)
    if earlier is not None and asked == "optimised":
        wanted = _with_earlier(wanted, game, graph, earlier)
    runner = _Runner(problem, seed, progress, halt, earlier)
    if len(wanted) == 1:
        tried = [runner.plan(wanted[0], effort)]
    else:
        tried = _all_of(runner, wanted, effort)
    best = min(tried, key=_rank)
    if best.outcome is None:
        # Say why the program as written has no plan: it is the order users know.
        runner.plan(wanted[0], effort, is_needed=True)
        raise OutOfTime(f"no order of cleanup was planned: {best.reason}")
    rows = tuple(_row(t, problem) for t in tried)
    return best.outcome, Cleanup(
        asked=asked,
        chosen=best.order.name,
        moves=best.order.moves,
        values=_values(graph, best, tried),
        rows=rows,
        curve=tuple(_point(a) for a in curve),
        crossing=crossing(rows),
    )


def _asked_for(orders: Sequence[Order], asked: Asked) -> list[Order]:
    """Return the orders asked for; one that is the program's own goes by that name."""
    if asked == "optimised":
        return list(orders)
    name = asked.replace("-", " ")
    found = [order for order in orders if order.name == name]
    return found or [orders[0]]


def _all_of(runner: _Runner, orders: Sequence[Order], effort: Effort) -> list[Tried]:
    """Plan all orders with little work, then those that matter with all of it."""
    quick = [runner.plan(order, "quick") for order in orders]
    if effort == "quick":
        return quick
    ranked = sorted(quick, key=_rank)
    chosen = {t.order.name for t in ranked[: AGAIN[effort]] if t.outcome is not None}
    if runner.earlier is not None:
        # What was planned before is the start; the others have had their chance.
        chosen = {ranked[0].order.name}
    if effort == "deep":
        chosen.update(name for name in COMPARED if name in {o.name for o in orders})
    return [
        runner.plan(t.order, effort) if t.order.name in chosen else t for t in quick
    ]


def _with_earlier(
    orders: Sequence[Order], game: Game, graph: ValueGraph, earlier: Earlier
) -> list[Order]:
    """Return the orders with that of an earlier plan, if it has the same values."""
    cleanup = earlier.data.get("cleanup")
    if not cleanup or not cleanup["moves"]:
        return list(orders)
    if [row["name"] for row in cleanup["values"]] != [v.name for v in graph.values]:
        return list(orders)
    moves = moves_of(cleanup["moves"])
    if any(order.moves == moves for order in orders):
        return list(orders)
    return [*orders, order_of(game, "as in the earlier plan", moves)]


class _Runner:
    """Plans one order after the other."""

    def __init__(
        self,
        problem: Problem,
        seed: int,
        progress: Callable[[str], None],
        halt: Halt | None,
        earlier: Earlier | None,
    ) -> None:
        self.problem = problem
        self.seed = seed
        self.progress = progress
        self.halt = halt
        self.earlier = earlier
        self.planned: dict[str, Tried] = {}

    def plan(self, order: Order, effort: Effort, *, is_needed: bool = False) -> Tried:
        """Plan an order; what goes wrong is its reason, or raised if it is needed."""
        old = self.problem
        is_over = self.halt is not None and self.halt.is_due()
        if is_over and not is_needed:
            none = Tried(order, None, "not planned in the time allowed", effort)
            return self.planned.get(order.name, none)

        def say(text: str) -> None:
            self.progress(f"cleanup {order.name}: {text}")

        try:
            program = planned_program(old.program, order.moves, old.device)
            problem = make_problem(
                old.device,
                program,
                budget=old.budget,
                goal=old.goal,
                only=old.only,
            )
            outcome = run(
                problem,
                effort=effort,
                seed=self.seed,
                progress=say,
                halt=self.halt,
                earlier=self.earlier,
            )
        except (NoPlan, OutOfTime, InputError) as error:
            if is_needed:
                raise
            return Tried(order, None, " ".join(str(error).split()), effort)
        found = Tried(order, outcome, "", effort)
        # More work that had to end early may have found less than little work did.
        self.planned[order.name] = min(
            (found, self.planned.get(order.name, found)), key=_rank
        )
        return self.planned[order.name]


def _rank(tried: Tried) -> tuple[bool, bool, int, int, int]:
    """Return the rank of an order: planned, fits, goal, error, least work done."""
    if tried.outcome is None:
        return (True, True, 0, 0, 0)
    figures = tried.outcome.judged.figures
    problem = tried.outcome.instance.problem
    cost = figures.costs.total
    if problem.goal == "estimate":
        return (False, False, tried.outcome.judged.estimate, cost, 0)
    misses = overrun(figures, problem.budget) > 0
    return (False, misses, aim(figures, problem), cost, tried.order.computed)


def _row(tried: Tried, problem: Problem) -> OrderRow:
    order, outcome = tried.order, tried.outcome
    figures = None if outcome is None else outcome.judged.figures
    return OrderRow(
        name=order.name,
        wires=order.wires,
        computed=order.computed,
        possible=figures is not None,
        reason=tried.reason,
        fits=figures is not None and overrun(figures, problem.budget) == 0,
        figures=figures,
        estimate=None if outcome is None else outcome.judged.estimate,
        effort=tried.effort,
    )


def _point(answer: Answer) -> CurvePoint:
    return CurvePoint(answer.limit, answer.cost, answer.bound, answer.proven, answer.by)


def _counts(graph: ValueGraph, order: Order, value: int) -> tuple[int, int]:
    """Return how often a value is computed and dropped in an order."""
    moves = order.moves or graph.written
    return moves.count(Move("compute", value)), moves.count(Move("drop", value))


def _values(
    graph: ValueGraph, best: Tried, tried: Sequence[Tried]
) -> tuple[ValueRow, ...]:
    rows = []
    own = _rank(best)[3]
    for number, value in enumerate(graph.values):
        computed, dropped = _counts(graph, best.order, number)
        others = [
            t
            for t in tried
            if t.outcome is not None
            and _counts(graph, t.order, number) != (computed, dropped)
        ]
        other = min(others, key=_rank, default=None)
        treatment = "measured" if dropped else "again" if computed > 1 else "once"
        uses = sum(1 for use in graph.uses if number in use.needs)
        uses += sum(1 for v in graph.values if number in v.inputs)
        cost = None
        if other is not None and other.outcome is not None:
            cost = other.outcome.judged.figures.costs.total
        rows.append(
            ValueRow(
                name=value.name,
                line=value.line,
                size=value.size,
                computed=computed,
                dropped=dropped,
                treatment=treatment,
                why=_why(computed, dropped, uses, other, own),
                next_best=cost,
            )
        )
    return tuple(rows)


def _why(computed: int, dropped: int, uses: int, other: Tried | None, own: int) -> str:
    """Say what happens to a value, and what the best other way would cost."""
    readers = f"{uses} reader" + ("" if uses == 1 else "s")
    if dropped:
        times = "once" if dropped == 1 else f"{dropped} times"
        what = f"computed {computed} times, measured away {times}"
    elif computed > 1:
        what = f"returned and computed {computed} times for {readers}"
    else:
        what = f"kept from its computing to its last use, for {readers}"
    if other is None or other.outcome is None:
        return f"{what}; no other way was planned"
    figures = other.outcome.judged.figures
    more = (figures.costs.total - own) / own if own else 0.0
    side = "more" if more >= 0 else "less"
    text = (
        f"{what}; the best other way ('{other.order.name}') has {abs(more):.0%} {side}"
    )
    if overrun(figures, other.outcome.instance.problem.budget) > 0:
        return f"{text} expected error and does not fit"
    return f"{text} expected error"


def crossing(rows: Sequence[OrderRow]) -> str:
    """Say which order is best with how many sites, from the rows that were planned."""
    planned = [row for row in rows if row.figures is not None]
    if not planned:
        return ""
    steps: list[tuple[int, str]] = []
    for sites in sorted({row.figures.sites for row in planned if row.figures}):
        within = [r for r in planned if r.figures and r.figures.sites <= sites]
        best = min(
            within,
            key=lambda r: (not r.fits, r.figures.costs.total if r.figures else 0),
        )
        if not steps or steps[-1][1] != best.name:
            steps.append((sites, best.name))
    parts = [f"'{name}' from {sites} sites on" for sites, name in steps]
    return "best of those planned: " + ", ".join(parts)
