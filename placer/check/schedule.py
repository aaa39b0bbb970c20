"""The planned schedule: order, durations, who holds which site, the placement cost."""

from __future__ import annotations

import itertools
from typing import TYPE_CHECKING, NamedTuple

if TYPE_CHECKING:
    from placer.check.case import Case, Lease, Planned
    from placer.check.numbers import Numbers
    from placer.recipes.circuit import Built, Op

Kind = tuple[bool, bool, bool]


class Base(NamedTuple):
    """A recipe in nominal times: length, live time per slot, level-2 time per wire."""

    length: int
    live: dict[int, int]
    high: dict[int, int]


class Stay(NamedTuple):
    """A wire's stay on its site; `until` is `None` to the end of the program."""

    begin: int
    until: int | None


def nominal(op: Op, numbers: Numbers) -> int:
    """Return the nominal time of a fine operation."""
    if op.name == "barrier":
        return 0
    if op.name in ("cx", "cz"):
        return numbers.two_ns
    if op.name == "level2":
        return numbers.high_ns
    if op.name in ("t", "tdg"):
        return numbers.tee_ns
    if op.name == "measure":
        return numbers.read_ns
    if op.name == "reset":
        return numbers.wipe_ns
    return numbers.one_ns


def base_of(built: Built, numbers: Numbers) -> Base:
    """Return what a recipe takes when every operation starts as soon as it can."""
    free: dict[int, int] = {}
    begin: dict[int, int] = {}
    answered: dict[int, int] = {}
    entered: dict[int, int] = {}
    high: dict[int, int] = {}
    for op in built.fine.ops:
        at = max([free.get(w, 0) for w in op.wires], default=0)
        if op.condition is not None:
            at = max(at, answered[op.condition] + numbers.latency_ns)
        done = at + nominal(op, numbers)
        for w in op.wires:
            begin.setdefault(w, at)
            free[w] = done
        if op.bit is not None:
            answered[op.bit] = done
        for w in op.enters:
            entered[w] = at
        for w in op.leaves:
            high[w] = high.get(w, 0) + done - entered.pop(w)
    live = {
        slot: free.get(built.fine.operands + slot, 0)
        - begin.get(built.fine.operands + slot, 0)
        for slot in range(len(built.slots))
    }
    return Base(max(free.values(), default=0), live, high)


def meetings(built: Built) -> dict[tuple[int, int, Kind], int]:
    """Count a recipe's two-body gates by pair of local wires and kind."""
    counts: dict[tuple[int, int, Kind], int] = {}
    for op in built.fine.ops:
        if op.name not in ("cx", "cz", "level2"):
            continue
        a, b = min(op.wires), max(op.wires)
        high = op.name == "level2"
        kind = (
            high,
            high and a in built.level2_wires,
            high and b in built.level2_wires,
        )
        counts[a, b, kind] = counts.get((a, b, kind), 0) + 1
    return counts


