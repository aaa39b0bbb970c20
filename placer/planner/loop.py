"""The engine: policies, staged search, joint model, flips, and the choice at the end.

In: a problem, an effort, a seed.  Out: the best placement found, judged on a real
route, with the bound and what every fixed policy would have given.  Work is counted,
not timed, so that the same question gets the same answer.
"""

from __future__ import annotations

from dataclasses import dataclass
from importlib.metadata import version
from typing import TYPE_CHECKING, Literal

import numpy as np

from placer.errors import InternalError, NoPlan, OutOfTime
from placer.plan import POLICIES
from placer.planner import bounds
from placer.planner.joint import Open, everything, solve, tighten
from placer.planner.judge import Judge, Judged
from placer.planner.placement import (
    Instance,
    Placement,
    keeps_limits,
    make_instance,
)
from placer.planner.policies import allowed, everything_allowed
from placer.planner.proof import can_prove
from placer.planner.region import narrowed
from placer.planner.search import Amount, Candidate, search
from placer.planner.verdict import overrun
from placer.planner.windows import improve
from placer.tables import device_tables

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from placer.plan import Figures
    from placer.problem import Problem

JOINT_RULE = f"joint model (walk over all sites, CP-SAT {version('ortools')})"

Choice = tuple[tuple[int, ...], ...]
Effort = Literal["quick", "normal", "deep"]


@dataclass(frozen=True, slots=True)
class Work:
    """How much is done, in counts.

    `search` and `policy` are search amounts, `steps` the most steps that one search
    decodes over all its rounds, `gates` the two-body gates that optional routes may
    have together (`repair_gates`: those of repairs), `routed` the candidates judged
    per search, `windows`, `flips`, `repairs` and `routes` (per final candidate) plain
    counts, `joint` CP-SAT's deterministic time, `joint_size` the largest joint model
    (about its clauses).
    """

    search: Amount
    policy: Amount
    steps: int
    gates: int
    routed: int
    windows: int
    flips: int
    repairs: int
    repair_gates: int
    joint: float
    joint_size: int
    routes: int


WORK: dict[str, Work] = {
    "quick": Work(
        search=Amount(3, 30_000, (1.0,)),
        policy=Amount(2, 30_000, (1.0,)),
        steps=800,
        gates=20_000,
        routed=2,
        windows=0,
        flips=0,
        repairs=4,
        repair_gates=20_000,
        joint=0.5,
        joint_size=60_000,
        routes=1,
    ),
    "normal": Work(
        search=Amount(5, 120_000, (1.0, 0.4, 2.5, 1.0, 0.4, 2.5)),
        policy=Amount(3, 80_000, (1.0, 0.4)),
        steps=2_400,
        gates=250_000,
        routed=20,
        windows=4,
        flips=16,
        repairs=24,
        repair_gates=200_000,
        joint=4.0,
        joint_size=250_000,
        routes=6,
    ),
    "deep": Work(
        search=Amount(8, 600_000, (1.0, 0.4, 2.5, 0.2)),
        policy=Amount(5, 300_000, (1.0, 0.4)),
        steps=24_000,
        gates=2_000_000,
        routed=16,
        windows=60,
        flips=60,
        repairs=60,
        repair_gates=2_000_000,
        joint=120.0,
        joint_size=3_000_000,
        routes=8,
    ),
}


@dataclass(frozen=True, slots=True)
class PolicyOutcome:
    """The best plan of one fixed policy, or why there is none."""

    policy: str
    reason: str
    judged: Judged | None


@dataclass(frozen=True, slots=True)
class Outcome:
    """What the engine found; `least` is a proven bound of the placement cost."""

    instance: Instance
    judged: Judged
    least: int
    least_by: str
    is_proven: bool
    floor: int
    policies: tuple[PolicyOutcome, ...]
    seen: tuple[Figures, ...]


