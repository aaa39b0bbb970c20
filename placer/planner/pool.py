"""What the stages of the engine share: candidates judged so far, and work left.

In: an instance, an effort, a seed.  Out: placements searched for and routed, the best
of them, and what there is to say about progress.  No stage is decided here.
"""

from __future__ import annotations

import dataclasses
from typing import TYPE_CHECKING

from placer.planner.joint import tighten
from placer.planner.judge import Judge
from placer.planner.policies import everything_allowed
from placer.planner.rank import in_the_spirit, rank
from placer.planner.region import narrowed
from placer.planner.search import Amount, Candidate, search
from placer.units import COST_PER_NAT

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from placer.halt import Halt
    from placer.planner.judge import Judged
    from placer.planner.placement import Instance, Placement
    from placer.planner.rank import Choice, Rank
    from placer.planner.work import Work

HASTE = 8.0
"""How much more a delay weighs in a search for the shortest time."""


class Pool:
    """All that was judged, the cheapest estimates, and the work that is left."""

    def __init__(
        self,
        instance: Instance,
        work: Work,
        seed: int,
        halt: Halt,
        progress: Callable[[str], None],
    ) -> None:
        self.instance = instance
        self.narrow = narrowed(instance)
        self.judge = Judge(instance, seed=seed, route_tables=self.narrow.tables)
        self.work = work
        self.seed = seed
        self.halt = halt
        self.progress = progress
        self.recipes = in_the_spirit(instance, everything_allowed(instance))
        self.judged: list[Judged] = []
        self.estimates: list[Placement] = []
        self.joint_bound: int | None = None
        self.is_impossible = False
        self.gates_left = work.gates

    def key(self, judged: Judged) -> Rank:
        """Return the rank of a judged placement; smaller is better."""
        return rank(judged, self.instance.problem)

    def best(self) -> Judged | None:
        """Return the best of all judged placements."""
        return min(self.judged, key=self.key, default=None)

    def cheapest(self) -> Placement | None:
        """Return the placement of least cost among the stages' own best."""
        return min(self.estimates, key=self.judge.estimate, default=None)

    def say(self, stage: str) -> None:
        """Report a stage with the best so far, the bound and the gap."""
        self.halt.stage = stage
        best = self.best()
        words = [stage]
        if best is not None:
            words.append(f"best error {best.figures.costs.total / COST_PER_NAT:.3g}")
        start = self.cheapest()
        if self.joint_bound is not None and start is not None:
            cost = self.judge.estimate(start)
            gap = (cost - self.joint_bound) / cost if cost else 0.0
            words.append(
                f"cost {cost / COST_PER_NAT:.3g}, "
                f"bound {self.joint_bound / COST_PER_NAT:.3g}, gap {gap:.0%}"
            )
        self.progress("; ".join(words))

    def is_over(self) -> bool:
        """Whether there is a plan, and the work must end."""
        return bool(self.judged) and self.halt.is_due()

    def fit(self, amount: Amount) -> Amount:
        """Return the amount with as many rounds as the size of the program allows."""
        most = self.work.steps // max(self.instance.steps, 1)
        scales = amount.scales[: max(1, most // 2)]
        rounds = max(1, min(amount.rounds, most // len(scales)))
        return dataclasses.replace(amount, rounds=rounds, scales=scales)

    def route(
        self, placement: Placement, number: int = 0, *, is_needed: bool = False
    ) -> Judged | None:
        """Route a placement if the work left allows; what is needed always runs."""
        gates = self.judge.gates(placement)
        if (gates > self.gates_left and not is_needed) or self.is_over():
            return None
        self.gates_left -= gates
        result = self.judge.route(placement, number)
        if result is not None:
            self.judged.append(result)
        return result

    def take(self, placements: Sequence[Placement], count: int) -> list[Judged]:
        """Route the first few placements; the first one whatever it costs."""
        judged = []
        for number, placement in enumerate(placements[:count]):
            result = self.route(placement, is_needed=number == 0)
            if result is not None:
                judged.append(result)
        return judged

    def search(
        self,
        recipes: Choice,
        *,
        amount: Amount,
        seed: int,
        starts: Sequence[Placement] = (),
        lent_only: frozenset[int] = frozenset(),
    ) -> list[Candidate]:
        """Search inside the region that the limit on sites leaves."""
        if self.is_over():
            return []
        if self.instance.problem.goal == "time":
            amount = dataclasses.replace(amount, delay=amount.delay * HASTE)
        inside = set(self.narrow.usable)
        kept = [p for p in starts if inside.issuperset(sites_of(p))]
        found = search(
            self.narrow,
            recipes,
            amount=amount,
            seed=seed,
            starts=kept,
            lent_only=lent_only,
            halt=self.halt,
        )
        if self.narrow is self.instance:
            return found
        wide = [tighten(self.instance, c.placement) for c in found]
        return sorted(
            (Candidate(self.judge.estimate(p), p) for p in wide),
            key=lambda c: c.estimate,
        )

    def is_spent(self, judged: Judged) -> bool:
        """Whether one more route of this size is too much."""
        return self.judge.gates(judged.placement) > self.gates_left


def sites_of(placement: Placement) -> set[int]:
    """Return the sites of all wires and slots."""
    return {*placement.sites, *(p for row in placement.slot_sites for p in row)}