class Schedule:
    """Everything about the planned times of one case."""

    def __init__(self, case: Case) -> None:
        self.case = case
        self.end = max((s.end for s in case.steps), default=0)
        self.uses: dict[int, list[Planned]] = {}
        for step in case.steps:
            for w in step.op.wires:
                self.uses.setdefault(w, []).append(step)
        self._bases: dict[int, Base] = {}

    def base(self, step: Planned) -> Base:
        """Return the base of a step's recipe, worked out once per recipe."""
        key = id(step.built)
        if key not in self._bases:
            self._bases[key] = base_of(step.built, self.case.numbers)
        return self._bases[key]

    def check(self) -> None:
        """Apply every rule of the planned schedule."""
        self._capabilities()
        self._orders()
        self._durations()
        self._holders()
        self._estimate()

    def _capabilities(self) -> None:
        case = self.case
        only = set(case.data["only"])
        for step in case.steps:
            if not step.op.is_call:
                continue
            built = step.built
            is_plain = built.workspace == "none" and step.op.controls == 2
            if only and not is_plain and built.workspace not in only:
                case.find(
                    "recipe-excluded",
                    step.label,
                    f"'{built.recipe}' uses {built.workspace}, allowed: {sorted(only)}",
                )
            able = case.device.capabilities
            if built.needs_measurement and not (
                able.mid_circuit_measurement and able.conditional_ns is not None
            ):
                case.find(
                    "capability-missing",
                    step.label,
                    f"'{built.recipe}' measures, {case.device.name} cannot in mid-run",
                )
            for w in built.level2_wires:
                if case.device.sites[step.where[w]].level2 is None:
                    case.find(
                        "level2-missing",
                        step.label,
                        f"site {step.where[w]} has no level 2",
                    )

    def _orders(self) -> None:
        for w, steps in self.uses.items():
            for one, two in itertools.pairwise(steps):
                if two.start < one.end:
                    self.case.find(
                        "order-broken",
                        two.label,
                        f"starts at {two.start}, {one.label} on wire "
                        f"{self.case.program.wire_names[w]} ends at {one.end}",
                    )

    def _durations(self) -> None:
        numbers = self.case.numbers
        for step in self.case.steps:
            length: int | None = self.base(step).length
            for (a, b, kind), count in meetings(step.built).items():
                met = numbers.meeting(step.where[a], step.where[b], kind)
                if met is None or length is None:
                    length = None
                else:
                    length += count * met[1] * numbers.move_ns
            if length is None:
                self.case.find(
                    "level2-off-link", step.label, "no fitting link in reach"
                )
            elif step.start < 0 or step.end - step.start != length:
                self.case.find(
                    "duration-misstated",
                    step.label,
                    f"[{step.start}, {step.end}) is stated, it takes {length} ns",
                )

    def stay(self, w: int) -> Stay | None:
        """Return when a wire holds its site, `None` if it never does."""
        register = self.case.program.register_at(w)
        steps = self.uses.get(w, [])
        if register.start == "zero" and not steps:
            return None
        if register.workspace and not steps:
            return None
        begin = steps[0].start if register.start == "zero" else 0
        return Stay(begin, steps[-1].end if register.workspace else None)

    def _holders(self) -> None:
        case = self.case
        stays: dict[int, list[tuple[Stay, int]]] = {}
        for w, site in enumerate(case.sites):
            stay = self.stay(w)
            if stay is None:
                continue
            for other, v in stays.get(site, []):
                if _overlap(stay, other):
                    names = case.program.wire_names
                    case.find(
                        "two-things-one-site",
                        f"site {site}",
                        f"wires {names[v]} and {names[w]} hold it at the same time",
                    )
            stays.setdefault(site, []).append((stay, w))
        leased: dict[int, list[tuple[Planned, Lease]]] = {}
        for step in case.steps:
            if len(set(step.where)) < len(step.where):
                case.find(
                    "two-things-one-site",
                    step.label,
                    "two of its wires or slots are on one site",
                )
            for lease in step.leases:
                for other_step, other_lease in leased.get(lease.site, []):
                    if lease.start < other_lease.end and other_lease.start < lease.end:
                        case.find(
                            "two-things-one-site",
                            f"site {lease.site}",
                            f"leased to {other_step.label} and {step.label} at once",
                        )
                leased.setdefault(lease.site, []).append((step, lease))
                self._lender(step, lease, stays.get(lease.site, []))

    def _lender(
        self, step: Planned, lease: Lease, stays: list[tuple[Stay, int]]
    ) -> None:
        case = self.case
        names = case.program.wire_names
        span = Stay(lease.start, lease.end)
        holders = [w for stay, w in stays if _overlap(stay, span)]
        expected = names[holders[0]] if holders else None
        label = f"{step.label}, slot {lease.slot}"
        if lease.kind == "clean" and holders:
            case.find(
                "two-things-one-site",
                f"site {lease.site}",
                f"{label} leases it as clean while wire {expected} holds it",
            )
            return
        if lease.lender != expected:
            case.find(
                "lender-misstated",
                label,
                f"lender {lease.lender} is stated, site {lease.site} is held by "
                f"{expected}",
            )
        for w in holders:
            if not case.program.register_at(w).lendable:
                case.find("lender-unlendable", label, f"{names[w]} must not be lent")
            for use in self.uses.get(w, []):
                if use is step or (use.start < lease.end and lease.start < use.end):
                    case.find(
                        "lender-busy",
                        label,
                        f"{names[w]} is used by {use.label} over [{use.start}, "
                        f"{use.end}), lent over [{lease.start}, {lease.end})",
                    )

    def _estimate(self) -> None:
        case, numbers = self.case, self.case.numbers
        total = sum(self._step_cost(step) for step in case.steps)
        for w, site in enumerate(case.sites):
            stay = self.stay(w)
            if stay is None:
                continue
            steps = self.uses.get(w, [])
            register = case.program.register_at(w)
            done = register.workspace or (
                bool(steps) and steps[-1].op.kind in ("measure", "reset")
            )
            until = steps[-1].end if done else self.end
            total += numbers.rate(site) * (until - stay.begin)
            if register.start == "zero" and steps:
                total += numbers.prep(site)
        stated = case.data["bound"]["estimate"]
        if total != stated:
            case.find(
                "estimate-misstated", "bound", f"{stated} is stated, it is {total}"
            )

    def _step_cost(self, step: Planned) -> int:
        numbers = self.case.numbers
        total = 0
        for (a, b, kind), count in meetings(step.built).items():
            met = numbers.meeting(step.where[a], step.where[b], kind)
            total += 0 if met is None else count * met[0]
        for op in step.built.fine.ops:
            if op.name in ("cx", "cz", "level2", "barrier"):
                continue
            site = step.where[op.wires[0]]
            if op.name == "measure":
                total += numbers.read(site)
            elif op.name == "reset":
                total += numbers.wipe(site)
            elif op.name in ("t", "tdg"):
                total += numbers.tee(site)
            else:
                total += numbers.one(site)
        base = self.base(step)
        for w, span in base.high.items():
            high = numbers.high_rate(step.where[w])
            if high is not None:
                total += max(0, high - numbers.rate(step.where[w])) * span
        for lease in step.leases:
            if lease.lender is None:
                total += numbers.rate(lease.site) * base.live[lease.slot]
            if lease.kind == "clean":
                total += numbers.prep(lease.site)
        return total


def _overlap(one: Stay, two: Stay) -> bool:
    first = one.until is None or two.begin < one.until
    second = two.until is None or one.begin < two.until
    if one.until is None and two.until is None:
        return True
    return first and second
