"""The report of a comparison: one HTML file, all programs and devices on one scale.

In: the data of a comparison, as `comparetext.compare_data` gives it.  Out: the text.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from markupsafe import Markup

from placer.compare.rows import of_data, ranked
from placer.report import charts
from placer.report.comparetext import verdict_of
from placer.report.facts import Facts
from placer.report.html import environment
from placer.report.htmlrows import CAUSE_WORDS
from placer.report.words import count
from placer.units import nats

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from placer.compare.rows import Row


def compare_html(data: Mapping[str, Any]) -> str:
    """Return the report of a comparison."""
    rows = [of_data(row) for row in data["rows"]]
    place = {row.key: number for number, row in enumerate(rows)}
    facts = Facts(data)
    most = max((_error(row) for row in rows), default=0.0)
    groups = [
        {
            "program": program,
            "sentence": verdict_of(program, group),
            "fits": group[0].fits,
            "rows": [_view(facts, row, place[row.key]) for row in group],
            "chart": Markup(_chart(number, program, group, most)),
        }
        for number, (program, group) in enumerate(ranked(rows).items())
    ]
    devices = _devices(rows)
    title = f"{count(len(groups), 'program')} on {count(len(devices), 'device')}"
    return (
        environment()
        .get_template("compare.html")
        .render(title=title, groups=groups, devices=devices)
    )


def _error(row: Row) -> float:
    return 0.0 if row.figures is None else nats(row.figures.costs.total)


def _view(facts: Facts, row: Row, number: int) -> dict[str, Any]:
    shown: dict[str, Any] = {
        "device": row.device,
        "state": row.state,
        "fits": row.fits,
        "reason": row.reason,
        "nearest": row.nearest,
        "choice": row.choice,
        "cause": row.cause,
    }
    if row.figures is None:
        return shown
    base = f"rows/{number}"
    return shown | {
        "success": facts(f"{base}/figures/success", "percent"),
        "time": facts(f"{base}/figures/time_ns", "duration"),
        "swaps": facts(f"{base}/figures/swaps", "count"),
        "used": facts(f"{base}/figures/sites", "count"),
        "sites": facts(f"{base}/sites", "count"),
        "worst": facts(f"{base}/figures/worst_share", "percent"),
        "gap": facts(f"{base}/gap", "percent"),
    }


def _chart(number: int, program: str, group: Sequence[Row], most: float) -> str:
    rows = [
        charts.Bars(
            row.device,
            tuple(
                (name, nats(getattr(row.figures.costs, name))) for name in CAUSE_WORDS
            ),
        )
        for row in group
        if row.figures is not None
    ]
    if not rows:
        return ""
    return charts.bars(
        rows,
        name=f"compare-{number}",
        label=f"Expected error of {program} on each device by cause, as in the table",
        unit="expected error, −ln(success)",
        words=CAUSE_WORDS,
        most=most,
    )


def _devices(rows: Sequence[Row]) -> list[tuple[str, str]]:
    return sorted({(row.device, row.calibrated) for row in rows})
