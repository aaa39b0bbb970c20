"""A complete set of choices, its schedule in order, and its placement cost.

In: recipes, sites and slot sites per step.  Out: the earliest schedule that keeps a
given order, and the cost that DEVELOPERS.md defines.  No search happens here.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from placer.planner.profile import Profile, profile_of

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.problem import Problem
    from placer.program.model import Operation
    from placer.tables import Tables

END = 1 << 62
"""A time after every other; stays that last to the end of the program end here."""


class Misfit(Exception):  # noqa: N818 - a search move that leads nowhere, not a mistake
    """These choices break a rule of the device or of time."""


@dataclass(frozen=True, slots=True)
class Placement:
    """Sites per wire, recipe index per step, slot sites per step, start per step."""

    sites: tuple[int, ...]
    recipes: tuple[int, ...]
    slot_sites: tuple[tuple[int, ...], ...]
    starts: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Wire:
    """What the schedule needs to know of a wire; `uses` are its steps in order."""

    is_known_zero: bool
    is_workspace: bool
    is_lendable: bool
    uses: tuple[int, ...]
    ends_known: bool


@dataclass(frozen=True, slots=True)
class Instance:
    """A problem with its device tables and profiles: what every stage works on.

    `follows` lists steps (earlier, later) that share no wire and still keep their
    order: measurements into one classical bit, and the gates that wait for it.
    """

    problem: Problem
    tables: Tables
    wires: tuple[Wire, ...]
    operands: tuple[tuple[int, ...], ...]
    profiles: tuple[tuple[Profile, ...], ...]
    usable: tuple[int, ...]
    follows: tuple[tuple[int, int], ...] = ()

    @property
    def steps(self) -> int:
        """Number of steps of the program."""
        return len(self.operands)


@dataclass(frozen=True, slots=True)
class Evaluation:
    """A placement's cost, ends per step, lender (wire or -1) per slot of each step."""

    cost: int
    ends: tuple[int, ...]
    lenders: tuple[tuple[int, ...], ...]


def make_instance(problem: Problem, tables: Tables) -> Instance:
    """Return the problem in the form that the stages work on."""
    program = problem.program
    uses: list[list[int]] = [[] for _ in program.wire_names]
    for op in program.operations:
        for wire in op.wires:
            uses[wire].append(op.index)
    wires = []
    for number, steps in enumerate(uses):
        register = program.register_at(number)
        last = program.operations[steps[-1]].kind if steps else ""
        wires.append(
            Wire(
                register.start == "zero",
                register.workspace,
                register.lendable,
                tuple(steps),
                register.workspace or last in ("measure", "reset"),
            )
        )
    cache: dict[int, Profile] = {}
    profiles = []
    for built_list in problem.choices:
        row = []
        for built in built_list:
            if id(built) not in cache:
                cache[id(built)] = profile_of(built, tables)
            row.append(cache[id(built)])
        profiles.append(tuple(row))
    return Instance(
        problem,
        tables,
        tuple(wires),
        tuple(tuple(op.wires) for op in program.operations),
        tuple(profiles),
        tuple(s.id for s in problem.device.sites if s.in_service),
        _by_bits(program.operations),
    )


def _by_bits(operations: Sequence[Operation]) -> tuple[tuple[int, int], ...]:
    """Return the pairs of steps whose order one classical bit demands.

    A measurement comes after the one before it into the same bit and after the gates
    that waited for that one; a gate comes after the measurement it waits for.
    """
    written: dict[str, int] = {}
    heard: dict[str, list[int]] = {}
    pairs = []
    for op in operations:
        if op.condition is not None and op.condition in written:
            pairs.append((written[op.condition], op.index))
            heard.setdefault(op.condition, []).append(op.index)
        if op.bit is not None:
            before = [written[op.bit]] if op.bit in written else []
            before += heard.pop(op.bit, [])
            pairs += [(one, op.index) for one in before]
            written[op.bit] = op.index
    return tuple(pairs)


def earlier_steps(instance: Instance) -> dict[int, list[int]]:
    """Return per step the steps it must follow though they share no wire."""
    earlier: dict[int, list[int]] = {}
    for one, two in instance.follows:
        earlier.setdefault(two, []).append(one)
    return earlier


def local_sites(
    instance: Instance, step: int, sites: Sequence[int], slots: Sequence[int]
) -> tuple[int, ...]:
    """Return the site of each local wire of a step: operands, then slots."""
    return (*(sites[w] for w in instance.operands[step]), *slots)


