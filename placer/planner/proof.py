"""Prove the least placement cost by trying every place of the wires.

In: an instance, the choices that are open, the cost to beat.  Out: the best placement
that beats it, if any, and a proven lower bound.  A walk over all sites of the wires,
cut by a bound, leaves few places; at each the joint model, with the wires fixed,
settles the rest.  Work is counted in nodes and in the solver's deterministic time.
"""

from __future__ import annotations

import heapq
from dataclasses import dataclass
from typing import TYPE_CHECKING

from ortools.sat.python import cp_model

from placer.halt import NEVER, Halt
from placer.planner.branches import branches_of
from placer.planner.cpsat import Run
from placer.planner.leaves import Lens
from placer.planner.model import JointModel, everything
from placer.planner.placement import evaluate
from placer.planner.sitetree import walk
from placer.planner.symmetry import representatives, symmetries

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.planner.branches import Branches
    from placer.planner.model import Open
    from placer.planner.placement import Instance, Placement

NODES_PER_WORK = 12_000_000
"""Nodes of the walk, times steps, that count as one unit of deterministic work."""
DIRECT_WEIGHT = 60
"""Steps that one step without arrays counts for."""
LOOK_WORK = 0.001
"""Work that a closer look at a leaf counts for."""
LEAF_WORK = 0.02
"""Work that building the model of a leaf counts for."""
MOST_LEAVES = 30_000
MOST_WIRES = 24
MOST_STEPS = 64
PAUSE_WORK = 0.2
"""Work of a walk after which it asks whether it must halt."""
WALK_SHARE = 0.25
"""Share of the work that one walk may take."""
LIMITS = (100, 97, 93, 87, 80, 70, 55)
"""Per cent of the cost to beat: a walk that is too long is tried with a lower limit."""

SETTLED = 1 << 62
"""Bound of a place where nothing is left to find."""


@dataclass(frozen=True, slots=True)
class Proof:
    """A placement below the cost to beat, if one was found, and a proven bound."""

    placement: Placement | None
    cost: int
    bound: int
    spent: float


def can_prove(instance: Instance) -> bool:
    """Whether there is something to place, and not more than a walk can bound."""
    branched = sum(1 for wire in instance.wires if wire.uses)
    return 0 < branched <= MOST_WIRES and instance.steps <= MOST_STEPS


def prove(
    instance: Instance,
    choice: Open,
    *,
    beat: int,
    work: float,
    seed: int,
    halt: Halt = NEVER,
) -> Proof:
    """Return the least placement cost below `beat`, or a bound of it."""
    is_full = choice == everything(instance)
    turns = symmetries(instance) if is_full else [tuple(range(len(instance.usable)))]
    branches = branches_of(instance, choice, representatives(turns))
    weight = sum(DIRECT_WEIGHT if d else 1 for d in branches.walk.direct)
    speed = NODES_PER_WORK / weight
    spent = 0.0
    for share in LIMITS:
        limit = beat * share // 100
        bounds, places, kept, nodes, is_done = walk(
            branches.walk,
            limit,
            most_leaves=MOST_LEAVES,
            most_nodes=int(WALK_SHARE * work * speed),
            pause=max(1, int(PAUSE_WORK * speed)),
            halt=halt,
        )
        spent += nodes / speed
        if halt.is_due():
            break
        if not is_done:
            continue
        queue = [
            (int(bound), False, tuple(int(p) for p in place))
            for bound, place in zip(bounds, places, strict=True)
        ]
        search = _Search(instance, choice, branches, turns, beat, seed, halt)
        bound = min(search.settle(queue, work - spent), kept)
        return Proof(search.placement, search.best, bound, spent + search.spent)
    return Proof(None, beat, 0, spent)


Node = tuple[int, bool, tuple[int, ...]]
"""Bound, was it looked at closely, positions of the wires in branching order."""


class _Search:
    """The places that are left, the least bound first, and the best so far."""

    def __init__(
        self,
        instance: Instance,
        choice: Open,
        branches: Branches,
        turns: Sequence[tuple[int, ...]],
        beat: int,
        seed: int,
        halt: Halt,
    ) -> None:
        self.halt = halt
        self.instance = instance
        self.branches = branches
        self.lens = Lens(instance, choice, branches)
        self.turns = turns
        self.best = beat
        self.seed = seed
        self.placement: Placement | None = None
        self.spent = 0.0
        self.closed: set[tuple[int, ...]] = set()

    def settle(self, queue: list[Node], work: float) -> int:
        """Work on places while they may beat the best; return the bound of the rest."""
        heapq.heapify(queue)
        unsettled = SETTLED
        while queue and queue[0][0] < self.best and self.spent < work:
            if self.halt.is_due():
                break
            bound, is_sharp, place = heapq.heappop(queue)
            if is_sharp:
                unsettled = min(unsettled, self._solve(place, bound))
                continue
            if self._is_twin(place):
                continue
            self.spent += LOOK_WORK
            leaf = self.lens.look(place, self.best)
            if leaf.bound < self.best:
                heapq.heappush(queue, (max(bound, leaf.bound), True, place))
        rest = queue[0][0] if queue else SETTLED
        return min(unsettled, rest, self.best)

    def _is_twin(self, place: tuple[int, ...]) -> bool:
        """Whether a renumbering of the sites was seen before."""
        if len(self.turns) == 1:
            return False
        key = min(tuple(turn[p] for p in place) for turn in self.turns)
        if key in self.closed:
            return True
        self.closed.add(key)
        return False

    def _solve(self, place: tuple[int, ...], bound: int) -> int:
        """Solve the joint model with the wires fixed; return what stays unproven."""
        leaf = self.lens.look(place, self.best)
        if leaf.bound >= self.best:
            return SETTLED
        joint = JointModel(self.instance, leaf.choice)
        joint.beat(self.best)
        run = Run(
            joint.model, joint.constant, seed=self.seed, workers=1, halt=self.halt
        )
        status = run.solve(1.0, by_bound=False)
        self.spent += run.spent() + LEAF_WORK
        if status == cp_model.INFEASIBLE:
            return SETTLED
        if status == cp_model.UNKNOWN:
            return max(bound, run.bound())
        placement = joint.read(run.solver)
        cost = evaluate(self.instance, placement).cost
        if cost < self.best:
            self.best, self.placement = cost, placement
        return SETTLED if status == cp_model.OPTIMAL else max(bound, run.bound())
