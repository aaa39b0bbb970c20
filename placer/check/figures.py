"""Compare the stated figures, bound, limits and verdict with what the check finds."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from placer.check.case import Case
    from placer.check.follow import Follower

CLOSE = 1e-9


def check_figures(case: Case, walk: Follower) -> None:
    """Apply the rules of figures, bound, limits and verdict."""
    stated = case.data["figures"]
    route = case.data["route"]
    worst, names = walk.worst()
    made: dict[str, Any] = {
        "sites": len(walk.touched),
        "swaps": len(route["swaps"]),
        "time_ns": walk.last,
        "two_qubit_gates": walk.counts["two"],
        "one_qubit_gates": walk.counts["one"] + walk.counts["tee"],
        "t_gates": walk.counts["tee"],
        "measurements": walk.counts["measure"],
        "level2_gates": walk.counts["level2"],
        "cost": sum(walk.costs.values()),
    }
    for name, value in made.items():
        if stated[name] != value:
            _misstated(case, name, stated[name], value)
    for cause, value in walk.costs.items():
        if stated["costs"][cause] != value:
            _misstated(case, f"costs/{cause}", stated["costs"][cause], value)
    if not math.isclose(stated["worst_share"], worst, rel_tol=CLOSE, abs_tol=CLOSE):
        _misstated(case, "worst_share", stated["worst_share"], worst)
    elif stated["worst_value"] not in names:
        _misstated(case, "worst_value", stated["worst_value"], sorted(names))
    success = math.exp(-stated["cost"] / 1e12)
    if not math.isclose(stated["success"], success, rel_tol=CLOSE, abs_tol=1e-300):
        case.find(
            "success-misstated",
            "figures",
            f"{stated['success']} is stated, exp(-expected error) is {success}",
        )
    _check_bound(case)
    _check_limits(case)


def _misstated(case: Case, name: str, stated: object, made: object) -> None:
    case.find("figures-misstated", name, f"{stated} is stated, the route gives {made}")


def _check_bound(case: Case) -> None:
    bound = case.data["bound"]
    least, estimate = bound["least"], bound["estimate"]
    if least is not None and least > estimate:
        case.find("bound-above-cost", "bound", f"least {least} passes {estimate}")
    if bound["proven"] != (least == estimate):
        case.find(
            "bound-above-cost", "bound", "'proven' does not follow from the bound"
        )
    if bound["floor"] > case.data["figures"]["cost"]:
        case.find(
            "bound-above-cost",
            "bound",
            f"floor {bound['floor']} passes {case.data['figures']['cost']}",
        )
    gap = None if least is None else (estimate - least) / estimate if estimate else 0.0
    same = gap == bound["gap"] or (
        gap is not None
        and bound["gap"] is not None
        and math.isclose(gap, bound["gap"], rel_tol=CLOSE, abs_tol=CLOSE)
    )
    if not same:
        case.find("bound-above-cost", "bound", f"gap {bound['gap']} should be {gap}")


def _check_limits(case: Case) -> None:
    figures, budget = case.data["figures"], case.data["budget"]
    expected = [
        ("share of lifetime", figures["worst_share"], budget["share"], -1),
        ("success", figures["success"], budget["least_success"], 1),
        ("sites", figures["sites"], budget["most_sites"], -1),
        ("run time", figures["time_ns"], budget["longest_ns"], -1),
    ]
    limits = case.data["verdict"]["limits"]
    if [row["name"] for row in limits] != [row[0] for row in expected]:
        case.find(
            "limit-misstated", "verdict", "the limits are not those of the budget"
        )
        return
    fits = True
    for row, (name, value, limit, sense) in zip(limits, expected, strict=True):
        holds = limit is None or (value - limit) * sense >= 0
        fits = fits and holds
        if row["value"] != value or row["limit"] != limit or row["holds"] != holds:
            case.find(
                "limit-misstated",
                name,
                f"{row['value']} against {row['limit']}, holds: {row['holds']}; "
                f"should be {value} against {limit}, holds: {holds}",
            )
    verdict = case.data["verdict"]
    begins = "fits" if fits else "does not fit"
    if verdict["fits"] != fits or not verdict["sentence"].startswith(f"{begins}:"):
        case.find(
            "verdict-misstated",
            "verdict",
            f"'{verdict['sentence'][:60]}', fits={verdict['fits']}; limits say {fits}",
        )