def run(
    problem: Problem,
    *,
    effort: Effort,
    seed: int,
    progress: Callable[[str], None] = lambda _: None,
) -> Outcome:
    """Find the best plan that the effort allows.

    Raises
    ------
    NoPlan
        If no placement exists (proved by the joint model).
    OutOfTime
        If none was found within the work allowed.
    """
    work = WORK[effort]
    instance = make_instance(problem, device_tables(problem.device))
    narrow = narrowed(instance)
    judge = Judge(instance, seed=seed, route_tables=narrow.tables)
    engine = _Engine(instance, narrow, judge, work, seed, progress)
    policies = tuple(engine.policy(name) for name in POLICIES)
    engine.search_all([p.judged for p in policies if p.judged is not None])
    engine.solve_joint()
    engine.improve_windows()
    engine.flip()
    engine.repair()
    policies = engine.polish(policies)
    best = engine.best()
    if best is None:
        if engine.is_impossible:
            raise NoPlan("no placement keeps the limits on this device")
        raise OutOfTime("no placement was found in the work allowed")
    return engine.outcome(judge.with_expected_swaps(best), policies)


class _Engine:
    def __init__(
        self,
        instance: Instance,
        narrow: Instance,
        judge: Judge,
        work: Work,
        seed: int,
        progress: Callable[[str], None],
    ) -> None:
        self.instance = instance
        self.narrow = narrow
        self.judge = judge
        self.work = work
        self.seed = seed
        self.progress = progress
        self.recipes = everything_allowed(instance)
        self.pool: list[Judged] = []
        self.estimates: list[Placement] = []
        self.joint_bound: int | None = None
        self.is_impossible = False
        self.gates_left = work.gates

    def key(self, judged: Judged) -> tuple[bool, int, int, object]:
        """Return the rank of a judged placement; smaller is better.

        What fits comes first, then the least expected error.
        """
        placement = judged.placement
        tie = (placement.sites, placement.recipes, placement.slot_sites)
        if self.instance.problem.goal == "estimate":
            return (False, judged.estimate, judged.figures.costs.total, tie)
        misses = overrun(judged.figures, self.instance.problem.budget) > 0
        return (misses, judged.figures.costs.total, judged.estimate, tie)

    def best(self) -> Judged | None:
        """Return the best of all judged placements."""
        return min(self.pool, key=self.key, default=None)

    def _fit(self, amount: Amount) -> Amount:
        """Return the amount with as many rounds as the size of the program allows."""
        most = self.work.steps // max(self.instance.steps, 1)
        scales = amount.scales[: max(1, most // 2)]
        rounds = max(1, min(amount.rounds, most // len(scales)))
        return Amount(rounds, amount.moves, scales)

    def _route(
        self, placement: Placement, number: int = 0, *, is_needed: bool = False
    ) -> Judged | None:
        """Route a placement if the work left allows; what is needed always runs."""
        gates = self.judge.gates(placement)
        if gates > self.gates_left and not is_needed:
            return None
        self.gates_left -= gates
        result = self.judge.route(placement, number)
        if result is not None:
            self.pool.append(result)
        return result

    def _take(self, placements: list[Placement], count: int) -> list[Judged]:
        """Route the first few placements; the first one whatever it costs."""
        judged = []
        for rank, placement in enumerate(placements[:count]):
            result = self._route(placement, is_needed=rank == 0)
            if result is not None:
                judged.append(result)
        return judged

    def _search(
        self,
        recipes: Choice,
        *,
        amount: Amount,
        seed: int,
        starts: Sequence[Placement] = (),
        lent_only: frozenset[int] = frozenset(),
    ) -> list[Candidate]:
        """Search inside the region that the limit on sites leaves."""
        inside = set(self.narrow.usable)
        kept = [p for p in starts if inside.issuperset(_sites_of(p))]
        found = search(
            self.narrow,
            recipes,
            amount=amount,
            seed=seed,
            starts=kept,
            lent_only=lent_only,
        )
        if self.narrow is self.instance:
            return found
        wide = [tighten(self.instance, c.placement) for c in found]
        return sorted(
            (Candidate(self.judge.estimate(p), p) for p in wide),
            key=lambda c: c.estimate,
        )

    def policy(self, name: str) -> PolicyOutcome:
        """Plan with one fixed workspace policy."""
        self.progress(f"policy: {name} only")
        only = self.instance.problem.only
        if only and name not in only:
            return PolicyOutcome(name, "left out by --only", None)
        choice, reason = allowed(self.instance, name)
        if reason:
            return PolicyOutcome(name, reason, None)
        found = self._search(choice, amount=self._fit(self.work.policy), seed=self.seed)
        if not found:
            return PolicyOutcome(name, "not enough free sites at some call", None)
        self.estimates += [c.placement for c in found[:1]]
        judged = self._take([c.placement for c in found], 4)
        if not judged:
            return PolicyOutcome(name, "no route exists", None)
        return PolicyOutcome(name, "", min(judged, key=self.key))

    def search_all(self, starts: list[Judged]) -> None:
        """Search with every recipe, from scratch and from the policies' plans."""
        self.progress("search: all recipes")
        found = self._search(
            self.recipes,
            amount=self._fit(self.work.search),
            seed=self.seed,
        )
        every = (1.0,) * max(1, len(starts))
        short = self._fit(Amount(2, self.work.search.moves // 2, every))
        if starts:
            found += self._search(
                self.recipes,
                amount=short,
                seed=self.seed + 1,
                starts=[j.placement for j in starts],
            )
        found.sort(key=lambda c: c.estimate)
        self.estimates += [c.placement for c in found[:1]]
        self._take([c.placement for c in found], self.work.routed)

    def _cheapest(self) -> Placement | None:
        return min(self.estimates, key=self.judge.estimate, default=None)

    def solve_joint(self) -> None:
        """Prove the least placement cost where the problem is small enough."""
        is_large = _joint_size(self.instance) > self.work.joint_size
        if is_large and not can_prove(self.instance):
            return
        self.progress("joint model: prove")
        choice: Open = everything(self.instance)
        hint = self._cheapest()
        answer = solve(
            self.instance, choice, work=self.work.joint, seed=self.seed, hint=hint
        )
        if answer.status == "none":
            if hint is not None and not _has_hard_limits(self.instance):
                raise InternalError("the joint model denies a placement that exists")
            self.is_impossible = hint is None
            return
        self.joint_bound = answer.bound
        if answer.placement is not None:
            self.estimates.append(answer.placement)
            self._take([answer.placement], 1)

    def improve_windows(self) -> None:
        """Improve the cheapest placement window by window."""
        start = self._cheapest()
        proven = self.joint_bound is not None and start is not None
        if start is None or self.work.windows == 0:
            return
        if self.narrow is not self.instance:
            # Windows would reach for sites outside the region.
            return
        if proven and self.judge.estimate(start) == self.joint_bound:
            return
        self.progress("windows: recipes, slots and order again")
        better = improve(
            self.instance,
            start,
            self.recipes,
            windows=self.work.windows,
            seed=self.seed,
        )
        if better != start:
            self.estimates.append(better)
            self._take([better], 1)

    def flip(self) -> None:
        """Try other recipes for all calls of one size at once, judged by route."""
        if self.instance.problem.goal == "estimate":
            return
        best = self.best()
        tried = 0
        most = self.work.flips
        amount = Amount(1, self.work.search.moves // 4, (1.0,))
        for steps, recipe in self._classes():
            if best is None or tried >= most or self._is_spent(best):
                return
            if all(best.placement.recipes[i] == recipe for i in steps):
                continue
            tried += 1
            self.progress(f"flips: {tried} of {most}")
            wanted = set(steps)
            choice = tuple(
                (recipe,) if i in wanted else (best.placement.recipes[i],)
                for i in range(self.instance.steps)
            )
            found = self._search(
                choice,
                amount=amount,
                seed=self.seed + tried,
                starts=[best.placement],
            )
            self._take([c.placement for c in found], 1)
            best = self.best()

    def _is_spent(self, judged: Judged) -> bool:
        return self.judge.gates(judged.placement) > self.gates_left

    def repair(self) -> None:
        """Take workspace that is no value for calls whose slots outlive the budget.

        Starts from the plan of least expected error, whether it fits or not; a call
        that was late once never again gets workspace but what a wire lends.
        """
        current = min(self.pool, key=lambda j: j.figures.costs.total, default=None)
        left = self.work.repair_gates
        late: set[int] = set()
        for number in range(self.work.repairs):
            if current is None or set(current.late) <= late or left < 0:
                return
            late |= set(current.late)
            self.progress(f"repair: {len(late)} calls hold values too long")
            kept = tuple(
                self.recipes[i] if i in late else (c,)
                for i, c in enumerate(current.placement.recipes)
            )
            found = self._search(
                kept,
                amount=Amount(1, self.work.search.moves // 8, (1.0,)),
                seed=self.seed + 77 + number,
                starts=[current.placement],
                lent_only=frozenset(late),
            )
            if not found:
                return
            left -= self.judge.gates(found[0].placement)
            current = self._route(found[0].placement, is_needed=True)

    def _classes(self) -> list[tuple[list[int], int]]:
        """Return (steps of one size, recipe) to try, the largest classes first."""
        classes: dict[tuple[str, ...], list[int]] = {}
        for i, row in enumerate(self.instance.profiles):
            if len(row) > 1:
                key = (str(row[0].built.controls), *(p.built.recipe for p in row))
                classes.setdefault(key, []).append(i)
        ranked = sorted(classes.values(), key=lambda steps: (-len(steps), steps))
        result: list[tuple[list[int], int]] = []
        depth = 0
        while True:
            layer = []
            for steps in ranked:
                order = bounds.cheapest_first(self.instance, steps[0])
                if depth < min(len(order), 4):
                    layer.append((steps, order[depth]))
            if not layer:
                return result
            result += layer
            depth += 1

    def polish(self, policies: tuple[PolicyOutcome, ...]) -> tuple[PolicyOutcome, ...]:
        """Route the best few again with other seeds, policies too, fairly."""
        self.progress("routes: the best candidates again")
        for judged in sorted(self.pool, key=self.key)[:3]:
            self._route_again(judged)
        return tuple(
            PolicyOutcome(
                p.policy,
                p.reason,
                None if p.judged is None else self._route_again(p.judged),
            )
            for p in policies
        )

    def _route_again(self, judged: Judged) -> Judged:
        best = judged
        for number in range(1, self.work.routes):
            again = self._route(judged.placement, number)
            if again is not None:
                best = min(best, again, key=self.key)
        return best

    def outcome(self, best: Judged, policies: tuple[PolicyOutcome, ...]) -> Outcome:
        """Put the result together with its bounds."""
        least = bounds.least_estimate(self.instance, self.recipes)
        by = bounds.ESTIMATE_RULE
        # The joint model bounds what keeps the limits; a plan that does not keep them
        # may cost less.
        is_bounded = keeps_limits(self.instance, best.placement)
        if self.joint_bound is not None and is_bounded and self.joint_bound >= least:
            least, by = self.joint_bound, JOINT_RULE
        if least > best.estimate:
            raise InternalError(
                f"the bound {least} ({by}) passes the plan's cost {best.estimate}"
            )
        return Outcome(
            self.instance,
            best,
            least,
            by,
            least == best.estimate,
            bounds.floor_of_error(self.instance, self.recipes),
            policies,
            tuple(j.figures for j in self.pool),
        )


def _sites_of(placement: Placement) -> set[int]:
    return {*placement.sites, *(p for row in placement.slot_sites for p in row)}


def _joint_size(instance: Instance) -> int:
    """Return about how many clauses the joint model has."""
    sites = len(instance.usable)
    usable = list(instance.usable)
    prices = instance.tables.pair_cost((False, False, False))[usable][:, usable]
    levels = len(np.unique(prices))
    meetings = sum(len(profile.pairs) for row in instance.profiles for profile in row)
    return meetings * sites * levels


def _has_hard_limits(instance: Instance) -> bool:
    budget = instance.problem.budget
    return budget.most_sites is not None or budget.longest_ns is not None
