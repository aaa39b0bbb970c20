"""Follow the included route: where everything is, when it happens, what it costs.

In: a case.  Out: figures made again, and findings where the route breaks a rule.
Plain Python, one operation after the other; nothing is shared with the planner.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from placer.device.fidelity import dephasing_rate, level2_process_fidelity
from placer.units import cost_of_error, cost_of_fidelity

if TYPE_CHECKING:
    from placer.check.case import Case, Planned
    from placer.recipes.circuit import Op

CAUSES = (
    "two_qubit",
    "one_qubit",
    "swaps",
    "decay",
    "measurement",
    "level2",
    "preparation",
)
MOST_FINDINGS = 20


@dataclass(slots=True)
class Act:
    """One fine operation on tokens, and whom it acts for on each of them."""

    name: str
    tokens: tuple[int, ...]
    holders: tuple[int, ...]
    needs: tuple[bool, ...]
    enters: tuple[int, ...]
    leaves: tuple[int, ...]
    cause: int | None
    step: Planned
    end: int = -1


@dataclass(slots=True)
class Token:
    """Where a token is, since when it is free, what lives on it."""

    site: int  # where it started; names the token
    moved: int = -1  # where it is now, -1 while it has not moved
    free: int = 0
    place: int = 0
    charged: bool = False
    valued: int | None = None
    high: int | None = None
    stay: float = 0.0
    acts: list[int] = field(default_factory=list)

    @property
    def site_now(self) -> int:
        """Return the site that the token is on."""
        return self.site if self.moved < 0 else self.moved


class Follower:
    """The state of one walk along the route."""

    def __init__(self, case: Case) -> None:
        self.case = case
        self.device = case.device
        self.costs = dict.fromkeys(CAUSES, 0)
        self.counts = {"one": 0, "tee": 0, "two": 0, "measure": 0, "level2": 0}
        self.acts: list[Act] = []
        self.heard: dict[int, list[int]] = {}
        self.gates: list[int] = []
        self.names: list[str] = list(case.program.wire_names)
        self.values: set[int] = set()
        self.tokens = [Token(s.id) for s in self.device.sites]
        self.token_at = list(range(len(self.tokens)))
        self.touched: set[int] = set()
        self.share: dict[int, float] = {}
        self.stays: dict[int, float] = {}
        self.last = 0
        self.is_broken = False
        self._memo: dict[tuple[int, int, bool], int] = {}
        self._lay_out()
        self._mark_lives()

    # --- the placed circuit

    def _lay_out(self) -> None:
        case = self.case
        wires = len(case.program.wire_names)
        index = {name: w for w, name in enumerate(case.program.wire_names)}
        for w in range(wires):
            if case.program.register_at(w).workspace:
                self.values.add(w)
        for step in case.order():
            holders: list[int] = list(step.op.wires)
            for lease in step.leases:
                if lease.lender is None:
                    holders.append(len(self.names))
                    self.values.add(len(self.names))
                    self.names.append(_slot_name(step, lease.slot))
                else:
                    holders.append(index.get(lease.lender, 0))
                if lease.kind == "clean":
                    self.costs["preparation"] += case.numbers.prep(lease.site)
            self._add_acts(step, holders)
        for w, site in enumerate(case.sites):
            register = case.program.register_at(w)
            used = any(w in s.op.wires for s in case.steps)
            if register.start == "zero" and used:
                self.costs["preparation"] += case.numbers.prep(site)
            if register.start == "unknown" and (used or not register.workspace):
                self.tokens[site].charged = True
                self.touched.add(site)

    def _add_acts(self, step: Planned, holders: list[int]) -> None:
        measured: dict[int, int] = {}
        for op in step.built.fine.ops:
            number = len(self.acts)
            act = self._act(step, op, holders, measured)
            self.acts.append(act)
            if op.bit is not None:
                measured[op.bit] = number
            if act.cause is not None:
                self.heard.setdefault(act.cause, []).append(number)
            for token in act.tokens:
                self.tokens[token].acts.append(number)
            if op.name in ("cx", "cz", "level2"):
                self.gates.append(number)

    def _act(
        self, step: Planned, op: Op, holders: list[int], measured: dict[int, int]
    ) -> Act:
        high = op.name == "level2"
        return Act(
            name=op.name,
            tokens=tuple(step.where[w] for w in op.wires),
            holders=tuple(holders[w] for w in op.wires),
            needs=tuple(high and w in step.built.level2_wires for w in op.wires),
            enters=tuple(step.where[w] for w in op.enters),
            leaves=tuple(step.where[w] for w in op.leaves),
            cause=None if op.condition is None else measured[op.condition],
            step=step,
        )

    def _mark_lives(self) -> None:
        """Note for each act and token whether its holder lives on after it."""
        self.after: dict[tuple[int, int], tuple[bool, int | None]] = {}
        wires = len(self.case.program.wire_names)
        for token in self.tokens:
            for here, number in enumerate(token.acts):
                act = self.acts[number]
                holder = act.holders[act.tokens.index(token.site)]
                following: int | None = None
                if here + 1 < len(token.acts):
                    coming = self.acts[token.acts[here + 1]]
                    following = coming.holders[coming.tokens.index(token.site)]
                goes_on = following == holder
                was_reset = act.name == "reset"
                if goes_on:
                    charged = not (was_reset and holder < wires)
                else:
                    charged = not (
                        holder in self.values or act.name in ("reset", "measure")
                    )
                valued = goes_on and not was_reset and holder in self.values
                self.after[number, token.site] = (charged, holder if valued else None)

    # --- the walk

    def walk(self) -> None:
        """Follow the route to its end."""
        route = self.case.data["route"]
        gaps, swaps = route["gaps"], route["swaps"]
        if len(gaps) != len(swaps) + 1:
            self._break("route-incomplete", "route", "gaps and swaps do not alternate")
            return
        for token in self.tokens:
            self._run_free(token.site)
        for number, runs in enumerate(gaps):
            if not self._gap(number, runs):
                return
            if number < len(swaps):
                a, b = swaps[number]
                if not self._swap(number, a, b):
                    return
        left = sum(1 for act in self.acts if act.end < 0)
        if left:
            self._break("route-incomplete", "route", f"{left} operations are not done")
            return
        for token in self.tokens:
            if token.charged:
                self._charge(token, self.last)

    def _gap(self, number: int, runs: list[list[int]]) -> bool:
        for first, last in runs:
            for gate in range(first, last + 1):
                is_known = 0 <= gate < len(self.gates)
                if not is_known or self.acts[self.gates[gate]].end >= 0:
                    text = f"gate {gate} is done twice or does not exist"
                    self._break("route-incomplete", f"gap {number}", text)
                    return False
                if not self._gate(gate):
                    return False
        return True

    def _break(self, rule: str, where: str, what: str) -> None:
        self.is_broken = True
        self.case.find(rule, where, what)

    def _front(self, number: int) -> bool:
        act = self.acts[number]
        for t in act.tokens:
            token = self.tokens[t]
            if token.place >= len(token.acts) or token.acts[token.place] != number:
                return False
        return act.cause is None or self.acts[act.cause].end >= 0

    def _run_free(self, token: int) -> None:
        """Do everything without a link that is next on a token, and what that frees."""
        waiting = [token]
        while waiting:
            here = self.tokens[waiting.pop()]
            if here.place >= len(here.acts):
                continue
            number = here.acts[here.place]
            act = self.acts[number]
            if act.name in ("cx", "cz", "level2") or not self._front(number):
                continue
            self._perform(number)
            waiting.extend(act.tokens)
            for listener in self.heard.get(number, []):
                waiting.extend(self.acts[listener].tokens)

    def _gate(self, gate: int) -> bool:
        number = self.gates[gate]
        act = self.acts[number]
        label = f"gate {gate} of {act.step.label}"
        if not self._front(number):
            self._break("route-incomplete", label, "comes before what it depends on")
            return False
        first, second = (self.tokens[t].site_now for t in act.tokens)
        link = self.device.link(first, second)
        kind = (act.name == "level2", *act.needs)
        if link is None or not self.device.is_usable(link):
            self._break("route-off-link", label, f"{first} and {second} are not linked")
            return False
        if not self.case.numbers.fits(link, first, kind):
            text = f"sites {first} and {second} offer no such level-2 gate"
            self._break("level2-off-link", label, text)
            return False
        self._perform(number)
        for t in act.tokens:
            self._run_free(t)
        for listener in self.heard.get(number, []):
            for t in self.acts[listener].tokens:
                self._run_free(t)
        return True

    def _time(self, act: Act) -> int:
        sites = self.device.sites
        here = self.tokens[act.tokens[0]].site_now
        if act.name == "barrier":
            return 0
        if act.name == "measure":
            return sites[here].readout_ns
        if act.name == "reset":
            return sites[here].reset_ns
        if act.name in ("cx", "cz", "level2"):
            link = self.device.link(here, self.tokens[act.tokens[1]].site_now)
            if link is None:
                return 0
            return (link.level2_ns or 0) if act.name == "level2" else link.time_ns
        if act.name in ("t", "tdg") and self.device.t_gate is not None:
            return self.device.t_gate.time_ns
        return sites[here].gate_ns

    def _perform(self, number: int) -> None:
        act = self.acts[number]
        begin = max((self.tokens[t].free for t in act.tokens), default=0)
        if act.cause is not None:
            latency = self.case.numbers.latency_ns
            begin = max(begin, self.acts[act.cause].end + latency)
        done = begin + self._time(act)
        self._price(act)
        for t, holder in zip(act.tokens, act.holders, strict=True):
            token = self.tokens[t]
            if token.charged:
                self._charge(token, begin)
            span = done - begin
            if token.valued is not None:
                self._live(token, token.valued, begin - token.free)
            if holder in self.values:
                self._live(token, holder, span)
            if t in act.enters:
                token.high, token.stay = holder, 0.0
            elif token.high is not None:
                self._stay(token, begin - token.free)
            if token.high is not None:
                self._stay(token, span)
            if t in act.leaves and token.high is not None:
                best = max(self.stays.get(token.high, 0.0), token.stay)
                self.stays[token.high] = best
                token.high = None
            token.charged, token.valued = self.after[number, t]
            token.free = done
            token.place += 1
            self.touched.add(token.site_now)
        act.end = done
        self.last = max(self.last, done)

    def _price(self, act: Act) -> None:
        numbers = self.case.numbers
        here = self.tokens[act.tokens[0]].site_now if act.tokens else 0
        if act.name == "barrier":
            return
        if act.name in ("cx", "cz", "level2"):
            link = self.device.link(here, self.tokens[act.tokens[1]].site_now)
            if link is None:
                return
            if act.name == "level2":
                self.costs["level2"] += cost_of_error(link.level2_error or 0.0)
                self.counts["level2"] += 1
            else:
                self.costs["two_qubit"] += cost_of_error(link.error)
                self.counts["two"] += 1
        elif act.name == "measure":
            self.costs["measurement"] += numbers.read(here)
            self.counts["measure"] += 1
        elif act.name == "reset":
            self.costs["preparation"] += numbers.wipe(here)
        elif act.name in ("t", "tdg"):
            self.costs["one_qubit"] += numbers.tee(here)
            self.counts["tee"] += 1
        else:
            self.costs["one_qubit"] += numbers.one(here)
            self.counts["one"] += 1

    def _swap(self, number: int, a: int, b: int) -> bool:
        label = f"swap {number}"
        count = len(self.device.sites)
        link = self.device.link(a, b) if 0 <= a < count and 0 <= b < count else None
        if link is None or not self.device.is_usable(link):
            self._break("route-off-link", label, f"{a} and {b} are not linked")
            return False
        one, two = self.tokens[self.token_at[a]], self.tokens[self.token_at[b]]
        is_high = one.high is not None or two.high is not None
        span, price = 3 * link.time_ns, 3 * cost_of_error(link.error)
        if is_high:
            sites = self.device.sites
            able = sites[a].level2 is not None and sites[b].level2 is not None
            if link.level2_error is None or link.level2_ns is None or not able:
                text = f"something in level 2 moves between {a} and {b}"
                self._break("swap-while-level2", label, text)
                return False
            span = 3 * link.level2_ns
            price = 3 * cost_of_error(link.level2_error)
        begin = max(one.free, two.free)
        done = begin + span
        self.costs["swaps"] += price
        for token in (one, two):
            if token.charged:
                self._charge(token, begin)
            if token.valued is not None:
                self._live(token, token.valued, done - token.free)
            if token.high is not None:
                self._stay(token, done - token.free)
            token.free = done
        one.moved, two.moved = b, a
        self.token_at[a], self.token_at[b] = two.site, one.site
        self.touched |= {a, b}
        self.last = max(self.last, done)
        return True

    # --- what passes with time

    def _charge(self, token: Token, until: int) -> None:
        span = until - token.free
        if span <= 0:
            return
        key = (token.site_now, span, token.high is not None)
        if key not in self._memo:
            self._memo[key] = self._wait(*key)
        self.costs["decay"] += self._memo[key]

    def _wait(self, site: int, span_ns: int, is_high: bool) -> int:
        where = self.device.sites[site]
        span = span_ns / 1000.0
        if is_high and where.level2 is not None:
            dephasing = dephasing_rate(where.t1_us, where.t2_us)
            return cost_of_fidelity(
                level2_process_fidelity(
                    span, where.t1_us, where.level2.t1_us, dephasing
                )
            )
        one = 1.0 if where.t1_us is None else math.exp(-span / where.t1_us)
        two = 1.0 if where.t2_us is None else math.exp(-span / where.t2_us)
        return cost_of_fidelity((1.0 + one + 2.0 * two) / 4.0)

    def _live(self, token: Token, holder: int, span: int) -> None:
        life = self.case.numbers.lifetime_ns(token.site_now)
        self.share[holder] = self.share.get(holder, 0.0) + span / life

    def _stay(self, token: Token, span: int) -> None:
        level2 = self.device.sites[token.site_now].level2
        if level2 is not None:
            token.stay += span / (level2.t1_us * 1e3)

    def worst(self) -> tuple[float, set[str]]:
        """Return the largest share, and the names of all that (nearly) reach it."""
        rows = [(part, self.names[h]) for h, part in self.share.items()]
        rows += [
            (part, f"{self.names[h]} in level 2") for h, part in self.stays.items()
        ]
        if not rows:
            return 0.0, {""}
        most = max(part for part, _ in rows)
        if most == 0.0:
            return 0.0, {""} | {name for _, name in rows}
        return most, {name for part, name in rows if part >= most * (1 - 1e-9)}


def _slot_name(step: Planned, slot: int) -> str:
    line = step.op.place.line
    at = f" at line {line}" if line else f" in step {step.op.index}"
    return f"slot {slot} of '{step.op.name}'{at}"
