"""When values are cleaned up, as rows and a curve of a report.

In: the facts of a plan.  Out: what the template shows; `None` without values.
"""

from __future__ import annotations

from typing import Any

from markupsafe import Markup

from placer.report import charts
from placer.report.facts import Facts
from placer.units import nats

TREATMENT = {"once": "kept", "again": "returned", "measured": "measured away"}


def cleanup_view(facts: Facts) -> dict[str, Any] | None:
    """Return the values, the orders and the curve of a plan's cleanup."""
    cleanup = facts.data.get("cleanup")
    if cleanup is None:
        return None
    points = []
    for k, point in enumerate(cleanup["curve"]):
        base = f"cleanup/curve/{k}"
        points.append(
            {
                "wires": facts(f"{base}/wires", "count"),
                "cost": facts(f"{base}/cost", "nats"),
                "bound": facts(f"{base}/bound", "nats"),
                "state": _state(point),
                "by": point["by"],
            }
        )
    values = [
        {
            "name": value["name"],
            "line": value["line"],
            "treatment": TREATMENT.get(value["treatment"], value["treatment"]),
            "size": facts(f"cleanup/values/{k}/size", "count"),
            "computed": facts(f"cleanup/values/{k}/computed", "count"),
            "why": value["why"],
            "next_best": facts(f"cleanup/values/{k}/next_best", "nats"),
        }
        for k, value in enumerate(cleanup["values"])
    ]
    orders = [
        {
            "name": row["name"],
            "wires": facts(f"cleanup/rows/{k}/wires", "count"),
            "computed": facts(f"cleanup/rows/{k}/computed", "count"),
            "effort": row["effort"],
        }
        for k, row in enumerate(cleanup["rows"])
    ]
    return {
        "chosen": cleanup["chosen"],
        "crossing": cleanup["crossing"],
        "values": values,
        "orders": orders,
        "points": points,
        "chart": _chart(cleanup["curve"]),
    }


def _state(point: dict[str, Any]) -> str:
    if point["cost"] is None:
        return "none exists" if point["proven"] else "none found"
    return "least, proven" if point["proven"] else "best found"


def _chart(curve: list[dict[str, Any]]) -> Markup:
    known = [p for p in curve if p["cost"] is not None]
    if len(known) < 2:
        return Markup("")
    bounds = [p for p in curve if p["bound"] is not None]
    rows = [
        charts.Line(
            "cost",
            "accent",
            tuple(float(p["wires"]) for p in known),
            tuple(nats(p["cost"]) for p in known),
        ),
        charts.Line(
            "bound",
            "swaps",
            tuple(float(p["wires"]) for p in bounds),
            tuple(nats(p["bound"]) for p in bounds),
            dashed=True,
        ),
    ]
    return Markup(
        charts.lines(
            rows if bounds else rows[:1],
            name="curve",
            label="Least cost of computing and cleaning up by number of wires, as in "
            "the table",
            x_unit="workspace wires that hold values",
            y_unit="cost, −ln(fidelity)",
        )
    )
