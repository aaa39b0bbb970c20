"""A plain follower of routes, straight from the definitions, for the tests.

It reads problems and recipes themselves, not the arrays under test, and works with
times of events and intervals of life instead of per-entry flags.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

from placer.plan import Costs

LINKED = ("cx", "cz", "level2")
Holder = tuple[str, int, int]


@dataclass
class Fine:
    """One fine operation in placed order."""

    name: str
    tokens: list[int]
    holders: list[Holder]
    step: int
    cause: int | None
    enters: list[int]
    leaves: list[int]
    high: list[bool]
    number: int | None = None
    start: int = -1
    end: int = -1


@dataclass
class Event:
    start: int
    end: int
    site: int
    op: Fine | None
    high_after: bool


@dataclass
class Outcome:
    costs: Costs
    time_ns: int
    sites: int
    shares: dict[Holder, float]
    stays: dict[Holder, float]
    fine: list[Fine] = field(default_factory=list)


def fine_circuit(problem, sites, recipes, slot_sites, order, lenders) -> list[Fine]:
    fine: list[Fine] = []
    gates = 0
    for s in order:
        operands = problem.program.operations[s].wires
        where = [sites[w] for w in operands] + list(slot_sites[s])
        who: list[Holder] = [("wire", w, 0) for w in operands]
        for slot in range(len(slot_sites[s])):
            lender = lenders[s][slot]
            who.append(("lease", s, slot) if lender is None else ("wire", lender, 0))
        measured = {}
        for op in recipes[s].fine.ops:
            record = Fine(
                op.name,
                [where[w] for w in op.wires],
                [who[w] for w in op.wires],
                s,
                None if op.condition is None else measured[op.condition],
                [where[w] for w in op.enters],
                [where[w] for w in op.leaves],
                [
                    op.name == "level2" and w in recipes[s].level2_wires
                    for w in op.wires
                ],
            )
            if op.bit is not None:
                measured[op.bit] = len(fine)
            if op.name in LINKED:
                record.number = gates
                gates += 1
            fine.append(record)
    return fine


class Follower:
    """Follow a route and note every event; AssertionError where a rule is broken."""

    def __init__(self, problem, fine, gaps, swaps) -> None:
        self.device = problem.device
        self.problem = problem
        self.fine = fine
        count = len(self.device.sites)
        self.lines: list[list[int]] = [[] for _ in range(count)]
        for i, op in enumerate(fine):
            for token in op.tokens:
                self.lines[token].append(i)
        self.at = list(range(count))
        self.place = list(range(count))
        self.free = [0] * count
        self.level = [False] * count
        self.events: list[list[Event]] = [[] for _ in range(count)]
        self.done: set[int] = set()
        self.cost = dict.fromkeys(Costs.__dataclass_fields__, 0)
        self.touched: set[int] = set()
        self.end = 0
        self.run(gaps, swaps)

    def run(self, gaps, swaps) -> None:
        by_number = {
            op.number: i for i, op in enumerate(self.fine) if op.number is not None
        }
        assert len(gaps) == len(swaps) + 1
        self.settle()
        for i, gap in enumerate(gaps):
            numbers = [g for first, last in gap for g in range(first, last + 1)]
            assert numbers == sorted(set(numbers))
            for number in numbers:
                index = by_number[number]
                assert self.is_next(index), f"gate {number} is not next"
                self.perform(index)
                self.settle()
            if i < len(swaps):
                self.swap(*swaps[i])
        assert len(self.done) == len(self.fine), "something is left undone"

    def is_next(self, index: int) -> bool:
        op = self.fine[index]
        if index in self.done or (op.cause is not None and op.cause not in self.done):
            return False
        return all(self.lines[t][0] == index for t in op.tokens)

    def settle(self) -> None:
        again = True
        while again:
            again = False
            for line in self.lines:
                while (
                    line and self.fine[line[0]].number is None and self.is_next(line[0])
                ):
                    self.perform(line[0])
                    again = True

    def perform(self, index: int) -> None:
        op = self.fine[index]
        sites = [self.place[t] for t in op.tokens]
        start = max((self.free[t] for t in op.tokens), default=0)
        if op.cause is not None:
            latency = self.device.capabilities.conditional_ns
            start = max(start, self.fine[op.cause].end + latency)
        span = self.length_and_cost(op, sites)
        op.start, op.end = start, start + span
        self.end = max(self.end, op.end)
        for token, site in zip(op.tokens, sites, strict=True):
            self.lines[token].pop(0)
            self.touched.add(site)
            self.free[token] = op.end
            if token in op.enters:
                self.level[token] = True
            if token in op.leaves:
                self.level[token] = False
            self.events[token].append(Event(start, op.end, site, op, self.level[token]))
        self.done.add(index)

    def length_and_cost(self, op: Fine, sites: list[int]) -> int:
        site = self.device.sites[sites[0]]
        priced = self.device.t_gate
        if op.name == "barrier":
            return 0
        if op.name in LINKED:
            link = self.device.link(*sites)
            assert link is not None
            assert self.device.is_usable(link)
            if op.name != "level2":
                self.cost["two_qubit"] += cost(link.error)
                return link.time_ns
            assert link.level2_error is not None
            for where, is_high in zip(sites, op.high, strict=True):
                assert not is_high or self.device.sites[where].level2 is not None
            self.cost["level2"] += cost(link.level2_error)
            return link.level2_ns
        if op.name == "measure":
            self.cost["measurement"] += cost(site.readout_error)
            return site.readout_ns
        if op.name == "reset":
            self.cost["preparation"] += cost(site.reset_error)
            return site.reset_ns
        if op.name in ("t", "tdg") and priced is not None:
            self.cost["one_qubit"] += cost(priced.error)
            return priced.time_ns
        self.cost["one_qubit"] += cost(site.gate_error)
        return site.gate_ns

    def swap(self, a: int, b: int) -> None:
        link = self.device.link(a, b)
        assert link is not None
        assert self.device.is_usable(link)
        one, two = self.at[a], self.at[b]
        if self.level[one] or self.level[two]:
            assert link.level2_error is not None
            assert self.device.sites[a].level2 is not None
            assert self.device.sites[b].level2 is not None
            self.cost["swaps"] += 3 * cost(link.level2_error)
            span = 3 * link.level2_ns
        else:
            self.cost["swaps"] += 3 * cost(link.error)
            span = 3 * link.time_ns
        start = max(self.free[one], self.free[two])
        for token, site in ((one, a), (two, b)):
            self.events[token].append(
                Event(start, start + span, site, None, self.level[token])
            )
            self.free[token] = start + span
        self.at[a], self.at[b] = two, one
        self.place[one], self.place[two] = b, a
        self.touched |= {a, b}
        self.end = max(self.end, start + span)


def cost(error: float) -> int:
    return math.ceil(-math.log1p(-error) * 1e12 - 1e-6)


def wait_cost(site, span: int, high: bool) -> int:
    t = span / 1000.0
    if not high:
        kept1 = 1.0 if site.t1_us is None else math.exp(-t / site.t1_us)
        kept2 = 1.0 if site.t2_us is None else math.exp(-t / site.t2_us)
        fidelity = (1.0 + kept1 + 2.0 * kept2) / 4.0
    else:
        g1, g2 = 1.0 / site.t1_us, 1.0 / site.level2.t1_us
        g = max(0.0, 1.0 / site.t2_us - 0.5 * g1)
        fidelity = (
            1.0
            + math.exp(-g1 * t)
            + math.exp(-g2 * t)
            + 2.0 * math.exp(-(0.5 * g1 + g) * t)
            + 2.0 * math.exp(-(0.5 * (g1 + g2) + g) * t)
            + 2.0 * math.exp(-(0.5 * g2 + 4.0 * g) * t)
        ) / 9.0
    return math.ceil(-math.log(fidelity) * 1e12 - 1e-6)


def evaluate(
    problem, sites, recipes, slot_sites, order, lenders, gaps, swaps
) -> Outcome:
    fine = fine_circuit(problem, sites, recipes, slot_sites, order, lenders)
    walk = Follower(problem, fine, gaps, swaps)
    program = problem.program
    ops_of: dict[Holder, list[Fine]] = {}
    for op in fine:
        for holder in op.holders:
            ops_of.setdefault(holder, []).append(op)
    home: dict[Holder, int] = {}
    alive: dict[Holder, list[tuple[int, int]]] = {}
    used = {w for op in program.operations for w in op.wires}
    for w in range(len(program.wire_names)):
        register = program.register_at(w)
        holder = ("wire", w, 0)
        mine = ops_of.get(holder, [])
        if register.start == "zero" and not mine:
            continue
        home[holder] = sites[w]
        if register.workspace and not mine:
            continue
        begin = 0 if register.start == "unknown" else mine[0].start
        closed = mine and (register.workspace or mine[-1].name in ("measure", "reset"))
        end = mine[-1].end if closed else walk.end
        spans = []
        for op, after in zip(mine, [*mine[1:], None], strict=False):
            if op.name == "reset":
                spans.append((begin, op.end))
                begin = end if after is None else after.start
        alive[holder] = [*spans, (begin, end)]
    for s in order:
        for slot, lender in enumerate(lenders[s]):
            holder = ("lease", s, slot)
            if lender is None and holder in ops_of:
                home[holder] = slot_sites[s][slot]
                mine = ops_of[holder]
                alive[holder] = [(min(o.start for o in mine), max(o.end for o in mine))]
    decay = 0
    for token, events in enumerate(walk.events):
        living = [i for h, spans in alive.items() if home[h] == token for i in spans]
        for t0, t1, site, high in windows(walk, token, events):
            charged = sum(max(0, min(t1, b) - max(t0, a)) for a, b in living)
            assert charged in (0, t1 - t0), "a wait is charged in full or not at all"
            decay += wait_cost(problem.device.sites[site], charged, high)
    walk.cost["decay"] = decay
    for s in order:
        for slot, kind in enumerate(recipes[s].slots):
            if kind == "clean":
                error = problem.device.sites[slot_sites[s][slot]].prep_error
                walk.cost["preparation"] += cost(error)
    for w in used:
        if program.register_at(w).start == "zero":
            walk.cost["preparation"] += cost(problem.device.sites[sites[w]].prep_error)
    for w in range(len(program.wire_names)):
        if program.register_at(w).start == "unknown":
            walk.touched.add(sites[w])
    shares, stays = lives(problem, walk, home, ops_of)
    return Outcome(Costs(**walk.cost), walk.end, len(walk.touched), shares, stays, fine)


def windows(walk, token, events):
    """Waits on a token: begin, end, site, level 2 or not."""
    now, high, site = 0, False, token
    for event in events:
        if event.start > now:
            yield now, event.start, event.site, high
        now, high = event.end, event.high_after
        site = walk.place[token]
    if walk.end > now:
        yield now, walk.end, site, high


def lives(problem, walk, home, ops_of):
    """Share of min(T1, T2) per value, longest share of a stay in level 2 per holder."""
    shares, stays = {}, {}

    def life(number: int) -> float:
        site = problem.device.sites[number]
        return min(1e3 * t for t in (site.t1_us, site.t2_us))

    for holder, mine in ops_of.items():
        token = home[holder]
        is_value = (
            holder[0] == "lease" or problem.program.register_at(holder[1]).workspace
        )
        first, last = min(o.start for o in mine), max(o.end for o in mine)
        resets = {o.end for o in mine if o.name == "reset"}
        pieces = pieces_of(walk, token)
        if is_value:
            total = 0.0
            resting = False
            for t0, t1, site, op in pieces:
                if op is not None:
                    resting = False
                inside = max(0, min(t1, last) - max(t0, first))
                if not resting:
                    total += inside / life(site)
                if op is not None and op.name == "reset" and op.end in resets:
                    resting = True
            shares[holder] = total
        stay, worst, inside_high = 0.0, 0.0, False
        for t0, t1, site, op in pieces:
            if op is not None and token in op.enters and not inside_high:
                inside_high, stay, whose = True, 0.0, holder in op.holders
            if inside_high:
                stay += (t1 - t0) / (1e3 * problem.device.sites[site].level2.t1_us)
                if whose:
                    worst = max(worst, stay)
            if op is not None and token in op.leaves:
                inside_high = False
        stays[holder] = worst
    return shares, stays


def pieces_of(walk, token):
    """The whole time of a token: begin, end, site at the begin, operation or None."""
    now, site = 0, token
    pieces = []
    for event in walk.events[token]:
        if event.start > now:
            pieces.append((now, event.start, event.site, None))
        pieces.append((event.start, event.end, event.site, event.op))
        now = event.end
        site = walk.place[token]
    if walk.end > now:
        pieces.append((now, walk.end, site, None))
    return pieces
