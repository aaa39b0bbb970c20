"""The placement cost, summed from its definition."""

from __future__ import annotations

from typing import TYPE_CHECKING

from placer.check.base import TWO_BODY, base_of
from placer.check.places import stay_of

if TYPE_CHECKING:
    from collections.abc import Callable

    from placer.check.case import Case, Planned


def check_estimate(case: Case) -> None:
    """The stated placement cost is what its definition gives."""
    total = sum(_step_cost(case, step) for step in case.steps)
    total += sum(_wire_cost(case, wire) for wire in range(len(case.sites)))
    stated = case.data["bound"]["estimate"]
    if total != stated:
        text = f"placement cost {stated} is stated, its definition gives {total}"
        case.find("estimate-misstated", "bound", text)


def _wire_cost(case: Case, wire: int) -> int:
    """Decay over the charged time, and preparation where the wire starts in |0>."""
    stay = stay_of(case, wire)
    if stay is None:
        return 0
    site, steps = case.sites[wire], case.uses.get(wire, [])
    until = stay[1]
    if steps and steps[-1].op.kind in ("measure", "reset"):
        until = steps[-1].end
    cost = case.numbers.rate(site) * (until - stay[0])
    if case.program.register_at(wire).start == "zero":
        cost += case.numbers.prep(site)
    return cost


def _step_cost(case: Case, step: Planned) -> int:
    numbers = case.numbers
    base = base_of(step.built, numbers)
    total = 0
    for (a, b, kind), count in base.pairs.items():
        met = numbers.meeting(step.where[a], step.where[b], kind)
        total += 0 if met is None else count * met[0]
    prices: dict[str, Callable[[int], int]] = {
        "measure": numbers.read,
        "reset": numbers.wipe,
        "t": numbers.tee,
        "tdg": numbers.tee,
        "barrier": lambda _: 0,
    }
    for op in step.built.fine.ops:
        if op.name not in TWO_BODY:
            total += prices.get(op.name, numbers.one)(step.where[op.wires[0]])
    for wire, span in base.high.items():
        site = step.where[wire]
        high = numbers.high_rate(site)
        # A site without level 2 is a finding of its own.
        total += 0 if high is None else max(0, high - numbers.rate(site)) * span
    for lease in step.leases:
        if lease.lender is None:
            total += numbers.rate(lease.site) * base.live[lease.slot]
        if lease.kind == "clean":
            total += numbers.prep(lease.site)
    return total
