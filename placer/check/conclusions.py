"""What the plan concludes from its figures: bound, policies, limits, verdict.

The figures are taken as stated; whether they are right is asked elsewhere.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, NamedTuple

from placer.check.figures import is_close, success_of_costs

if TYPE_CHECKING:
    from placer.check.case import Case


class Limit(NamedTuple):
    """A limit of the budget, the value held against it, and whether it is kept."""

    name: str
    value: float
    limit: float | None
    holds: bool
    unit: str
    about: str


def check_conclusions(case: Case) -> None:
    """Apply the rules of bound, policies, limits and verdict."""
    _check_bound(case)
    _check_floor(case)
    _check_proof(case)
    for row in case.data["policies"]:
        _check_policy(case, row)
    _check_limits(case)
    _check_verdict(case)


def limits_of(figures: dict[str, Any], budget: dict[str, Any]) -> list[Limit]:
    """Return the four limits in their order."""
    share, success = figures["worst_share"], figures["success"]
    sites, time = figures["sites"], figures["time_ns"]
    longest, least = budget["share"], budget["least_success"]
    most, end = budget["most_sites"], budget["longest_ns"]
    about = figures["worst_value"]
    return [
        Limit("share of lifetime", share, longest, share <= longest, "share", about),
        Limit(
            "success",
            success,
            least,
            least is None or success >= least,
            "probability",
            "",
        ),
        Limit("sites", sites, most, most is None or sites <= most, "sites", ""),
        Limit("run time", time, end, end is None or time <= end, "ns", ""),
    ]


def _check_bound(case: Case) -> None:
    least, estimate = case.data["bound"]["least"], case.data["bound"]["estimate"]
    if least is not None and least > estimate:
        text = f"no plan is below {least}, but this one is at {estimate}"
        case.find("bound-above-estimate", "bound", text)


def _check_floor(case: Case) -> None:
    floor, cost = case.data["bound"]["floor"], case.data["figures"]["cost"]
    if floor > cost:
        text = f"no plan is below {floor}, but this one is at {cost}"
        case.find("floor-above-cost", "bound", text)


def _check_proof(case: Case) -> None:
    """The gap is (estimate - least) / estimate, and proven if the two are equal."""
    bound = case.data["bound"]
    least, estimate, gap = bound["least"], bound["estimate"], bound["gap"]
    if bound["proven"] != (least == estimate):
        text = f"proven: {bound['proven']}, estimate {estimate}, bound {least}"
        case.find("proof-misstated", "bound", text)
    wanted = None
    if least is not None:
        wanted = (estimate - least) / estimate if estimate else 0.0
    same = gap == wanted
    if gap is not None and wanted is not None:
        same = is_close(gap, wanted)
    if not same:
        case.find("proof-misstated", "bound", f"gap {gap} is stated, it is {wanted}")


def _check_policy(case: Case, row: dict[str, Any]) -> None:
    """What a row can be asked without its plan: does it agree with itself?"""
    figures, where = row["figures"], f"policy {row['policy']}"
    names = [other["policy"] for other in case.data["policies"]]
    faults = []
    if names.count(row["policy"]) > 1:
        faults.append("it has more than one row")
    if row["possible"] != (figures is not None) or (figures is None) != (
        row["estimate"] is None
    ):
        faults.append("figures and estimate are there exactly if it is possible")
    fits = False
    if figures is not None:
        fits = all(limit.holds for limit in limits_of(figures, case.data["budget"]))
        success = success_of_costs(figures["costs"])
        if not is_close(figures["success"], success):
            faults.append(f"success {figures['success']} should be {success}")
    if row["fits"] != fits:
        faults.append(f"fits: {row['fits']} is stated, its figures say {fits}")
    for text in faults:
        case.find("policy-misstated", where, text)


def _check_limits(case: Case) -> None:
    stated = case.data["verdict"]["limits"]
    wanted = limits_of(case.data["figures"], case.data["budget"])
    found = [Limit(*(row[key] for key in Limit._fields)) for row in stated]
    if len(found) != len(wanted):
        text = f"{len(found)} limits are stated, there are {len(wanted)}"
        case.find("limit-misstated", "verdict", text)
    for one, two in zip(found, wanted, strict=False):
        if one != two:
            text = f"{tuple(one)} is stated, it is {tuple(two)}"
            case.find("limit-misstated", f"limit {two.name}", text)


def _check_verdict(case: Case) -> None:
    verdict = case.data["verdict"]
    wanted = limits_of(case.data["figures"], case.data["budget"])
    fits = all(limit.holds for limit in wanted)
    words = "fits:" if fits else "does not fit:"
    if verdict["fits"] != fits or not verdict["sentence"].startswith(words):
        text = f"fits: {verdict['fits']}, '{verdict['sentence'][:40]}', "
        case.find("verdict-misstated", "verdict", f"{text}the limits say '{words}'")
