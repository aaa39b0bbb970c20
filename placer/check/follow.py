"""Follow the included route: where everything is, when it happens, what it costs.

In: a case.  Out: a `Walk` with every figure made again, and findings where the route
breaks a rule.  One operation after the other, from the definitions in DEVELOPERS.md.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from placer.check.layout import Act, Layout, lay_out
from placer.units import cost_of_error, cost_of_fidelity

if TYPE_CHECKING:
    from placer.check.case import Case
    from placer.device.model import Link

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
class Token:
    """What started on a site: where it is, since when it is free, what lives on it.

    `high` is the holder that is in level 2 on it, `stay` the share of that stay so
    far, `value` the holder whose value it bears between two acts.
    """

    home: int
    site: int
    free: int = 0
    place: int = 0
    charged: bool = False
    value: int | None = None
    high: int | None = None
    stay: float = 0.0


@dataclass(slots=True)
class Walk:
    """What a walk along the route adds up; `charges` counts the rounded waits."""

    costs: dict[str, int] = field(default_factory=lambda: dict.fromkeys(CAUSES, 0))
    counts: dict[str, int] = field(default_factory=dict)
    charges: int = 0
    touched: set[int] = field(default_factory=set)
    last: int = 0
    shares: dict[int, float] = field(default_factory=dict)
    stays: dict[int, float] = field(default_factory=dict)
    names: list[str] = field(default_factory=list)
    is_broken: bool = False

    def count(self, what: str) -> None:
        """Add one to a count."""
        self.counts[what] = self.counts.get(what, 0) + 1


class Follower:
    """The state of one walk along the route."""

    def __init__(self, case: Case) -> None:
        self.case = case
        self.device = case.device
        self.numbers = case.numbers
        self.layout: Layout = lay_out(case)
        self.walk = Walk(names=self.layout.names)
        self.tokens = [Token(s.id, s.id) for s in case.device.sites]
        self.token_at = list(range(len(self.tokens)))
        self._waits: dict[tuple[int, int, bool], int] = {}
        self._prepare()

    def _prepare(self) -> None:
        """Charge fresh sites; wires that start unknown live from the beginning."""
        program = self.case.program
        cost = 0
        for wire, site in enumerate(self.case.sites):
            register = program.register_at(wire)
            used = wire in self.case.uses
            if register.start == "zero":
                cost += self.numbers.prep(site) if used else 0
            elif used or not register.workspace:
                self.tokens[site].charged = True
                self.walk.touched.add(site)
        for step in self.case.steps:
            clean = [one.site for one in step.leases if one.kind == "clean"]
            cost += sum(self.numbers.prep(site) for site in clean)
        self.walk.costs["preparation"] = cost

    def follow(self) -> Walk:
        """Follow the route to its end, or to where it can go no further."""
        route = self.case.data["route"]
        for token in self.tokens:
            self._run_free([token.home])
        self._follow_all(route["gaps"], route["swaps"])
        for token in self.tokens:
            if token.charged:
                self._charge(token, self.walk.last)
        return self.walk

    def _follow_all(self, gaps: list[list[list[int]]], swaps: list[list[int]]) -> None:
        """Do every two-body gate once, when all before it on its tokens is done."""
        rule, gates = "route-incomplete", self.layout.gates
        if len(gaps) != len(swaps) + 1:
            text = f"{len(gaps)} gaps do not go between {len(swaps)} swaps"
            self._break(rule, "route", text)
            return
        for number, runs in enumerate(gaps):
            for first, last in sorted(runs):
                # A run beyond the last gate is not walked through.
                for gate in range(first, min(last, len(gates)) + 1):
                    label = f"gap {number}, gate {gate}"
                    if gate >= len(gates):
                        self._break(rule, label, f"there are {len(gates)} gates")
                        return
                    act = gates[gate]
                    if self.layout.acts[act].end >= 0:
                        self._break(rule, label, "it is done twice")
                        return
                    if not self._is_next(act):
                        text = "it comes before what it depends on"
                        self._break(rule, label, text)
                        return
                    self._gate(act, label)
            if number < len(swaps):
                self._swap(f"swap {number}", *swaps[number])
        left = [number for number in gates if self.layout.acts[number].end < 0]
        if left:
            text = f"{len(left)} of {len(gates)} two-body gates are not done"
            self._break(rule, "route", text)

    def _break(self, rule: str, where: str, what: str) -> None:
        self.walk.is_broken = True
        if sum(1 for found in self.case.findings if found.rule == rule) < MOST_FINDINGS:
            self.case.find(rule, where, what)

    # --- operations

    def _is_next(self, number: int) -> bool:
        act = self.layout.acts[number]
        for home in act.tokens:
            queue = self.layout.queues[home]
            place = self.tokens[home].place
            if place >= len(queue) or queue[place] != number:
                return False
        return act.cause is None or self.layout.acts[act.cause].end >= 0

    def _run_free(self, homes: list[int]) -> None:
        """Do everything without a link that is next, and what that frees."""
        waiting = list(homes)
        while waiting:
            home = waiting.pop()
            queue = self.layout.queues.get(home, [])
            place = self.tokens[home].place
            if place >= len(queue):
                continue
            number = queue[place]
            act = self.layout.acts[number]
            if not act.is_two_body and self._is_next(number):
                self._perform(number, self._alone(act))
                waiting.extend(act.tokens)
                for listener in self.layout.heard.get(number, ()):
                    waiting.extend(self.layout.acts[listener].tokens)

    def _alone(self, act: Act) -> int:
        """Count and price an operation without a link; return how long it takes."""
        if act.name == "barrier":
            return 0
        site = self.device.sites[self.tokens[act.tokens[0]].site]
        if act.name == "measure":
            self.walk.count("measurements")
            self._pay("measurement", self.numbers.read(site.id))
            return site.readout_ns
        if act.name == "reset":
            self._pay("preparation", self.numbers.wipe(site.id))
            return site.reset_ns
        self.walk.count("one_qubit_gates")
        if act.name not in ("t", "tdg"):
            self._pay("one_qubit", self.numbers.one(site.id))
            return site.gate_ns
        self.walk.count("t_gates")
        self._pay("one_qubit", self.numbers.tee(site.id))
        priced = self.device.t_gate
        return site.gate_ns if priced is None else priced.time_ns

    def _pay(self, cause: str, cost: int) -> None:
        self.walk.costs[cause] += cost

    def _linked(self, label: str, one: int, two: int) -> Link | None:
        """Return the usable link of two sites; nothing with two bodies goes without."""
        link = self.device.link(one, two)
        if link is None or not self.device.is_usable(link):
            self._break("route-off-link", label, f"no usable link of {one} and {two}")
            return None
        return link

    def _gate(self, number: int, label: str) -> None:
        act = self.layout.acts[number]
        label = f"{label} of {act.step.label}"
        one, two = (self.tokens[t].site for t in act.tokens)
        link = self._linked(label, one, two)
        time = 0
        if link is not None and act.name == "level2":
            if not self.numbers.fits(link, one, (True, *act.needs)):
                text = f"sites {one} and {two} offer no such level-2 gate"
                self._break("level2-off-link", label, text)
            self.walk.count("level2_gates")
            time = link.level2_ns or 0
            self._pay("level2", cost_of_error(link.level2_error or 0.0))
        elif link is not None:
            self.walk.count("two_qubit_gates")
            time = link.time_ns
            self._pay("two_qubit", cost_of_error(link.error))
        self._perform(number, time)
        self._run_free(list(act.tokens))

    def _perform(self, number: int, time: int) -> None:
        act = self.layout.acts[number]
        tokens = [self.tokens[home] for home in act.tokens]
        begin = max((token.free for token in tokens), default=0)
        if act.cause is not None:
            answer = self.layout.acts[act.cause].end + self.numbers.latency_ns
            begin = max(begin, answer)
        done = begin + time
        for token, holder in zip(tokens, act.holders, strict=True):
            self._wait(token, begin)
            if holder in self.layout.values:
                self._live(token, holder, time)
            if token.home in act.enters and token.high is None:
                token.high, token.stay = holder, 0.0
            if token.high is not None:
                self._stay(token, time)
            if token.home in act.leaves and token.high is not None:
                longest = max(self.walk.stays.get(token.high, 0.0), token.stay)
                self.walk.stays[token.high] = longest
                token.high = None
            token.charged, token.value = self.layout.lives[number, token.home]
            token.free = done
            token.place += 1
            self.walk.touched.add(token.site)
        act.end = done
        self.walk.last = max(self.walk.last, done)

    def _swap(self, label: str, a: int, b: int) -> None:
        """Exchange two tokens; over a level-2 link if one of them is in level 2."""
        link = self._linked(label, a, b)
        if link is None:
            return
        one, two = self.tokens[self.token_at[a]], self.tokens[self.token_at[b]]
        time, cost = link.time_ns, cost_of_error(link.error)
        if one.high is not None or two.high is not None:
            if not self.numbers.fits(link, a, (True, True, True)):
                text = f"{a} and {b} are exchanged while one holds level 2"
                self._break("swap-while-level2", label, text)
            time = link.level2_ns or 0
            cost = cost_of_error(link.level2_error or 0.0)
        begin = max(one.free, two.free)
        self._pay("swaps", 3 * cost)
        for token, goal in ((one, b), (two, a)):
            self._wait(token, begin)
            if token.value is not None:
                self._live(token, token.value, 3 * time)
            if token.high is not None:
                self._stay(token, 3 * time)
            token.free = begin + 3 * time
            token.site = goal
            self.token_at[goal] = token.home
        self.walk.touched |= {a, b}
        self.walk.last = max(self.walk.last, begin + 3 * time)

    # --- what passes with time

    def _wait(self, token: Token, until: int) -> None:
        """Let a token wait where it is: decay, life of its value, stay in level 2."""
        if token.charged:
            self._charge(token, until)
        if token.value is not None:
            self._live(token, token.value, until - token.free)
        if token.high is not None:
            self._stay(token, until - token.free)

    def _charge(self, token: Token, until: int) -> None:
        span = until - token.free
        if span <= 0:
            return
        key = (token.site, span, token.high is not None)
        if key not in self._waits:
            self._waits[key] = self._decay(*key)
        self.walk.charges += 1
        self._pay("decay", self._waits[key])

    def _decay(self, site: int, span_ns: int, is_high: bool) -> int:
        where = self.device.sites[site]
        time = span_ns / 1000
        one = 1.0 if where.t1_us is None else math.exp(-time / where.t1_us)
        if is_high and where.level2 is not None:
            # Populations decay with G1 and G2, coherences with half the rates of
            # their levels, and with dephasing by the squared distance of the levels.
            pure = math.exp(-time * self.numbers.dephasing(site))
            two = math.exp(-time / where.level2.t1_us)
            near, mid = math.sqrt(one) * pure, math.sqrt(one * two) * pure
            far = math.sqrt(two) * pure**4
            return cost_of_fidelity((1 + one + two + 2 * (near + mid + far)) / 9)
        two = 1.0 if where.t2_us is None else math.exp(-time / where.t2_us)
        return cost_of_fidelity((1 + one + 2 * two) / 4)

    def _live(self, token: Token, holder: int, span: int) -> None:
        share = span / self.numbers.lifetime_ns(token.site)
        self.walk.shares[holder] = self.walk.shares.get(holder, 0.0) + share

    def _stay(self, token: Token, span: int) -> None:
        level2 = self.device.sites[token.site].level2
        if level2 is not None:
            token.stay += span / (level2.t1_us * 1000)
