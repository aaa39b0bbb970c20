"""Show a plan on one screen of a terminal: the verdict first, then why.

In: a plan (estimates, not promises).  Out: text of a fixed width, the same every time.
What a device or a program contains is shown in `show`.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from placer.report.cleanup import add_cleanup
from placer.report.words import (
    WIDTH,
    Page,
    bar,
    count,
    duration,
    listed,
    percent,
    quantity,
    significant,
)
from placer.units import nats

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.plan import Figures, Lease, Limit, Plan, PolicyRow, Step

FITS = "FITS"
DOES_NOT_FIT = "DOES NOT FIT"
MOST_CALLS = 10
_POLICY = {
    "clean": "clean only",
    "borrowed": "borrowed only",
    "level2": "level 2 only",
    "none": "no workspace",
}
_CAUSE = {
    "two_qubit": "two-qubit gates",
    "one_qubit": "one-qubit gates",
    "swaps": "swaps",
    "decay": "decay while waiting",
    "measurement": "measurement, reset",
    "level2": "level-2 gates",
    "preparation": "preparation",
}


def plan_text(
    plan: Plan, *, width: int = WIDTH, colour: bool = False, checked: str = ""
) -> str:
    """Return a plan as one screen of text.

    `checked` says how the plan was verified, in words; empty says nothing about it.
    """
    page = Page(width, colour=colour)
    _verdict(page, plan)
    _policies(page, plan)
    if plan.cleanup is not None:
        add_cleanup(page, plan.cleanup)
    _calls(page, plan)
    _error(page, plan)
    _sure(page, plan, checked)
    return page.text()


def verdict_line(plan: Plan) -> str:
    """Return the verdict in one line."""
    word = FITS if plan.verdict.fits else DOES_NOT_FIT
    sentence = plan.verdict.sentence.strip()
    if sentence.upper().startswith(word):
        sentence = sentence[len(word) :].lstrip(" :,;-")
    return f"{word}: {sentence}" if sentence else word


def _verdict(page: Page, plan: Plan) -> None:
    fits = plan.verdict.fits
    page.paragraph(verdict_line(plan), shade="good" if fits else "bad")
    figures = plan.figures
    parts = (
        f"{plan.program.name} on {plan.device.name}",
        count(figures.sites, "site"),
        count(figures.swaps, "swap"),
        duration(figures.time_ns),
        f"success {percent(figures.success)}",
    )
    page.paragraph(", ".join(parts))
    rows = [
        (
            limit.name,
            quantity(limit.value, limit.unit),
            "none" if limit.limit is None else quantity(limit.limit, limit.unit),
            _used(limit),
            "holds" if limit.holds else "BROKEN",
            limit.about,
        )
        for limit in plan.verdict.limits
    ]
    if rows:
        page.heading("What limits it")
        page.table(("limit", "plan", "allowed", "used", "<", "<"), rows, drop=(5, 3))
    if plan.verdict.nearest:
        page.paragraph(f"nearest: {plan.verdict.nearest}")


def _used(limit: Limit) -> str:
    """Return which part of a limit is used; of a least success, of its error."""
    if limit.limit is None:
        return "-"
    value, allowed = limit.value, limit.limit
    if "success" in limit.name:
        value, allowed = 1 - value, 1 - allowed
    return percent(value / allowed) if allowed > 0 else "-"


def _policies(page: Page, plan: Plan) -> None:
    page.heading("Workspace choice against one policy everywhere")
    title = "chosen together"
    if plan.only:
        title += f" ({'/'.join(plan.only)})"
    rows = [_policy_row(title, plan.figures, fits=plan.verdict.fits)]
    rows += [_row_of(row) for row in plan.policies]
    columns = ("policy", "sites", "swaps", "time", "error", "success", "worst", "fits")
    page.table(columns, rows, drop=(4, 1, 2, 3, 6))
    for row in plan.policies:
        if not row.possible:
            reason = row.reason or "no reason given"
            page.paragraph(f"{_policy(row.policy)} is not possible: {reason}", indent=1)
    if plan.figures.worst_value:
        page.paragraph(
            "worst: largest part of its lifetime that one value lives, here "
            f"{plan.figures.worst_value}",
            indent=1,
        )


def _policy(name: str) -> str:
    return _POLICY.get(name, name)


def _row_of(row: PolicyRow) -> tuple[str, ...]:
    if row.figures is None:
        return (_policy(row.policy), *("-" for _ in range(6)), "no")
    return _policy_row(_policy(row.policy), row.figures, fits=row.fits)


def _policy_row(title: str, figures: Figures, *, fits: bool) -> tuple[str, ...]:
    return (
        title,
        str(figures.sites),
        str(figures.swaps),
        duration(figures.time_ns),
        percent(1 - figures.success),
        percent(figures.success),
        percent(figures.worst_share),
        "yes" if fits else "no",
    )


def _calls(page: Page, plan: Plan) -> None:
    calls = plan.calls
    if not calls:
        return
    page.heading(f"Calls ({len(calls)})")
    if len(calls) <= MOST_CALLS:
        rows = [
            (_call(step), step.recipe, _workspace(step), _when((step,)))
            for step in sorted(calls, key=lambda s: (s.start, s.index))
        ]
        page.table(("call", "<recipe", "<workspace", "planned"), rows, drop=(3,))
        return
    groups: dict[tuple[str, str, str], list[Step]] = {}
    for step in calls:
        groups.setdefault((step.name, step.recipe, step.workspace), []).append(step)
    ordered = sorted(groups.items(), key=lambda item: (-len(item[1]), item[0]))
    grouped = [
        (str(len(steps)), name, recipe, _where(workspace, steps), _when(steps))
        for (name, recipe, workspace), steps in ordered[:MOST_CALLS]
    ]
    page.table(("count", "<call", "<recipe", "<workspace", "planned"), grouped)
    if len(ordered) > MOST_CALLS:
        left = ordered[MOST_CALLS:]
        calls_left = sum(len(steps) for _, steps in left)
        page.line(f" and {count(calls_left, 'call')} of {len(left)} more sorts")


def _call(step: Step) -> str:
    return f"{step.name}, line {step.line}" if step.line else step.name


def _workspace(step: Step) -> str:
    """Return where a call's workspace is: `clean $4 $5, $7 of q[3]`."""
    if not step.leases:
        return _POLICY.get(step.workspace, step.workspace).removesuffix(" only")
    clean = [x for x in step.leases if x.kind == "clean"]
    lent = [x for x in step.leases if x.kind == "borrowed"]
    parts = []
    if clean:
        parts.append("clean " + " ".join(f"${x.site}" for x in clean))
    if lent:
        parts.append("borrowed " + ", ".join(_lender(x) for x in lent))
    return "; ".join(parts)


