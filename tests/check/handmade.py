"""Plans made by hand: one step after the other, swaps along a shortest way.

A second, slow and plain implementation of the definitions in DEVELOPERS.md, written in
another manner than the check: distances between all pairs first, a diary of everything
that happens, lives as intervals of time.  Nothing is optimised.
"""

from __future__ import annotations

import dataclasses
import math
from dataclasses import dataclass, field
from itertools import pairwise, product
from typing import Any

from placer.device.fidelity import (
    dephasing_rate,
    level2_process_fidelity,
    process_fidelity,
)
from placer.device.model import Device
from placer.device.read import read_device
from placer.plan import (
    Bound,
    Costs,
    Figures,
    Lease,
    Limit,
    Plan,
    PolicyRow,
    Route,
    Source,
    Step,
    Verdict,
    to_json,
)
from placer.problem import as_written
from placer.program.model import Operation, Program
from placer.program.read import read_program
from placer.recipes import catalog
from placer.recipes.circuit import Built, Op
from placer.units import (
    cost_of_error,
    cost_of_fidelity,
    rate_per_tick,
    success_of,
)

BODIES = ("cx", "cz", "level2")
Pair = tuple[int, int]


@dataclass
class Event:
    """One thing that happened: to which tokens, where they were, for whom."""

    name: str
    begin: int
    end: int
    tokens: list[int]
    sites: list[int]
    holders: list[str]
    enters: list[int] = field(default_factory=list)
    leaves: list[int] = field(default_factory=list)
    cost: int = 0


@dataclass
class Item:
    """One operation of the placed circuit that may still have to happen."""

    op: Op
    tokens: list[int]
    holders: list[str]
    built: Built
    waits_for: int | None
    event: Event | None = None


