"""The least placement cost of a tiny problem, by trying everything.

Shares no code with the planner, its tables or the check: nominal times, shortest
paths, base schedules and prices are made again from DEVELOPERS.md.  Only the recipe
circuits come from the package.

What is tried: every site of every wire, every recipe and every site of every slot of
each step, and every order of the steps.  For a given order of the pairs that compete
for something, the best starts are a linear program of differences (a wire that starts
in |0> pays less when it starts late, so the earliest starts are not always best); its
corners are whole numbers.  Branches are cut by a bound made of exact step costs and of
decay over chains of durations that are already certain.
"""

from __future__ import annotations

import heapq
import itertools
import math
from dataclasses import dataclass
from typing import Any

from scipy.optimize import linprog

UNIT = 10**12


def price(error: float) -> int:
    return math.ceil(-math.log1p(-error) * UNIT - 1e-6)


def median(values: list[int]) -> int:
    return sorted(values)[(len(values) - 1) // 2] if values else 0


@dataclass
class Option:
    """One way to do one step at given wire sites."""

    cost: int
    length: int
    recipe: int
    slots: tuple[int, ...]
    kinds: tuple[str, ...]
    live: tuple[int, ...]


class Brute:
    """Everything about one problem, and the search."""

    def __init__(self, problem: Any) -> None:
        self.problem = problem
        self.device = problem.device
        self.program = problem.program
        self.good = [s.id for s in self.device.sites if s.in_service]
        alive = [self.device.sites[p] for p in self.good]
        self.links = [k for k in self.device.links if self.device.is_usable(k)]
        self.t_one = median([s.gate_ns for s in alive])
        self.t_read = median([s.readout_ns for s in alive])
        self.t_wipe = median([s.reset_ns for s in alive])
        self.t_two = median([k.time_ns for k in self.links])
        self.t_high = median(
            [k.level2_ns for k in self.links if k.level2_ns is not None]
        )
        self.move = -(-3 * self.t_two // 4)
        self.uses: dict[int, list[int]] = {}
        for op in self.program.operations:
            for w in op.wires:
                self.uses.setdefault(w, []).append(op.index)
        self.steps = list(range(len(self.program.operations)))
        self.meet_memo: dict[Any, Any] = {}
        self.profile_memo: dict[int, Any] = {}
        self.best: int | None = None
        self.best_plan: Any = None

    # --- prices

    def rate(self, p: int) -> int:
        s = self.device.sites[p]
        slope = ((1 / s.t1_us if s.t1_us else 0) + (2 / s.t2_us if s.t2_us else 0)) / 4
        return math.ceil(slope * 1e-3 * UNIT - 1e-6)

    def rate2(self, p: int) -> int | None:
        s = self.device.sites[p]
        if s.level2 is None:
            return None
        g1 = 1 / s.t1_us if s.t1_us else 0.0
        g2 = 1 / s.level2.t1_us
        dephasing = max(0.0, (1 / s.t2_us if s.t2_us else 0.0) - g1 / 2)
        slope = (3 * (g1 + g2) + 12 * dephasing) / 9
        return math.ceil(slope * 1e-3 * UNIT - 1e-6)

    def shortest(self, begun: dict[int, int], weigh: Any) -> dict[int, int]:
        best = dict(begun)
        heap = [(d, p) for p, d in begun.items()]
        heapq.heapify(heap)
        while heap:
            d, p = heapq.heappop(heap)
            if d > best[p]:
                continue
            for k in self.links:
                if p in (k.a, k.b):
                    q = k.a + k.b - p
                    if d + weigh(k) < best.get(q, 1 << 62):
                        best[q] = d + weigh(k)
                        heapq.heappush(heap, (best[q], q))
        return best

    def meet(self, p: int, q: int, high: bool, np: bool, nq: bool) -> Any:
        """Return (price, moves) of a gate between sites, `None` out of reach."""
        key = (p, q, high, np, nq)
        if key in self.meet_memo:
            return self.meet_memo[key]
        answers = []
        for weigh, gate in (
            (
                lambda k: -(-3 * price(k.error) // 4),
                lambda k: price(k.level2_error if high else k.error),
            ),
            (lambda _: 1, lambda _: 0),
        ):
            near = self.shortest({p: 0}, weigh)
            far = self.shortest({q: 0}, weigh)
            best = None
            for k in self.links:
                if high and k.level2_error is None:
                    continue
                for u, v in ((k.a, k.b), (k.b, k.a)):
                    if np and self.device.sites[u].level2 is None:
                        continue
                    if nq and self.device.sites[v].level2 is None:
                        continue
                    if u in near and v in far:
                        total = near[u] + gate(k) + far[v]
                        best = total if best is None else min(best, total)
            answers.append(best)
        self.meet_memo[key] = None if None in answers else tuple(answers)
        return self.meet_memo[key]

    def profile(self, built: Any) -> Any:
        """Return (base length, live per slot, level-2 time per wire)."""
        if id(built) in self.profile_memo:
            return self.profile_memo[id(built)]
        times = {
            "barrier": 0,
            "cx": self.t_two,
            "cz": self.t_two,
            "level2": self.t_high,
            "measure": self.t_read,
            "reset": self.t_wipe,
        }
        tee = self.device.t_gate.time_ns if self.device.t_gate else self.t_one
        times["t"] = times["tdg"] = tee
        latency = self.device.capabilities.conditional_ns or 0
        width = built.fine.width
        free, first = [0] * width, [None] * width
        bits: dict[int, int] = {}
        entered: dict[int, int] = {}
        high = [0] * width
        for op in built.fine.ops:
            begin = max([free[w] for w in op.wires])
            if op.condition is not None:
                begin = max(begin, bits[op.condition] + latency)
            end = begin + times.get(op.name, self.t_one)
            for w in op.wires:
                free[w] = end
                first[w] = begin if first[w] is None else first[w]
            if op.bit is not None:
                bits[op.bit] = end
            for w in op.enters:
                entered[w] = begin
            for w in op.leaves:
                high[w] += end - entered.pop(w)
        live = [free[w] - (first[w] or 0) for w in range(built.fine.operands, width)]
        self.profile_memo[id(built)] = (max(free), live, high)
        return self.profile_memo[id(built)]

    def option(self, step: int, c: int, where: tuple[int, ...]) -> Option | None:
        """Return the cost and length of a recipe at sites, decay of leases apart."""
        built = self.problem.choices[step][c]
        base, live, high = self.profile(built)
        cost, length = 0, base
        for op in built.fine.ops:
            if op.name in ("cx", "cz", "level2"):
                a, b = sorted(op.wires)
                up = op.name == "level2"
                met = self.meet(
                    where[a],
                    where[b],
                    up,
                    up and a in built.level2_wires,
                    up and b in built.level2_wires,
                )
                if met is None:
                    return None
                cost += met[0]
                length += met[1] * self.move
            elif op.name != "barrier":
                s = self.device.sites[where[op.wires[0]]]
                error = s.gate_error
                if op.name in ("t", "tdg") and self.device.t_gate:
                    error = self.device.t_gate.error
                error = {"measure": s.readout_error, "reset": s.reset_error}.get(
                    op.name, error
                )
                cost += price(error)
        for local, span in enumerate(high):
            if span:
                rate2 = self.rate2(where[local])
                if rate2 is None:
                    return None
                cost += max(0, rate2 - self.rate(where[local])) * span
        slots = where[built.fine.operands :]
        for site, kind in zip(slots, built.slots, strict=True):
            if kind == "clean":
                cost += price(self.device.sites[site].prep_error)
        return Option(cost, length, c, slots, tuple(built.slots), tuple(live))

    # --- the search

    def run(self) -> int | None:
        """Return the least placement cost, `None` if nothing is possible."""
        wires = range(len(self.program.wire_names))
        stays = [w for w in wires if self.holds(w)]
        for chosen in itertools.product(self.good, repeat=len(stays)):
            sites = dict(zip(stays, chosen, strict=True))
            kept = [sites[w] for w in stays if not self.register(w).workspace]
            if len(set(kept)) < len(kept):
                continue
            if any(
                len({sites[w] for w in op.wires}) < len(op.wires)
                for op in self.program.operations
            ):
                continue
            self.try_sites(sites)
        return self.best

    def register(self, w: int) -> Any:
        return self.program.register_at(w)

    def holds(self, w: int) -> bool:
        register = self.register(w)
        return bool(self.uses.get(w)) or (
            register.start == "unknown" and not register.workspace
        )

    def options(self, step: int, sites: dict[int, int]) -> list[Option]:
        operands = tuple(sites[w] for w in self.program.operations[step].wires)
        free = [p for p in self.good if p not in operands]
        found = []
        for c, built in enumerate(self.problem.choices[step]):
            for slots in itertools.permutations(free, len(built.slots)):
                option = self.option(step, c, operands + slots)
                if option is not None:
                    found.append(option)
        return sorted(found, key=lambda o: (o.cost, o.length))

    def try_sites(self, sites: dict[int, int]) -> None:
        table = [self.options(step, sites) for step in self.steps]
        if not all(table):
            return
        fixed = sum(
            price(self.device.sites[p].prep_error)
            for w, p in sites.items()
            if self.register(w).start == "zero" and self.uses.get(w)
        )
        rest = [0] * (len(self.steps) + 1)
        short = [min(o.length for o in row) for row in table]
        for step in reversed(self.steps):
            rest[step] = rest[step + 1] + table[step][0].cost
        self.extend(sites, table, [], fixed, rest, short)

    def extend(
        self,
        sites: dict[int, int],
        table: list[list[Option]],
        chosen: list[Option],
        cost: int,
        rest: list[int],
        short: list[int],
    ) -> None:
        step = len(chosen)
        if self.is_over_limits(sites, chosen):
            return
        lengths = [o.length for o in chosen] + short[step:]
        least = cost + rest[step] + self.chain_decay(sites, lengths)
        if self.best is not None and least >= self.best:
            return
        if step == len(table):
            self.orders(sites, chosen, cost)
            return
        for option in table[step]:
            self.extend(
                sites, table, [*chosen, option], cost + option.cost, rest, short
            )

    def is_over_limits(self, sites: dict[int, int], chosen: list[Option]) -> bool:
        """Whether the choices so far already break a limit that nothing can mend."""
        budget = self.problem.budget
        touched = set(sites.values()) | {p for o in chosen for p in o.slots}
        if budget.most_sites is not None and len(touched) > budget.most_sites:
            return True
        if budget.longest_ns is None:
            return False
        ready: dict[int, int] = {}
        for op, option in zip(self.program.operations, chosen, strict=False):
            end = max(ready.get(w, 0) for w in op.wires) + option.length
            ready.update(dict.fromkeys(op.wires, end))
        return max(ready.values(), default=0) > budget.longest_ns

    def chain_decay(self, sites: dict[int, int], lengths: list[int]) -> int:
        ready: dict[int, int] = {}
        begin = []
        for op in self.program.operations:
            start = max([ready.get(w, 0) for w in op.wires], default=0)
            begin.append(start)
            for w in op.wires:
                ready[w] = start + lengths[op.index]
        end = max(ready.values(), default=0)
        total = 0
        for w, p in sites.items():
            uses = self.uses.get(w, [])
            if self.register(w).start == "zero":
                total += self.rate(p) * sum(lengths[i] for i in uses)
            elif self.until_last(w):
                total += self.rate(p) * (begin[uses[-1]] + lengths[uses[-1]])
            else:
                total += self.rate(p) * end
        return total

    def until_last(self, w: int) -> bool:
        uses = self.uses.get(w, [])
        last = self.program.operations[uses[-1]].kind if uses else ""
        return bool(uses) and (
            self.register(w).workspace or last in ("measure", "reset")
        )

    def orders(self, sites: dict[int, int], chosen: list[Option], cost: int) -> None:
        """Try every order of the steps, once per set of decided conflicts."""
        seen = set()
        for order in itertools.permutations(self.steps):
            rank = {step: k for k, step in enumerate(order)}
            if any(
                rank[a] > rank[b]
                for uses in self.uses.values()
                for a, b in itertools.pairwise(uses)
            ):
                continue
            found = self.conflicts(sites, chosen, rank)
            if found is None:
                continue
            before, leases = found
            key = frozenset(before)
            if key in seen:
                continue
            seen.add(key)
            self.time(sites, chosen, cost + leases, before)

    def conflicts(
        self, sites: dict[int, int], chosen: list[Option], rank: dict[int, int]
    ) -> tuple[set[tuple[int, int]], int] | None:
        """Return who must come before whom in this order, and the leases' decay."""
        before: set[tuple[int, int]] = set()
        decay = 0

        def add(a: int, b: int) -> None:
            before.add((a, b) if rank[a] < rank[b] else (b, a))

        for uses in self.uses.values():
            before.update(itertools.pairwise(uses))
        for i, j in itertools.combinations(self.steps, 2):
            if set(chosen[i].slots) & set(chosen[j].slots):
                add(i, j)
        held = list(sites.items())
        for (v, p), (w, q) in itertools.combinations(held, 2):
            if p != q:
                continue
            pair = self.apart(v, w, rank)
            if pair is None:
                return None
            before.add(pair)
        for step, option in enumerate(chosen):
            rows = zip(option.slots, option.kinds, option.live, strict=True)
            for site, kind, live in rows:
                lent = False
                for w, p in held:
                    if p != site:
                        continue
                    uses = self.uses.get(w, [])
                    register = self.register(w)
                    if register.start == "zero" and rank[step] < rank[uses[0]]:
                        before.add((step, uses[0]))
                        continue
                    if register.workspace and rank[uses[-1]] < rank[step]:
                        before.add((uses[-1], step))
                        continue
                    if kind == "clean" or not register.lendable:
                        return None
                    lent = True
                    for use in uses:
                        add(use, step)
                if not lent:
                    decay += self.rate(site) * live
        return before, decay

    def apart(self, v: int, w: int, rank: dict[int, int]) -> tuple[int, int] | None:
        """Return the pair of steps that keeps two wires on one site apart."""
        for first, second in ((v, w), (w, v)):
            if not self.register(first).workspace:
                continue
            if self.register(second).start != "zero":
                continue
            last, begin = self.uses[first][-1], self.uses[second][0]
            if rank[last] < rank[begin]:
                return (last, begin)
        return None

    def time(
        self,
        sites: dict[int, int],
        chosen: list[Option],
        cost: int,
        before: set[tuple[int, int]],
    ) -> None:
        """Choose the best starts for decided conflicts, by linear programming."""
        count = len(chosen)
        weight = [0.0] * (count + 1)
        constant = 0
        for w, p in sites.items():
            rate = self.rate(p)
            uses = self.uses.get(w, [])
            if self.register(w).start == "zero":
                weight[uses[0]] -= rate
            if self.until_last(w):
                weight[uses[-1]] += rate
                constant += rate * chosen[uses[-1]].length
            else:
                weight[count] += rate
        rows, right = [], []
        for a, b in sorted(before):
            row = [0.0] * (count + 1)
            row[a], row[b] = 1.0, -1.0
            rows.append(row)
            right.append(-chosen[a].length)
        for step in range(count):
            row = [0.0] * (count + 1)
            row[step], row[count] = 1.0, -1.0
            rows.append(row)
            right.append(-chosen[step].length)
        limit = self.problem.budget.longest_ns
        bounds = [(0, None)] * count + [(0, limit)]
        found = linprog(weight, A_ub=rows, b_ub=right, bounds=bounds, method="highs")
        if found.status == 2:
            return
        assert found.status == 0, found.message
        starts = [round(x) for x in found.x]
        for a, b in before:
            assert starts[b] >= starts[a] + chosen[a].length
        end = max(
            (s + o.length for s, o in zip(starts, chosen, strict=False)), default=0
        )
        total = cost + constant
        for step in range(count):
            total += round(weight[step]) * starts[step]
        total += round(weight[count]) * end
        if self.best is None or total < self.best:
            self.best = total
            self.best_plan = (sites, chosen, starts)


def least_cost(problem: Any) -> tuple[int | None, Any]:
    """Return the least placement cost of a problem, and a plan that has it."""
    search = Brute(problem)
    return search.run(), search.best_plan
