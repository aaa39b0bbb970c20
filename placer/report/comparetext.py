"""A comparison in a terminal: the devices of each program, the best one first.

In: rows.  Out: text of a fixed width, or plain data for machines.
"""

from __future__ import annotations

import dataclasses
from typing import TYPE_CHECKING, Any

from placer.compare.rows import ranked
from placer.report.words import WIDTH, Page, count, duration, percent

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.compare.rows import Row


def compare_text(
    rows: Sequence[Row], *, width: int = WIDTH, colour: bool = False, left: int = 0
) -> str:
    """Return a comparison as text; `left` pairs were not planned any more."""
    page = Page(width, colour=colour)
    for program, group in ranked(rows).items():
        best = group[0]
        page.paragraph(verdict_of(program, group), shade="good" if best.fits else "bad")
        page.table(
            (
                "device", "success", "time", "swaps", "sites", "<best choice",
                "<limited by", "fits",
            ),
            [_cells(row) for row in group],
            drop=(4, 5, 3, 2),
        )  # fmt: skip
        for row in group:
            if row.reason:
                page.paragraph(f"{row.device} cannot run it: {row.reason}", indent=1)
            elif row.nearest:
                page.paragraph(f"{row.device}: {row.nearest}", indent=1)
        page.line()
    if left:
        page.paragraph(f"interrupted: {count(left, 'pair')} not planned")
    page.paragraph(
        "success and time are estimates from each device's calibration, made to compare"
    )
    return page.text()


def verdict_of(program: str, group: Sequence[Row]) -> str:
    """Return which device is best for a program, in one sentence."""
    best = group[0]
    fitting = sum(1 for row in group if row.fits)
    if best.figures is None:
        return f"{program}: runs on none of {count(len(group), 'device')}"
    if not best.fits:
        return (
            f"{program}: fits on none of {count(len(group), 'device')}; "
            f"{best.device} comes nearest in error"
        )
    return (
        f"{program}: best on {best.device}, success {percent(best.figures.success)}; "
        f"fits on {fitting} of {count(len(group), 'device')}"
    )


def _cells(row: Row) -> tuple[str, ...]:
    if row.figures is None:
        return (row.device, "-", "-", "-", "-", "-", "cannot run", "no")
    return (
        row.device,
        percent(row.figures.success),
        duration(row.figures.time_ns),
        str(row.figures.swaps),
        f"{row.figures.sites}/{row.sites}",
        row.choice,
        row.cause,
        "yes" if row.fits else "no",
    )


def compare_data(rows: Sequence[Row]) -> dict[str, Any]:
    """Return a comparison as plain data: the rows, and the devices by rank."""
    return {
        "format": 1,
        "rows": [dataclasses.asdict(row) for row in rows],
        "ranking": {
            program: [row.device for row in group]
            for program, group in ranked(rows).items()
        },
    }