def duration(instance: Instance, profile: Profile, where: Sequence[int]) -> int:
    """Return the planned duration of a step at given sites, in ns."""
    total = profile.base_ns
    for pair in profile.pairs:
        away = int(instance.tables.away(pair.mask)[where[pair.a], where[pair.b]])
        if away >= instance.tables.far:
            raise Misfit("no fitting link within reach")
        total += pair.count * away * instance.tables.move_ns
    return total


def step_cost(instance: Instance, profile: Profile, where: Sequence[int]) -> int:
    """Return the cost of a step's gates, measurements and moves at given sites."""
    tables = instance.tables
    total = 0
    for pair in profile.pairs:
        price = int(tables.pair_cost(pair.mask)[where[pair.a], where[pair.b]])
        if price >= tables.far_cost:
            raise Misfit("no fitting link within reach")
        total += pair.count * price
    for local, site in enumerate(where):
        total += profile.ones[local] * int(tables.one[site])
        total += profile.tees[local] * int(tables.tee[site])
        total += profile.reads[local] * int(tables.read[site])
        total += profile.wipes[local] * int(tables.wipe[site])
        if profile.level2_ns[local]:
            if tables.rate2[site] < 0:
                raise Misfit("the site has no level 2")
            extra = max(0, int(tables.rate2[site]) - int(tables.rate[site]))
            total += extra * profile.level2_ns[local]
    return total


def schedule(
    instance: Instance,
    order: Sequence[int],
    sites: Sequence[int],
    recipes: Sequence[int],
    slot_sites: Sequence[Sequence[int]],
) -> tuple[int, ...]:
    """Return the earliest starts that keep an order of steps.

    Every step starts as soon as its wires, its lenders and its slots' sites are free
    of what comes before it in the order.
    """
    wire_ready = [0] * len(instance.wires)
    site_ready: dict[int, int] = {}
    holder = {
        sites[w]: w
        for w, wire in enumerate(instance.wires)
        if not wire.is_known_zero and not (wire.is_workspace and not wire.uses)
    }
    starts = [0] * instance.steps
    earlier = earlier_steps(instance)
    ends: dict[int, int] = {}
    for step in order:
        profile = instance.profiles[step][recipes[step]]
        slots = slot_sites[step]
        where = local_sites(instance, step, sites, slots)
        start = max((ends.get(one, 0) for one in earlier.get(step, ())), default=0)
        for w in instance.operands[step]:
            start = max(start, wire_ready[w])
            if instance.wires[w].uses[0] == step and instance.wires[w].is_known_zero:
                start = max(start, site_ready.get(sites[w], 0))
        for site in slots:
            start = max(start, site_ready.get(site, 0))
            if site in holder:
                start = max(start, wire_ready[holder[site]])
        end = start + duration(instance, profile, where)
        starts[step] = start
        ends[step] = end
        for w in instance.operands[step]:
            wire_ready[w] = end
            wire = instance.wires[w]
            if wire.uses[0] == step:
                holder[sites[w]] = w
            if wire.uses[-1] == step and wire.is_workspace:
                del holder[sites[w]]
                site_ready[sites[w]] = max(site_ready.get(sites[w], 0), end)
        for site in slots:
            site_ready[site] = max(site_ready.get(site, 0), end)
            if site in holder:
                lender = holder[site]
                wire_ready[lender] = max(wire_ready[lender], end)
    return tuple(starts)


def evaluate(instance: Instance, placement: Placement) -> Evaluation:
    """Return the placement cost, straight from its definition.

    Raises
    ------
    Misfit
        If the placement breaks a rule; the text says which.
    """
    tables = instance.tables
    ends = []
    cost = 0
    for step in range(instance.steps):
        profile = instance.profiles[step][placement.recipes[step]]
        where = local_sites(instance, step, placement.sites, placement.slot_sites[step])
        if len(set(where)) != len(where):
            raise Misfit(f"step {step} has two local wires on one site")
        ends.append(placement.starts[step] + duration(instance, profile, where))
        cost += step_cost(instance, profile, where)
    makespan = max(ends, default=0)
    stays = _stays(instance, placement, ends, makespan)
    _no_overlap(placement, stays, makespan)
    for w, wire in enumerate(instance.wires):
        stay = stays[w]
        if stay is None:
            continue
        site = placement.sites[w]
        to = ends[wire.uses[-1]] if wire.ends_known and wire.uses else makespan
        cost += int(tables.rate[site]) * (to - stay[0])
        if wire.is_known_zero and wire.uses:
            cost += int(tables.prep[site])
    lenders, lease_cost = _leases(instance, placement, ends, stays)
    return Evaluation(cost + lease_cost, tuple(ends), lenders)


