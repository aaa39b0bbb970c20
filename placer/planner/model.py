"""The joint CP-SAT model: recipes, slots, lenders, sites and start times together.

In: an instance and the choices that are left open.  Out: the model, hints, and the
way back from its solution.  Distances are layered: one literal per distinct price of
a pair of sites says 'dearer than that' (see `Charges`).  Each rule is one method.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from ortools.sat.python import cp_model

from placer.planner.charges import Charges, Prices
from placer.planner.order import Order
from placer.planner.placement import Instance, Placement, evaluate
from placer.planner.profile import Mask


@dataclass(frozen=True, slots=True)
class Open:
    """What the model may choose from; everything else is fixed.

    `sites[w]` per wire, `recipes[i]` per step, `slot_sites` per step (for every slot
    of every open recipe).
    """

    sites: tuple[tuple[int, ...], ...]
    recipes: tuple[tuple[int, ...], ...]
    slot_sites: tuple[tuple[int, ...], ...]


def everything(instance: Instance) -> Open:
    """Return the widest choice: every usable site, every recipe."""
    sites = instance.usable
    return Open(
        tuple(sites for _ in instance.wires),
        tuple(tuple(range(len(row))) for row in instance.profiles),
        tuple(sites for _ in range(instance.steps)),
    )


def size_of(instance: Instance, choice: Open) -> int:
    """Return about how many clauses the prices of pairs take in the model."""
    tables = instance.tables
    clauses = 0
    levels: dict[tuple[Mask, frozenset[int]], int] = {}
    for step, row in enumerate(choice.recipes):
        wires = [choice.sites[w] for w in instance.operands[step]]
        for c in row:
            profile = instance.profiles[step][c]
            slots = [choice.slot_sites[step]] * len(profile.built.slots)
            domains = [*wires, *slots]
            for pair in profile.pairs:
                sites = frozenset((*domains[pair.a], *domains[pair.b]))
                key = (pair.mask, sites)
                if key not in levels:
                    inside = np.ix_(sorted(sites), sorted(sites))
                    levels[key] = len(np.unique(tables.pair_cost(pair.mask)[inside]))
                clauses += levels[key] * len(sites)
    return clauses


class JointModel:
    """The model while it is built, and the way back from its solution."""

    def __init__(self, instance: Instance, choice: Open) -> None:
        self.instance = instance
        self.choice = choice
        self.model = cp_model.CpModel()
        self.charges = Charges(self.model)
        self.tables = instance.tables
        self.prices: dict[Mask, Prices] = {}
        self.horizon = self._horizon()
        self._place_wires()
        self._choose_recipes()
        self._place_slots()
        self._time_steps()
        self.order = Order(self.model, instance.operands, self.start, self.end)
        self._charge_steps()
        self._keep_wires_apart()
        self._keep_leases_apart()
        self._charge_time()
        self._keep_budget()
        self.constant = self.charges.constant
        self.model.minimize(sum(weight * term for weight, term in self.charges.terms))

    # --- choices

    def _place_wires(self) -> None:
        """Give each wire that stays anywhere exactly one site."""
        self.at: list[dict[int, Any]] = []
        for w, domain in enumerate(self.choice.sites):
            wire = self.instance.wires[w]
            if wire.is_known_zero and not wire.uses:
                self.at.append({})
                continue
            row = {p: self.model.new_bool_var(f"at[{w},{p}]") for p in domain}
            self.model.add_exactly_one(row.values())
            self.at.append(row)

    def _choose_recipes(self) -> None:
        """Give each step exactly one recipe."""
        self.uses: list[dict[int, Any]] = []
        for step, domain in enumerate(self.choice.recipes):
            row = {c: self.model.new_bool_var(f"recipe[{step},{c}]") for c in domain}
            self.model.add_exactly_one(row.values())
            self.uses.append(row)

    def _place_slots(self) -> None:
        """Give each slot of the chosen recipe exactly one site, all different."""
        self.slot_at: dict[tuple[int, int, int], dict[int, Any]] = {}
        self.clean: list[dict[int, Any]] = []
        self.borrowed: list[dict[int, Any]] = []
        for step in range(self.instance.steps):
            on_site: dict[str, dict[int, list[Any]]] = {"clean": {}, "borrowed": {}}
            for c, chosen in self.uses[step].items():
                for slot, kind in enumerate(self._profile(step, c).built.slots):
                    row = {
                        p: self.model.new_bool_var(f"slot[{step},{c},{slot},{p}]")
                        for p in self.choice.slot_sites[step]
                    }
                    self.model.add(sum(row.values()) == chosen)
                    self.slot_at[step, c, slot] = row
                    for p, literal in row.items():
                        on_site[kind].setdefault(p, []).append(literal)
            self.clean.append(self._any_of(step, "clean", on_site["clean"]))
            self.borrowed.append(self._any_of(step, "borrowed", on_site["borrowed"]))
            operands = self.instance.operands[step]
            for p in self.choice.slot_sites[step]:
                parts = on_site["clean"].get(p, []) + on_site["borrowed"].get(p, [])
                here = [self.at[w][p] for w in operands if p in self.at[w]]
                if parts and len(parts) + len(here) > 1:
                    self.model.add_at_most_one(parts + here)

    def _any_of(
        self, step: int, kind: str, parts: Mapping[int, list[Any]]
    ) -> dict[int, Any]:
        row = {}
        for p, literals in sorted(parts.items()):
            any_here = self.model.new_bool_var(f"{kind}[{step},{p}]")
            self.model.add(sum(literals) == any_here)
            row[p] = any_here
        return row

    def _profile(self, step: int, recipe: int) -> Any:
        return self.instance.profiles[step][recipe]

    # --- time

    def _time_steps(self) -> None:
        """Start a step after the end of every earlier step on its wires."""
        longest = self.horizon
        self.start = [
            self.model.new_int_var(0, longest, f"start[{i}]")
            for i in range(self.instance.steps)
        ]
        self.end = [
            self.model.new_int_var(0, longest, f"end[{i}]")
            for i in range(self.instance.steps)
        ]
        self.makespan = self.model.new_int_var(0, longest, "makespan")
        for end in self.end:
            self.model.add(self.makespan >= end)
        for wire in self.instance.wires:
            for one, two in zip(wire.uses, wire.uses[1:], strict=False):
                self.model.add(self.start[two] >= self.end[one])
        for one, two in self.instance.follows:
            self.model.add(self.start[two] >= self.end[one])

    def _horizon(self) -> int:
        furthest = int(self.tables.furthest)
        total = 0
        for step in range(self.instance.steps):
            total += max(
                self._profile(step, c).base_ns
                + sum(pair.count for pair in self._profile(step, c).pairs)
                * furthest
                * self.tables.move_ns
                for c in self.choice.recipes[step]
            )
        return total

    # --- costs

    def _charge_steps(self) -> None:
        """Charge gates, moves and measurements, and stretch durations by moves."""
        for step in range(self.instance.steps):
            length: list[tuple[int, Any]] = []
            for c, chosen in self.uses[step].items():
                profile = self._profile(step, c)
                length.append((profile.base_ns, chosen))
                self._charge_locals(step, c, profile, chosen)
            for guard, a, b, mask, count, is_shared in self._meetings(step):
                layers = self.charges.pair(
                    guard, a, b, self._prices(mask), is_shared=is_shared
                )
                for price, distance, literal in layers:
                    self.charges.add(price * count, literal)
                    length.append((distance * count * self.tables.move_ns, literal))
            self.model.add(
                self.end[step] >= self.start[step] + sum(n * v for n, v in length)
            )

    def _meetings(self, step: int) -> list[tuple[Any, Any, Any, Any, int, bool]]:
        """List (guard, sites of a, of b, mask, count, are both wires) of the pairs.

        What every recipe has in common is not guarded by a recipe's literal, so that
        all steps share the layers of two wires.
        """
        operands = self.instance.operands[step]
        counts: dict[tuple[int, int, Any], dict[int, int]] = {}
        result: list[tuple[Any, Any, Any, Any, int, bool]] = []
        for c, chosen in self.uses[step].items():
            for pair in self._profile(step, c).pairs:
                if pair.b < len(operands):
                    key = (operands[pair.a], operands[pair.b], pair.mask)
                    counts.setdefault(key, {})[c] = pair.count
                    continue
                a = self._local(step, c, pair.a)
                b = self._local(step, c, pair.b)
                result.append((chosen, a, b, pair.mask, pair.count, False))
        for (a_wire, b_wire, mask), row in sorted(counts.items()):
            common = min(row.get(c, 0) for c in self.uses[step])
            a, b = self.at[a_wire], self.at[b_wire]
            if common:
                result.append((None, a, b, mask, common, True))
            for c, count in sorted(row.items()):
                if count > common:
                    extra = count - common
                    result.append((self.uses[step][c], a, b, mask, extra, True))
        return result

    def _prices(self, mask: Mask) -> Prices:
        if mask not in self.prices:
            self.prices[mask] = Prices(
                self.tables.pair_cost(mask), self.tables.away(mask), self.tables.far
            )
        return self.prices[mask]

    def _local(self, step: int, recipe: int, local: int) -> dict[int, Any]:
        operands = self.instance.operands[step]
        if local < len(operands):
            return self.at[operands[local]]
        return self.slot_at[step, recipe, local - len(operands)]

    def _charge_locals(self, step: int, c: int, profile: Any, chosen: Any) -> None:
        tables = self.tables
        for local in range(profile.built.fine.width):
            where = self._local(step, c, local)
            values = {}
            for p in where:
                value = profile.ones[local] * int(tables.one[p])
                value += profile.tees[local] * int(tables.tee[p])
                value += profile.reads[local] * int(tables.read[p])
                value += profile.wipes[local] * int(tables.wipe[p])
                if profile.level2_ns[local]:
                    if tables.rate2[p] < 0:
                        self.model.add_bool_or(~chosen, ~where[p])
                        continue
                    extra = max(0, int(tables.rate2[p]) - int(tables.rate[p]))
                    value += extra * profile.level2_ns[local]
                slot = local - profile.built.fine.operands
                if slot >= 0:
                    value += int(tables.rate[p]) * profile.live_ns[slot]
                    if profile.built.slots[slot] == "clean":
                        value += int(tables.prep[p])
                values[p] = value
            guard = None if len(self.uses[step]) == 1 else chosen
            self.charges.site(guard, where, values)

    # --- who may be where

    def _is_permanent(self, w: int) -> bool:
        wire = self.instance.wires[w]
        return not (wire.is_workspace and wire.uses) and bool(self.at[w])

    def _keep_wires_apart(self) -> None:
        """Keep the stays of wires on one site from overlapping."""
        permanent = [w for w in range(len(self.at)) if self._is_permanent(w)]
        for p in self.instance.usable:
            here = [self.at[w][p] for w in permanent if p in self.at[w]]
            if len(here) > 1:
                self.model.add_at_most_one(here)
        passing = [
            w for w in range(len(self.at)) if self.at[w] and w not in set(permanent)
        ]
        for v in passing:
            for w in range(len(self.at)):
                if w == v or not self.at[w] or (w in passing and w < v):
                    continue
                ways = []
                if self.instance.wires[w].is_known_zero:
                    ways.append(self._wire_before_wire(v, w))
                if w in passing:
                    ways.append(self._wire_before_wire(w, v))
                for p in sorted(self.at[v].keys() & self.at[w].keys()):
                    self.model.add_bool_or(~self.at[v][p], ~self.at[w][p], *ways)

    def _wire_before_wire(self, v: int, w: int) -> Any:
        last = self.instance.wires[v].uses[-1]
        first = self.instance.wires[w].uses[0]
        return self.order.before(last, first)

    def _keep_leases_apart(self) -> None:
        """Keep a lease apart from other leases, and from wires that do not lend."""
        steps = range(self.instance.steps)
        taken = [self._taken(step) for step in steps]
        for i in steps:
            for j in steps[i + 1 :]:
                shared = sorted(taken[i].keys() & taken[j].keys())
                if not shared or self.order.is_known(i, j):
                    continue
                ways = (self.order.before(i, j), self.order.before(j, i))
                for p in shared:
                    for one in taken[i][p]:
                        for two in taken[j][p]:
                            self.model.add_bool_or(~one, ~two, *ways)
        for i in steps:
            for w in range(len(self.at)):
                if self.at[w] and w not in self.instance.operands[i]:
                    self._keep_lease_from_wire(i, w)
            self._name_lenders(i)

    def _taken(self, step: int) -> dict[int, list[Any]]:
        result: dict[int, list[Any]] = {}
        for row in (self.clean[step], self.borrowed[step]):
            for p, literal in row.items():
                result.setdefault(p, []).append(literal)
        return result

    def _keep_lease_from_wire(self, i: int, w: int) -> None:
        wire = self.instance.wires[w]
        apart = []
        if wire.is_known_zero:
            apart.append(self.order.before(i, wire.uses[0]))
        if wire.is_workspace and wire.uses:
            apart.append(self.order.before(wire.uses[-1], i))
        rows = (
            [self.clean[i]] if wire.is_lendable else [self.clean[i], self.borrowed[i]]
        )
        for row in rows:
            for p in sorted(row.keys() & self.at[w].keys()):
                self.model.add_bool_or(~row[p], ~self.at[w][p], *apart)
        if not wire.is_lendable:
            return
        for j in wire.uses:
            if self.order.is_known(i, j):
                continue
            ways = (self.order.before(i, j), self.order.before(j, i))
            for p in sorted(self.borrowed[i].keys() & self.at[w].keys()):
                self.model.add_bool_or(~self.borrowed[i][p], ~self.at[w][p], *ways)

    def _name_lenders(self, i: int) -> None:
        """Take back the decay of a slot whose site a wire lends (it pays itself)."""
        live = self._borrowed_decay(i)
        for p, taken in self.borrowed[i].items():
            if p not in live:
                continue
            lent = self.model.new_bool_var(f"lent[{i},{p}]")
            self.model.add_implication(lent, taken)
            here = []
            for w in range(len(self.at)):
                wire = self.instance.wires[w]
                if p not in self.at[w] or w in self.instance.operands[i]:
                    continue
                if not wire.is_lendable:
                    self.model.add_bool_or(~lent, ~self.at[w][p])
                    continue
                here.append(self.at[w][p])
                if wire.is_known_zero:
                    begun = self.order.before(wire.uses[0], i)
                    self.model.add_bool_or(~lent, ~self.at[w][p], begun)
                if wire.is_workspace and wire.uses:
                    held = self.order.before(i, wire.uses[-1])
                    self.model.add_bool_or(~lent, ~self.at[w][p], held)
            self.model.add_bool_or(~lent, *here)
            # The decay charged for the slot depends on which slot sits here.
            for literal, value in live[p]:
                back = self.model.new_bool_var(f"lent back[{i},{p}]")
                self.model.add_implication(back, lent)
                self.model.add_implication(back, literal)
                self.charges.add(-value, back)

    def _borrowed_decay(self, i: int) -> dict[int, list[tuple[Any, int]]]:
        result: dict[int, list[tuple[Any, int]]] = {}
        for c in self.uses[i]:
            profile = self._profile(i, c)
            for slot, kind in enumerate(profile.built.slots):
                if kind != "borrowed":
                    continue
                for p, literal in self.slot_at[i, c, slot].items():
                    value = int(self.tables.rate[p]) * profile.live_ns[slot]
                    if value:
                        result.setdefault(p, []).append((literal, value))
        return result

    def _charge_time(self) -> None:
        """Charge each wire the decay of its site over its charged time."""
        for w, wire in enumerate(self.instance.wires):
            if not self.at[w]:
                continue
            begin = self.start[wire.uses[0]] if wire.is_known_zero else 0
            ends_known = wire.ends_known and wire.uses
            to = self.end[wire.uses[-1]] if ends_known else self.makespan
            longest = self.model.new_int_var(0, self.horizon, f"alive[{w}]")
            self.model.add(longest == to - begin)
            rates = {p: int(self.tables.rate[p]) for p in self.at[w]}
            self.charges.rate(self.at[w], rates, longest, self.horizon)
            prep = {p: int(self.tables.prep[p]) for p in self.at[w]}
            if wire.is_known_zero and wire.uses:
                self.charges.site(None, self.at[w], prep)

    def _keep_budget(self) -> None:
        """Use no more sites and no more time than the budget allows."""
        budget = self.instance.problem.budget
        if budget.longest_ns is not None:
            self.model.add(self.makespan <= budget.longest_ns)
        if budget.most_sites is None:
            return
        used = []
        for p in self.instance.usable:
            here = [row[p] for row in self.at if p in row]
            for step in range(self.instance.steps):
                here += self._taken(step).get(p, [])
            if here:
                literal = self.model.new_bool_var(f"used[{p}]")
                for one in here:
                    self.model.add_implication(one, literal)
                used.append(literal)
        self.model.add(sum(used) <= budget.most_sites)

    def beat(self, cost: int) -> None:
        """Allow only placements that cost less."""
        self.model.add(
            sum(weight * term for weight, term in self.charges.terms)
            <= cost - 1 - self.constant
        )

    # --- hints and solutions

    def hint(self, placement: Placement) -> None:
        """Hint every choice of a valid placement."""
        self.model.clear_hints()  # type: ignore[no-untyped-call]
        for w, row in enumerate(self.at):
            for p, literal in row.items():
                self.model.add_hint(literal, placement.sites[w] == p)
        for step, row in enumerate(self.uses):
            for c, literal in row.items():
                self.model.add_hint(literal, placement.recipes[step] == c)
        for (step, c, slot), row in self.slot_at.items():
            chosen = placement.recipes[step] == c
            for p, literal in row.items():
                here = chosen and placement.slot_sites[step][slot] == p
                self.model.add_hint(literal, here)
        ends = evaluate(self.instance, placement).ends
        for step in range(self.instance.steps):
            self.model.add_hint(self.start[step], placement.starts[step])
            self.model.add_hint(self.end[step], ends[step])
        self.model.add_hint(self.makespan, max(ends, default=0))

    def read(self, solver: cp_model.CpSolver) -> Placement:
        """Return the solver's solution with its starts moved as early as they go."""
        sites = []
        spare = self.instance.usable[0]
        for row in self.at:
            chosen = [p for p, literal in row.items() if solver.value(literal)]
            sites.append(chosen[0] if chosen else spare)
        recipes = [
            next(c for c, v in options.items() if solver.value(v))
            for options in self.uses
        ]
        slot_sites = []
        for step, c in enumerate(recipes):
            count = len(self._profile(step, c).built.slots)
            slot_sites.append(
                tuple(
                    next(
                        p
                        for p, literal in self.slot_at[step, c, slot].items()
                        if solver.value(literal)
                    )
                    for slot in range(count)
                )
            )
        starts = [solver.value(v) for v in self.start]
        return Placement(tuple(sites), tuple(recipes), tuple(slot_sites), tuple(starts))
