"""What a plan says about its cleanup: values, orders tried, and which one was taken.

The moves themselves are followed elsewhere (`cleanup`); here the words and rows about
them are held against the moves, and the chosen row against the plan's own figures.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from placer.check.conclusions import limits_of
from placer.check.figures import is_close, success_of_costs

if TYPE_CHECKING:
    from collections.abc import Iterator

    from placer.check.case import Case
    from placer.program.values import ValueGraph

Row = dict[str, Any]


def check_orders(case: Case) -> None:
    """Apply the rule of the cleanup's rows."""
    stated = case.data.get("cleanup")
    if stated is None or case.graph is None:
        return
    for where, what in (*_values(stated, case.graph), *_rows(case, stated)):
        case.find("cleanup-misstated", where, what)


def _values(stated: Row, graph: ValueGraph) -> Iterator[tuple[str, str]]:
    """Compare each value's row with the program, and its counts with the moves."""
    if len(stated["values"]) != len(graph.values):
        text = f"{len(stated['values'])} values are listed, there are "
        yield "cleanup", f"{text}{len(graph.values)}"
        return
    moves = [(action, number) for action, number in stated["moves"]]
    for number, (row, value) in enumerate(
        zip(stated["values"], graph.values, strict=True)
    ):
        where = f"value {value.name}"
        said = (row["name"], row["line"], row["size"])
        known = (value.name, value.line, value.size)
        if said != known:
            yield where, f"{said} is stated, the program says {known}"
        if not moves:
            continue
        counts = (moves.count(("compute", number)), moves.count(("drop", number)))
        if (row["computed"], row["dropped"]) != counts:
            text = f"computed {row['computed']} and dropped {row['dropped']} times, "
            yield where, f"{text}the moves say {counts}"
        treatment = "measured" if counts[1] else "again" if counts[0] > 1 else "once"
        if row["treatment"] != treatment:
            yield where, f"'{row['treatment']}' is stated, the moves say '{treatment}'"


def _rows(case: Case, stated: Row) -> Iterator[tuple[str, str]]:
    """Hold rows against themselves, and the chosen one against the plan."""
    names = [row["name"] for row in stated["rows"]]
    if len(set(names)) != len(names) or stated["chosen"] not in names:
        yield "cleanup", f"'{stated['chosen']}' must be one of the rows {names}"
        return
    for row in stated["rows"]:
        where, figures = f"order {row['name']}", row["figures"]
        if row["possible"] != (figures is not None):
            yield where, "figures are there exactly if it is possible"
        if figures is None:
            continue
        fits = all(limit.holds for limit in limits_of(figures, case.data["budget"]))
        if row["fits"] != fits:
            yield where, f"fits: {row['fits']} is stated, its figures say {fits}"
        if not is_close(figures["success"], success_of_costs(figures["costs"])):
            yield where, f"success {figures['success']} is not that of its costs"
    chosen = stated["rows"][names.index(stated["chosen"])]
    own = {k: v for k, v in case.data["figures"].items() if k != "cost"}
    if chosen["figures"] != own:
        yield f"order {chosen['name']}", "its figures are not those of the plan"