def keeps_limits(instance: Instance, placement: Placement) -> bool:
    """Whether a valid placement keeps the budget's limits on sites and on time.

    A wire in |0> without a step never stays anywhere, so its site does not count.
    """
    budget = instance.problem.budget
    ends = evaluate(instance, placement).ends
    if budget.longest_ns is not None and max(ends, default=0) > budget.longest_ns:
        return False
    if budget.most_sites is None:
        return True
    used = {p for row in placement.slot_sites for p in row}
    for site, wire in zip(placement.sites, instance.wires, strict=True):
        if wire.uses or not wire.is_known_zero:
            used.add(site)
    return len(used) <= budget.most_sites


Stay = tuple[int, int] | None


def _stays(
    instance: Instance, placement: Placement, ends: Sequence[int], makespan: int
) -> list[Stay]:
    stays: list[Stay] = []
    for one, two in instance.follows:
        if placement.starts[two] < ends[one]:
            raise Misfit(f"steps {one} and {two} use one bit in the wrong order")
    for number, wire in enumerate(instance.wires):
        for one, two in zip(wire.uses, wire.uses[1:], strict=False):
            if placement.starts[two] < ends[one]:
                raise Misfit(f"steps {one} and {two} share wire {number} and overlap")
        if wire.is_known_zero:
            if not wire.uses:
                stays.append(None)
                continue
            start = placement.starts[wire.uses[0]]
        else:
            start = 0
        if wire.is_workspace and wire.uses:
            stays.append((start, ends[wire.uses[-1]]))
        elif wire.is_workspace:
            stays.append(None)
        else:
            stays.append((start, max(makespan, start)))
    return stays


def _no_overlap(placement: Placement, stays: Sequence[Stay], makespan: int) -> None:
    by_site: dict[int, list[tuple[int, int]]] = {}
    for w, stay in enumerate(stays):
        if stay is None:
            continue
        # A wire held to the end keeps its site for good, also in an empty program.
        until = END if stay[1] >= makespan else stay[1]
        for other in by_site.get(placement.sites[w], []):
            if stay[0] < other[1] and other[0] < until:
                raise Misfit(f"two wires on site {placement.sites[w]}")
        by_site.setdefault(placement.sites[w], []).append((stay[0], until))


def _leases(
    instance: Instance,
    placement: Placement,
    ends: Sequence[int],
    stays: Sequence[Stay],
) -> tuple[tuple[tuple[int, ...], ...], int]:
    tables = instance.tables
    at_site: dict[int, list[int]] = {}
    for w, stay in enumerate(stays):
        if stay is not None:
            at_site.setdefault(placement.sites[w], []).append(w)
    taken: dict[int, list[tuple[int, int]]] = {}
    lenders: list[tuple[int, ...]] = []
    cost = 0
    for step in range(instance.steps):
        profile = instance.profiles[step][placement.recipes[step]]
        row = []
        span = (placement.starts[step], ends[step])
        for slot, site in enumerate(placement.slot_sites[step]):
            for other in taken.get(site, []):
                if span[0] < other[1] and other[0] < span[1]:
                    raise Misfit(f"two leases on site {site}")
            taken.setdefault(site, []).append(span)
            kind = profile.built.slots[slot]
            lender = _lender(instance, placement, ends, stays, at_site, step, site)
            if lender >= 0 and kind == "clean":
                raise Misfit(f"step {step} takes site {site} as clean, it is held")
            if lender < 0:
                cost += int(tables.rate[site]) * profile.live_ns[slot]
            if kind == "clean":
                cost += int(tables.prep[site])
            row.append(lender)
        lenders.append(tuple(row))
    return tuple(lenders), cost


def _lender(
    instance: Instance,
    placement: Placement,
    ends: Sequence[int],
    stays: Sequence[Stay],
    at_site: dict[int, list[int]],
    step: int,
    site: int,
) -> int:
    span = (placement.starts[step], ends[step])
    for w in at_site.get(site, []):
        stay = stays[w]
        if stay is None or not (span[0] < stay[1] and stay[0] < span[1]):
            continue
        wire = instance.wires[w]
        if not wire.is_lendable:
            raise Misfit(f"wire {w} must not be lent")
        for use in wire.uses:
            if placement.starts[use] < span[1] and span[0] < ends[use]:
                raise Misfit(f"wire {w} is busy while step {step} borrows it")
        return w
    return -1
