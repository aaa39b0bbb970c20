"""Read a plan back from the data of its file: the inverse of `plan.to_json`.

In: data that has passed the check.  Out: a `Plan`.  What a plan file does not hold of
steps that are no calls (kind, name, line) is left empty.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from placer.device.model import Budget
from placer.plan import (
    Bound,
    Cleanup,
    Conflict,
    Costs,
    CurvePoint,
    Figures,
    Lease,
    Limit,
    Nearest,
    OrderRow,
    Plan,
    PolicyRow,
    Route,
    Source,
    Step,
    Trade,
    TradeRow,
    ValueRow,
    Verdict,
    WhyNot,
)

if TYPE_CHECKING:
    from collections.abc import Mapping

Row = dict[str, Any]
OTHER = "other"
"""The kind of a step that is no call, which a plan file does not name."""


def plan_of_data(data: Mapping[str, Any]) -> Plan:
    """Return the plan that a file holds."""
    steps = [_call(row) for row in data["calls"]]
    steps += [
        Step(index, OTHER, "", 0, "as-written", "none", start, end, ())
        for index, start, end in data["others"]
    ]
    bound = {k: v for k, v in data["bound"].items() if k != "gap"}
    verdict = data["verdict"]
    return Plan(
        version=data["version"],
        program=Source(**data["program"]),
        device=Source(**data["device"]),
        calibrated=data["calibrated"],
        open_inputs=data["open_inputs"],
        assumed=data["assumed"],
        budget=Budget(**data["budget"]),
        goal=data["goal"],
        only=tuple(data["only"]),
        seed=data["seed"],
        effort=data["effort"],
        wires=dict(data["wires"]),
        steps=tuple(sorted(steps, key=lambda step: step.index)),
        route=_route(data["route"]),
        figures=_needed(data["figures"]),
        bound=Bound(**bound),
        policies=tuple(
            PolicyRow(**{**row, "figures": _figures(row["figures"])})
            for row in data["policies"]
        ),
        verdict=Verdict(
            verdict["fits"],
            verdict["sentence"],
            tuple(Limit(**row) for row in verdict["limits"]),
            verdict["nearest"],
        ),
        notes=tuple(data["notes"]),
        cleanup=_cleanup(data.get("cleanup")),
        trade=_trade(data.get("trade")),
        whynot=_whynot(data.get("whynot")),
    )


def _call(row: Row) -> Step:
    leases = tuple(Lease(**lease) for lease in row["leases"])
    lost = tuple((name, why) for name, why in row["lost"])
    return Step(**{**row, "leases": leases, "lost": lost})


def _route(row: Row) -> Route:
    return Route(
        tuple(tuple((a, b) for a, b in runs) for runs in row["gaps"]),
        tuple((a, b) for a, b in row["swaps"]),
        row["held_out"],
        row["expected_swaps"],
    )


def _needed(row: Row) -> Figures:
    plain = {k: v for k, v in row.items() if k != "cost"}
    return Figures(**{**plain, "costs": Costs(**row["costs"])})


def _figures(row: Row | None) -> Figures | None:
    return None if row is None else _needed(row)


def _cleanup(row: Row | None) -> Cleanup | None:
    if row is None:
        return None
    return Cleanup(
        asked=row["asked"],
        chosen=row["chosen"],
        moves=tuple((str(action), int(number)) for action, number in row["moves"]),
        values=tuple(ValueRow(**value) for value in row["values"]),
        rows=tuple(
            OrderRow(**{**one, "figures": _figures(one["figures"])})
            for one in row["rows"]
        ),
        curve=tuple(CurvePoint(**point) for point in row["curve"]),
        crossing=row["crossing"],
    )


def _trade(row: Row | None) -> Trade | None:
    if row is None:
        return None
    return Trade(
        row["effort"],
        tuple(_trade_row(one) for one in row["curve"]),
        tuple(_trade_row(one) for one in row["changes"]),
    )


def _trade_row(row: Row) -> TradeRow:
    return TradeRow(**{**row, "figures": _figures(row["figures"])})


def _whynot(row: Row | None) -> WhyNot | None:
    if row is None:
        return None
    return WhyNot(
        row["sentence"],
        tuple(
            Conflict(**{**one, "figures": _figures(one["figures"])})
            for one in row["limits"]
        ),
        row["proven"],
        row["by"],
        tuple(
            Nearest(**{**one, "figures": _needed(one["figures"])})
            for one in row["nearest"]
        ),
        row["effort"],
    )