def _lender(lease: Lease) -> str:
    return f"${lease.site} of {lease.lender}" if lease.lender else f"${lease.site}"


def _where(workspace: str, steps: Sequence[Step]) -> str:
    leases = [lease for step in steps for lease in step.leases]
    if not leases:
        return _POLICY.get(workspace, workspace).removesuffix(" only")
    sites = [f"${site}" for site in sorted({lease.site for lease in leases})]
    lenders = sorted({x.lender for x in leases if x.lender is not None})
    text = f"{workspace} on {listed(sites, 4)}"
    return f"{text} of {count(len(lenders), 'lender')}" if lenders else text


def _when(steps: Sequence[Step]) -> str:
    """Return the planned span in one unit, so that both ends compare."""
    start = min(step.start for step in steps)
    end = max(step.end for step in steps)
    for unit, size in (("s", 1e9), ("ms", 1e6), ("us", 1e3), ("ns", 1.0)):
        if end >= size:
            return f"{significant(start / size)} - {significant(end / size)} {unit}"
    return "0 ns"


def _error(page: Page, plan: Plan) -> None:
    costs = plan.figures.costs
    total = costs.total
    page.heading(
        f"Where the error comes from ({percent(1 - plan.figures.success)} expected)"
    )
    causes = [(name, getattr(costs, name)) for name in _CAUSE]
    causes = [c for c in causes if c[1]]
    for name, cost in sorted(causes, key=lambda c: (-c[1], c[0])):
        share = cost / total
        room = max(page.width - 34, 8)
        page.line(f" {_CAUSE[name]:<20}{percent(share):>8}  {bar(share, room)}")
    if not causes:
        page.line(" nothing: no cause costs anything on this device")


def _sure(page: Page, plan: Plan, checked: str) -> None:
    bound = plan.bound
    page.heading("How sure")
    if bound.least is None or bound.gap is None:
        text = "no lower bound of the placement cost is known"
    elif bound.proven:
        text = f"no placement costs less ({_cost(bound.estimate)} nats): {bound.by}"
    else:
        text = (
            f"placement costs {_cost(bound.estimate)} nats, none costs less than "
            f"{_cost(bound.least)} (gap {percent(bound.gap)}): {bound.by}"
        )
    page.paragraph(text, indent=1)
    if bound.floor:
        page.paragraph(
            f"error of every plan: at least {_cost(bound.floor)} nats, this one "
            f"{_cost(plan.figures.costs.total)}: {bound.floor_by}",
            indent=1,
        )
    route = plan.route
    if route.held_out:
        page.paragraph(
            f"{count(plan.figures.swaps, 'swap')} in the included route, "
            f"{significant(route.expected_swaps)} on average over "
            f"{count(route.held_out, 'route')} that the search never saw",
            indent=1,
        )
    if checked:
        page.paragraph(checked, indent=1)
    calibrated = plan.calibrated or "a date not given"
    page.paragraph(
        f"all figures are estimates from the calibration of {calibrated}, made to "
        "compare plans; no promise",
        indent=1,
    )
    page.paragraph(f"assumed: {plan.assumed}", indent=1)
    for note in plan.notes:
        page.paragraph(f"note: {note}", indent=1)


def _cost(cost: int) -> str:
    return significant(nats(cost))