def median(values: list[int]) -> int:
    return sorted(values)[(len(values) - 1) // 2] if values else 0


class Map:
    """A device with all distances written down."""

    def __init__(self, device: Device) -> None:
        self.device = device
        self.sites = [s for s in device.sites if s.in_service]
        self.links = [k for k in device.links if device.is_usable(k)]
        names = range(len(device.sites))
        self.hops = {(p, q): 0 if p == q else math.inf for p in names for q in names}
        self.walk = dict(self.hops)
        for link in self.links:
            for pair in ((link.a, link.b), (link.b, link.a)):
                self.hops[pair] = 1
                self.walk[pair] = math.ceil(3 * cost_of_error(link.error) / 4)
        for k, p, q in product(names, names, names):
            for table in (self.hops, self.walk):
                table[p, q] = min(table[p, q], table[p, k] + table[k, q])
        self.swap_ns = -(-3 * median([k.time_ns for k in self.links]) // 4)

    def fitting(self, op: Op, built: Built) -> list[tuple[int, int, int]]:
        """Return (site of the first wire, of the second, cost) of all fitting links."""
        found: list[tuple[int, int, int]] = []
        for link in self.links:
            for u, v in ((link.a, link.b), (link.b, link.a)):
                if op.name != "level2":
                    found.append((u, v, cost_of_error(link.error)))
                    continue
                if link.level2_error is None:
                    continue
                needs = [w in built.level2_wires for w in op.wires]
                has = [self.device.sites[x].level2 is not None for x in (u, v)]
                if all(b or not a for a, b in zip(needs, has, strict=True)):
                    found.append((u, v, cost_of_error(link.level2_error)))
        return found

    def nominal(self, op: Op) -> int:
        if op.name == "barrier":
            return 0
        if op.name in ("cx", "cz"):
            return median([k.time_ns for k in self.links])
        if op.name == "level2":
            return median([k.level2_ns for k in self.links if k.level2_ns is not None])
        if op.name == "measure":
            return median([s.readout_ns for s in self.sites])
        if op.name == "reset":
            return median([s.reset_ns for s in self.sites])
        if op.name in ("t", "tdg") and self.device.t_gate is not None:
            return self.device.t_gate.time_ns
        return median([s.gate_ns for s in self.sites])

    def alone(self, op: Op, site: int) -> tuple[str, int, int]:
        """Return cause, cost and time of an operation without a link."""
        where = self.device.sites[site]
        if op.name == "barrier":
            return "one_qubit", 0, 0
        if op.name == "measure":
            return "measurement", cost_of_error(where.readout_error), where.readout_ns
        if op.name == "reset":
            return "preparation", cost_of_error(where.reset_error), where.reset_ns
        priced = self.device.t_gate
        if op.name in ("t", "tdg") and priced is not None:
            return "one_qubit", cost_of_error(priced.error), priced.time_ns
        return "one_qubit", cost_of_error(where.gate_error), where.gate_ns

    def rate(self, site: int) -> int:
        where = self.device.sites[site]
        one = 1 / where.t1_us if where.t1_us else 0.0
        two = 1 / where.t2_us if where.t2_us else 0.0
        return rate_per_tick((one + 2 * two) / 4)

    def rate2(self, site: int) -> int:
        where = self.device.sites[site]
        assert where.level2 is not None
        down = (1 / where.t1_us if where.t1_us else 0.0) + 1 / where.level2.t1_us
        dephasing = dephasing_rate(where.t1_us, where.t2_us)
        return rate_per_tick((3 * down + 12 * dephasing) / 9)

    def life_ns(self, site: int) -> float:
        where = self.device.sites[site]
        known = [t for t in (where.t1_us, where.t2_us) if t is not None]
        return min(known) * 1000 if known else math.inf

    def prep(self, site: int) -> int:
        return cost_of_error(self.device.sites[site].prep_error)


def base_times(built: Built, here: Map) -> list[Pair]:
    """Return start and end of every fine operation in nominal times."""
    times: list[Pair] = []
    for at, op in enumerate(built.fine.ops):
        begin = 0
        for other, (_, end) in zip(built.fine.ops[:at], times, strict=True):
            if set(other.wires) & set(op.wires):
                begin = max(begin, end)
            if op.condition is not None and other.bit == op.condition:
                latency = here.device.capabilities.conditional_ns
                assert latency is not None
                begin = max(begin, end + latency)
        times.append((begin, begin + here.nominal(op)))
    return times


class Handmade:
    """One plan in the making."""

    def __init__(
        self,
        program: Program,
        device: Device,
        *,
        recipes: tuple[str, ...] = (),
        sites: list[int] | None = None,
        lend: bool = True,
    ) -> None:
        self.program, self.device = program, device
        self.map = Map(device)
        self.lend = lend
        usable = [s.id for s in self.map.sites]
        self.home = usable[: len(program.wire_names)] if sites is None else sites
        assert len(set(self.home)) == len(program.wire_names)
        self.uses: dict[int, list[Operation]] = {}
        for op in program.operations:
            for w in op.wires:
                self.uses.setdefault(w, []).append(op)
        self.built = [self._choose(op, recipes) for op in program.operations]
        self.times: list[Pair] = []
        self.leases: list[list[Lease]] = []
        self.where: list[list[int]] = []
        for op, built in zip(program.operations, self.built, strict=True):
            self._place(op, built)
        self.route = Trip(self)

    def _choose(self, op: Operation, recipes: tuple[str, ...]) -> Built:
        if not op.is_call:
            return as_written(op)
        names = catalog.recipe_names(op.kind, op.controls, op.inverse)
        name = next((n for n in recipes if n in names), names[0])
        angle = op.params[0] if op.params else 0.0
        return catalog.build(name, op.kind, op.controls, angle, op.inverse)

    def holds(self, w: int, index: int) -> bool:
        """Whether a wire holds its site during a step."""
        register, uses = self.program.register_at(w), self.uses.get(w, [])
        if not uses:
            return register.start == "unknown" and not register.workspace
        begun = register.start == "unknown" or uses[0].index <= index
        return begun and not (register.workspace and uses[-1].index < index)

    def _place(self, op: Operation, built: Built) -> None:
        held = {
            self.home[w]: w for w in range(len(self.home)) if self.holds(w, op.index)
        }
        where = [self.home[w] for w in op.wires]
        lenders: list[str | None] = []
        for kind in built.slots:
            free = [s.id for s in self.map.sites if s.id not in (*held, *where)]
            lent = [
                p
                for p, w in sorted(held.items())
                if p not in where and self.program.register_at(w).lendable
            ]
            if kind == "borrowed" and self.lend and lent:
                where.append(lent[0])
                lenders.append(self.program.wire_names[held[lent[0]]])
            else:
                where.append(free[0])
                lenders.append(None)
        duration = max((end for _, end in base_times(built, self.map)), default=0)
        for one in built.fine.ops:
            if one.name in BODIES:
                duration += self.meet(one, built, where)[1] * self.map.swap_ns
        start = self.times[-1][1] if self.times else 0
        self.times.append((start, start + duration))
        self.where.append(where)
        self.leases.append(
            [
                Lease(n, where[len(op.wires) + n], kind, *self.times[-1], lenders[n])
                for n, kind in enumerate(built.slots)
            ]
        )

    def meet(self, op: Op, built: Built, where: list[int]) -> Pair:
        """Return cost and distance of a two-body gate."""
        p, q = (where[w] for w in op.wires)
        fitting = self.map.fitting(op, built)
        walk, hops = self.map.walk, self.map.hops
        cost = min(walk[p, u] + c + walk[v, q] for u, v, c in fitting)
        away = min(hops[p, u] + hops[v, q] for u, v, _ in fitting)
        return int(cost), int(away)

    def estimate(self) -> int:
        end = self.times[-1][1] if self.times else 0
        total = 0
        for w, site in enumerate(self.home):
            register, uses = self.program.register_at(w), self.uses.get(w, [])
            if not uses and (register.start == "zero" or register.workspace):
                continue
            begin = 0 if register.start == "unknown" else self.times[uses[0].index][0]
            ends_early = register.workspace or (
                bool(uses) and uses[-1].kind in ("measure", "reset")
            )
            until = self.times[uses[-1].index][1] if ends_early else end
            total += self.map.rate(site) * (until - begin)
            total += self.map.prep(site) if register.start == "zero" else 0
        for op in self.program.operations:
            total += self._step_cost(op.index)
        return total

    def _step_cost(self, index: int) -> int:
        built, where = self.built[index], self.where[index]
        times = base_times(built, self.map)
        total = 0
        for op in built.fine.ops:
            if op.name in BODIES:
                total += self.meet(op, built, where)[0]
            else:
                total += self.map.alone(op, where[op.wires[0]])[1]
        for lease in self.leases[index]:
            local = built.fine.operands + lease.slot
            spans = [
                time
                for op, time in zip(built.fine.ops, times, strict=True)
                if local in op.wires
            ]
            if lease.lender is None and spans:
                live = spans[-1][1] - spans[0][0]
                total += live * self.map.rate(lease.site)
            total += self.map.prep(lease.site) if lease.kind == "clean" else 0
        for w in built.level2_wires:
            rows = list(zip(built.fine.ops, times, strict=True))
            begins = [time[0] for op, time in rows if w in op.enters]
            ends = [time[1] for op, time in rows if w in op.leaves]
            extra = max(0, self.map.rate2(where[w]) - self.map.rate(where[w]))
            total += extra * (sum(ends) - sum(begins))
        return total

    def plan(self) -> Plan:
        """Return the finished plan."""
        program, device = self.program, self.device
        figures = self.route.figures()
        estimate = self.estimate()
        budget = device.budget
        limits = (
            Limit(
                "share of lifetime",
                figures.worst_share,
                budget.share,
                figures.worst_share <= budget.share,
                "share",
                figures.worst_value,
            ),
            Limit("success", figures.success, None, True, "probability"),
            Limit("sites", figures.sites, None, True, "sites"),
            Limit("run time", figures.time_ns, None, True, "ns"),
        )
        fits = limits[0].holds
        rows = (
            PolicyRow("clean", False, "not asked for", False, None, None),
            PolicyRow("none", True, "", fits, figures, estimate),
        )
        least, floor = estimate // 2, figures.costs.total // 2
        return Plan(
            version="handmade",
            program=Source(
                program.name, program.path, program.syntax, program.hash, program.text
            ),
            device=Source(device.name, device.path, "yaml", device.hash, device.text),
            calibrated=device.calibrated,
            open_inputs=program.open_inputs,
            assumed=program.assumed,
            budget=budget,
            goal="error",
            only=(),
            seed=0,
            effort="quick",
            wires=dict(zip(program.wire_names, self.home, strict=True)),
            steps=tuple(self._step(op) for op in program.operations),
            route=Route(tuple(self.route.runs()), tuple(self.route.swaps)),
            figures=figures,
            bound=Bound(estimate, least, "half", False, floor, "half"),
            policies=rows,
            verdict=Verdict(fits, "fits: yes" if fits else "does not fit: no", limits),
        )

    def _step(self, op: Operation) -> Step:
        built, (start, end) = self.built[op.index], self.times[op.index]
        names: tuple[str, ...] = ()
        if op.is_call:
            names = catalog.recipe_names(op.kind, op.controls, op.inverse)
        return Step(
            op.index,
            op.kind,
            op.name,
            op.place.line,
            built.recipe,
            built.workspace,
            start,
            end,
            tuple(self.leases[op.index]),
            tuple((name, "not asked for") for name in names if name != built.recipe),
        )


class Trip:
    """A walk along the placed circuit, and the diary of it."""

    def __init__(self, made: Handmade) -> None:
        self.made, self.map = made, made.map
        self.device = made.device
        self.items: list[Item] = []
        for index in range(len(made.built)):
            self._lay_out(index)
        count = len(self.device.sites)
        self.at = list(range(count))  # where each token is
        self.free = [0] * count
        self.high: set[int] = set()
        self.diary: list[Event] = []
        self.swaps: list[Pair] = []
        self.gaps: list[list[int]] = [[]]
        self._go()

    def _lay_out(self, index: int) -> None:
        made = self.made
        op, built = made.program.operations[index], made.built[index]
        holders = [made.program.wire_names[w] for w in op.wires]
        for lease in made.leases[index]:
            at = f" at line {op.place.line}" if op.place.line else f" in step {index}"
            own = f"slot {lease.slot} of '{op.name}'{at}\0{index}"
            holders.append(own if lease.lender is None else lease.lender)
        wrote: dict[int, int] = {}
        for one in built.fine.ops:
            waits = None if one.condition is None else wrote[one.condition]
            if one.bit is not None:
                wrote[one.bit] = len(self.items)
            tokens = [made.where[index][w] for w in one.wires]
            whom = [holders[w] for w in one.wires]
            self.items.append(Item(one, tokens, whom, built, waits))

    def _is_ready(self, number: int) -> bool:
        item = self.items[number]
        for other in self.items[:number]:
            if other.event is None and set(other.tokens) & set(item.tokens):
                return False
        return item.waits_for is None or self.items[item.waits_for].event is not None

    def _go(self) -> None:
        gate = 0
        for number, item in enumerate(self.items):
            if item.op.name not in BODIES:
                continue
            self._run_alone()
            self._bring_together(item)
            self._happen(number)
            self.gaps[-1].append(gate)
            gate += 1
        self._run_alone()
        assert all(item.event is not None for item in self.items)

    def _run_alone(self) -> None:
        again = True
        while again:
            again = False
            for number, item in enumerate(self.items):
                alone = item.event is None and item.op.name not in BODIES
                if alone and self._is_ready(number):
                    self._happen(number)
                    again = True

    def _happen(self, number: int) -> None:
        item = self.items[number]
        op, sites = item.op, [self.at[t] for t in item.tokens]
        begin = max(self.free[t] for t in item.tokens)
        if item.waits_for is not None:
            answer = self.items[item.waits_for].event
            latency = self.device.capabilities.conditional_ns
            assert answer is not None
            assert latency is not None
            begin = max(begin, answer.end + latency)
        if op.name in BODIES:
            link = self.device.link(*sites)
            assert link is not None
            error = link.level2_error if op.name == "level2" else link.error
            time = link.level2_ns if op.name == "level2" else link.time_ns
            assert error is not None
            assert time is not None
            cost = int(cost_of_error(error))
        else:
            _, cost, time = self.map.alone(op, sites[0])
        local = dict(zip(op.wires, item.tokens, strict=True))
        event = Event(
            op.name,
            begin,
            begin + time,
            item.tokens,
            sites,
            item.holders,
            [local[w] for w in op.enters],
            [local[w] for w in op.leaves],
            cost,
        )
        self.high = (self.high | set(event.enters)) - set(event.leaves)
        self._note(event)
        item.event = event

    def _note(self, event: Event) -> None:
        self.diary.append(event)
        for token in event.tokens:
            self.free[token] = event.end

    def _bring_together(self, item: Item) -> None:
        goals = {(u, v) for u, v, _ in self.map.fitting(item.op, item.built)}
        start = (self.at[item.tokens[0]], self.at[item.tokens[1]])
        highs = frozenset(self.at[t] for t in self.high)
        ways: dict[tuple[Pair, frozenset[int]], list[Pair]] = {(start, highs): []}
        waiting = [(start, highs)]
        for pair, high in waiting:  # grows while it is walked through
            way = ways[pair, high]
            if pair in goals:
                for swap in way:
                    self._swap(*swap)
                return
            for swap in self._swaps_near(pair, high):
                turn = dict([swap, swap[::-1]])
                after = (
                    (turn.get(pair[0], pair[0]), turn.get(pair[1], pair[1])),
                    frozenset(turn.get(p, p) for p in high),
                )
                if after not in ways:
                    ways[after] = [*way, swap]
                    waiting.append(after)
        raise AssertionError("no way to a fitting link")

    def _swaps_near(self, pair: Pair, high: frozenset[int]) -> list[Pair]:
        """Return the swaps that move one of two tokens, as level 2 allows."""
        found: list[Pair] = []
        for link in self.map.links:
            ends = (link.a, link.b)
            able = link.level2_error is not None and all(
                self.device.sites[p].level2 is not None for p in ends
            )
            if set(ends) & set(pair) and (able or not set(ends) & high):
                found.append(ends)
        return found

    def _swap(self, a: int, b: int) -> None:
        link = self.device.link(a, b)
        assert link is not None
        tokens = [self.at.index(a), self.at.index(b)]
        error: float | None = link.error
        time: int | None = link.time_ns
        if set(tokens) & self.high:
            error, time = link.level2_error, link.level2_ns
        assert error is not None
        assert time is not None
        begin = max(self.free[t] for t in tokens)
        cost = 3 * cost_of_error(error)
        self._note(
            Event("swap", begin, begin + 3 * time, tokens, [a, b], [], cost=cost)
        )
        self.at[tokens[0]], self.at[tokens[1]] = b, a
        self.swaps.append((a, b))
        self.gaps.append([])

    def runs(self) -> list[tuple[Pair, ...]]:
        """Return the gates of each gap, every gate a run of its own."""
        return [tuple((gate, gate) for gate in gap) for gap in self.gaps]

    # --- figures

    def figures(self) -> Figures:
        end = max((event.end for event in self.diary), default=0)
        costs = dict.fromkeys((f.name for f in dataclasses.fields(Costs)), 0)
        causes = {"swap": "swaps", "cx": "two_qubit", "cz": "two_qubit"}
        causes |= {"level2": "level2", "measure": "measurement", "reset": "preparation"}
        for event in self.diary:
            costs[causes.get(event.name, "one_qubit")] += event.cost
        costs["preparation"] += self._fresh()
        costs["decay"] = sum(self._decay(t, end) for t in range(len(self.at)))
        named = [event.name for event in self.diary]
        others = ("swap", "barrier", "measure", "reset", *BODIES)
        sites = {site for event in self.diary for site in event.sites}
        for w, site in enumerate(self.made.home):
            register = self.made.program.register_at(w)
            kept = not register.workspace or w in self.made.uses
            if register.start == "unknown" and kept:
                sites.add(site)
        share, name = self._worst()
        whole = Costs(**costs)
        return Figures(
            sites=len(sites),
            swaps=len(self.swaps),
            time_ns=end,
            two_qubit_gates=named.count("cx") + named.count("cz"),
            one_qubit_gates=sum(1 for one in named if one not in others),
            t_gates=named.count("t") + named.count("tdg"),
            measurements=named.count("measure"),
            level2_gates=named.count("level2"),
            costs=whole,
            success=success_of(whole.total),
            worst_share=share,
            worst_value=name,
        )

    def _fresh(self) -> int:
        total = 0
        for w in self.made.uses:
            if self.made.program.register_at(w).start == "zero":
                total += self.map.prep(self.made.home[w])
        for leases in self.made.leases:
            total += sum(self.map.prep(x.site) for x in leases if x.kind == "clean")
        return total

    def _acts(self, holder: str) -> list[Event]:
        """Return all operations of a holder, in time; a site is no holder of a swap."""
        return [event for event in self.diary if holder in event.holders]

    def _alive(self, w: int, end: int) -> list[Pair]:
        """Return the times in which a wire is charged."""
        register = self.made.program.register_at(w)
        acts = self._acts(self.made.program.wire_names[w])
        if not acts:
            lives = register.start == "unknown" and not register.workspace
            return [(0, end)] if lives else []
        begin = 0 if register.start == "unknown" else acts[0].begin
        gone = register.workspace or acts[-1].name in ("measure", "reset")
        found = []
        for one, two in pairwise(acts):
            if one.name == "reset":
                found.append((begin, one.end))
                begin = two.begin
        return [*found, (begin, acts[-1].end if gone else end)]

    def _decay(self, token: int, end: int) -> int:
        """Charge every gap between two events of a token, as far as it is alive."""
        names = self.made.program.wire_names
        lives: list[Pair] = []
        for w, home in enumerate(self.made.home):
            if home == token:
                lives += self._alive(w, end)
        slots = {h for e in self.diary for h in e.holders if h not in names}
        for slot in sorted(slots):
            acts = [e for e in self._acts(slot) if token in e.tokens]
            mine = [e for e in acts if e.holders[e.tokens.index(token)] == slot]
            if mine:
                lives.append((mine[0].begin, mine[-1].end))
        total, now, site, is_high = 0, 0, token, False
        for event in [*self.diary, Event("end", end, end, [token], [token], [])]:
            if token not in event.tokens:
                continue
            for begin, until in lives:
                span = min(event.begin, until) - max(now, begin)
                if span > 0:
                    total += self._charge(site, span, is_high=is_high)
            now = event.end
            is_high = (is_high or token in event.enters) and token not in event.leaves
            site = self._after(event, token, site)
        return total

    @staticmethod
    def _after(event: Event, token: int, site: int) -> int:
        if event.name != "swap":
            return site
        return event.sites[1 - event.tokens.index(token)]

    def _charge(self, site: int, span: int, *, is_high: bool) -> int:
        where = self.device.sites[site]
        time = span / 1000
        if is_high:
            assert where.level2 is not None
            dephasing = dephasing_rate(where.t1_us, where.t2_us)
            return cost_of_fidelity(
                level2_process_fidelity(
                    time, where.t1_us, where.level2.t1_us, dephasing
                )
            )
        return cost_of_fidelity(process_fidelity(time, where.t1_us, where.t2_us))

    def _worst(self) -> tuple[float, str]:
        program = self.made.program
        values = [
            name
            for w, name in enumerate(program.wire_names)
            if program.register_at(w).workspace and self._acts(name)
        ]
        for event in self.diary:
            for holder in event.holders:
                if holder not in (*values, *program.wire_names):
                    values.append(holder)
        rows = []
        for value in values:
            acts = self._acts(value)
            token = acts[0].tokens[acts[0].holders.index(value)]
            rows.append((self._share(token, acts), value.split("\0")[0]))
        for event in self.diary:
            for token in event.enters:
                holder = event.holders[event.tokens.index(token)]
                stay = self._stay(token, event)
                rows.append((stay, f"{holder.split(chr(0))[0]} in level 2"))
        return max(rows, key=lambda row: row[0], default=(0.0, ""))

    def _share(self, token: int, acts: list[Event]) -> float:
        """Cut the life of a value where its token's events begin and end."""
        rests = [
            (one.end, two.begin) for one, two in pairwise(acts) if one.name == "reset"
        ]
        total = 0.0
        for begin, until, site in self._pieces(token, acts[0].begin, acts[-1].end):
            if not any(a <= begin and until <= b for a, b in rests):
                total += (until - begin) / self.map.life_ns(site)
        return total

    def _pieces(self, token: int, first: int, last: int) -> list[tuple[int, int, int]]:
        """Return (begin, end, site) of the time of a token from first to last."""
        found, now, site = [], 0, token
        for event in self.diary:
            if token in event.tokens:
                found.append((now, event.begin, site))
                found.append((event.begin, event.end, site))
                now, site = event.end, self._after(event, token, site)
        return [x for x in found if x[0] >= first and x[1] <= last and x[1] > x[0]]

    def _stay(self, token: int, entered: Event) -> float:
        left = next(
            e
            for e in self.diary
            if token in e.leaves and e.begin >= entered.begin and e is not entered
        )
        total = 0.0
        for begin, until, site in self._pieces(token, entered.begin, left.end):
            level2 = self.device.sites[site].level2
            assert level2 is not None
            total += (until - begin) / (level2.t1_us * 1000)
        return total


def make(
    program: str,
    device: str,
    *,
    name: str = "handmade.qasm",
    open_inputs: bool = False,
    **options: Any,
) -> str:
    """Return the JSON text of a plan by hand."""
    made = Handmade(
        read_program(program, name, open_inputs=open_inputs),
        read_device(device, "handmade.yaml"),
        **options,
    )
    return to_json(made.plan())
