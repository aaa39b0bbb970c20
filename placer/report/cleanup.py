"""When values are computed and cleaned up, in words for a terminal.

In: the cleanup of a plan.  Out: the table of orders tried, what became of each value,
the least cost for each number of wires, and where another order would be best.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from placer.report.words import Page, count, duration, percent, significant
from placer.units import nats

if TYPE_CHECKING:
    from placer.plan import Cleanup, CurvePoint, OrderRow, ValueRow

MOST_VALUES = 8
MOST_POINTS = 12


def add_cleanup(page: Page, cleanup: Cleanup) -> None:
    """Add the section on cleanup to a page."""
    page.heading("When values are cleaned up")
    columns = ("order", "wires", "computed", "sites", "swaps", "time", "success")
    rows = [_row(row, cleanup.chosen) for row in cleanup.rows]
    page.table((*columns, "fits", "<"), rows, drop=(8, 3, 4, 5))
    names = {row.name for row in cleanup.rows}
    same = [name for name in ("at once", "at end") if name not in names]
    if same and cleanup.asked == "optimised":
        text = " and ".join(f"'{name}'" for name in same)
        page.paragraph(f"{text}: the same program as a row above", indent=1)
    for row in cleanup.rows:
        if not row.possible:
            page.paragraph(f"'{row.name}' has no plan: {row.reason}", indent=1)
    if len({row.effort for row in cleanup.rows}) > 1:
        page.paragraph(
            "rows with effort 'quick' were planned with less work than the plan; "
            "--cleanup plans one order with all of it",
            indent=1,
        )
    for value in cleanup.values[:MOST_VALUES]:
        page.paragraph(_value(value), indent=1)
    left = len(cleanup.values) - MOST_VALUES
    if left > 0:
        page.paragraph(f"and {count(left, 'value')} more (--json lists all)", indent=1)
    if cleanup.crossing:
        page.paragraph(cleanup.crossing, indent=1)
    points = cleanup.curve[:MOST_POINTS]
    if len(points) > 1:
        text = ", ".join(_point(point) for point in points)
        page.paragraph(
            f"least cost before placing, in nats, by workspace wires: {text}", indent=1
        )


def _row(row: OrderRow, chosen: str) -> tuple[str, ...]:
    name = f"{row.name} (taken)" if row.name == chosen else row.name
    head = (name, str(row.wires), str(row.computed))
    if row.figures is None:
        return (*head, "-", "-", "-", "-", "no", row.effort)
    return (
        *head,
        str(row.figures.sites),
        str(row.figures.swaps),
        duration(row.figures.time_ns),
        percent(row.figures.success),
        "yes" if row.fits else "no",
        row.effort,
    )


def _value(value: ValueRow) -> str:
    at = f" (line {value.line})" if value.line else ""
    return f"{value.name}{at}: {value.why}"


def _point(point: CurvePoint) -> str:
    if point.cost is None:
        known = "none exists" if point.proven else "none found"
        return f"{point.wires}: {known}"
    text = f"{point.wires}: {significant(nats(point.cost))}"
    if not point.proven and point.bound is not None:
        text += f" (at least {significant(nats(point.bound))})"
    return text
