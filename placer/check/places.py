"""Who holds which site when: stays of wires, leases of slots, lenders.

All intervals are half-open; two of them clash if they have a time in common, so
touching is allowed.
"""

from __future__ import annotations

from bisect import bisect_left
from typing import TYPE_CHECKING, NamedTuple

if TYPE_CHECKING:
    from placer.check.case import Case, Lease, Planned


class Hold(NamedTuple):
    """A time [begin, end) on a site, and who is there; `wire` is -1 for a lease."""

    begin: int
    end: int
    label: str
    wire: int


def stay_of(case: Case, wire: int) -> tuple[int, int] | None:
    """Return when a wire holds its site, `None` if it never does."""
    register = case.program.register_at(wire)
    steps = case.uses.get(wire)
    if not steps:
        waits = register.start == "unknown" and not register.workspace
        return (0, case.end) if waits else None
    begin = 0 if register.start == "unknown" else steps[0].start
    return begin, steps[-1].end if register.workspace else case.end


def check_places(case: Case) -> None:
    """A site holds one thing at a time; lenders are idle, there, and may be lent."""
    stays: dict[int, list[Hold]] = {}
    leases: dict[int, list[Hold]] = {}
    for wire, site in enumerate(case.sites):
        stay = stay_of(case, wire)
        if stay is not None:
            label = f"wire {case.program.wire_names[wire]}"
            # Wires that are never given up clash even in a program without length.
            until = stay[1] + (not case.program.register_at(wire).workspace)
            hold = Hold(stay[0], until, label, wire)
            stays.setdefault(site, []).append(hold)
    lenders = _Lenders(case)
    for step in case.steps:
        for lease in step.leases:
            label = f"{step.label}, slot {lease.slot}"
            hold = Hold(lease.start, lease.end, label, -1)
            leases.setdefault(lease.site, []).append(hold)
            there = [h for h in stays.get(lease.site, ()) if _clash(h, hold)]
            lenders.check(lease, label, there)
    _check_single(case, stays, leases)


def _clash(one: Hold, two: Hold) -> bool:
    return max(one.begin, two.begin) < min(one.end, two.end)


def _check_single(
    case: Case, stays: dict[int, list[Hold]], leases: dict[int, list[Hold]]
) -> None:
    """Stays clash with no stay, leases with no lease, clean leases with neither.

    Leases of one step clash even where the step takes no time.
    """
    clashes: list[tuple[int, str, str]] = []
    for holds in (stays, leases):
        for site in sorted(holds):
            furthest: Hold | None = None
            for hold in sorted(holds[site]):
                if furthest is not None and _clash(furthest, hold):
                    clashes.append((site, furthest.label, hold.label))
                if furthest is None or hold.end > furthest.end:
                    furthest = hold
    for step in case.steps:
        for lease in step.leases:
            if lease.kind != "clean":
                continue
            hold = Hold(lease.start, lease.end, f"{step.label}, slot {lease.slot}", -1)
            clashes.extend(
                (lease.site, other.label, hold.label)
                for other in stays.get(lease.site, ())
                if _clash(other, hold)
            )
        if len(set(step.where)) < len(step.where):
            twice = next(p for p in step.where if step.where.count(p) > 1)
            clashes.append((twice, step.label, "the same step"))
    for site, one, two in clashes:
        text = f"held by {one} and by {two} at the same time"
        case.find("two-things-one-site", f"site {site}", text)


class _Lenders:
    """The steps of every wire in planned order, to ask whether it is idle."""

    def __init__(self, case: Case) -> None:
        self.case = case
        self.known: dict[int, tuple[list[Planned], list[int], int]] = {}

    def check(self, lease: Lease, label: str, there: list[Hold]) -> None:
        """A borrowed slot names the one wire that holds its site, and may use it."""
        if lease.kind != "borrowed":
            return
        case = self.case
        names = [case.program.wire_names[hold.wire] for hold in there]
        wanted: list[str | None] = [*names] or [None]
        if lease.lender not in wanted:
            holder = names[0] if names else "nothing"
            text = f"lender {lease.lender}, but site {lease.site} is held by {holder}"
            case.find("lender-misstated", label, text)
        for hold, name in zip(there, names, strict=True):
            if not case.program.register_at(hold.wire).lendable:
                case.find("lender-unlendable", label, f"{name} must not be lent")
            for use in self._uses(hold.wire, lease):
                span = f"[{use.start}, {use.end})"
                text = f"{name} is lent over [{lease.start}, {lease.end}) and used by "
                case.find("lender-busy", label, f"{text}{use.label} over {span}")

    def _uses(self, wire: int, lease: Lease) -> list[Planned]:
        """Return the steps of a wire that share time with a lease."""
        if wire not in self.known:
            steps = sorted(self.case.uses.get(wire, ()), key=lambda s: s.start)
            longest = max((s.end - s.start for s in steps), default=0)
            self.known[wire] = (steps, [s.start for s in steps], longest)
        steps, starts, longest = self.known[wire]
        found = []
        at = bisect_left(starts, lease.end) - 1
        while at >= 0 and starts[at] + longest > lease.start:
            step = steps[at]
            if max(step.start, lease.start) < min(step.end, lease.end):
                found.append(step)
            at -= 1
        return found[::-1]
