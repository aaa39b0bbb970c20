"""Solve the joint model: try every place of the wires, then leave it to the solver.

In: an instance and the choices that are left open.  Out: the best placement found, a
proven lower bound of the placement cost, and the status.  Every result is re-costed
by `placement.evaluate`, never believed.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from ortools.sat.python import cp_model

from placer.errors import InternalError
from placer.halt import NEVER, Halt
from placer.planner.cpsat import Run
from placer.planner.model import JointModel, Open, everything, size_of
from placer.planner.placement import (
    Instance,
    Misfit,
    Placement,
    evaluate,
    keeps_limits,
    schedule,
)
from placer.planner.proof import can_prove, prove

__all__ = ["Answer", "Open", "everything", "solve", "tighten"]

Status = Literal["best", "feasible", "none", "out-of-work"]


@dataclass(frozen=True, slots=True)
class Answer:
    """What was found; `bound` is `None` where nothing was proved."""

    status: Status
    placement: Placement | None
    cost: int | None
    bound: int | None


def solve(
    instance: Instance,
    choice: Open,
    *,
    work: float,
    seed: int,
    hint: Placement | None = None,
    workers: int = 1,
    halt: Halt = NEVER,
    largest: int | None = None,
) -> Answer:
    """Solve the joint model within a deterministic amount of work.

    `work` is CP-SAT's deterministic time, or what the walk over all sites counts as
    such; a model of more than `largest` clauses is not built.  A hint must be a valid
    placement; one that is inside the open choices and within the limits is never
    answered by a dearer one.

    Raises
    ------
    InternalError
        If the model is invalid, or a solution does not survive its re-costing.
    """
    most = LARGEST_MODEL if largest is None else min(largest, LARGEST_MODEL)
    return _Solve(instance, choice, seed, workers, halt, most).run(work, hint)


LARGEST_MODEL = 300_000
"""Clauses, about, up to which the solver gets the whole model (below 1 GiB)."""
WORTH_A_SECOND_RUN = 1.0
"""Deterministic work from which a second search, made for bounds, pays."""


class _Solve:
    """The best placement and the best bound so far, from one search to the next."""

    def __init__(
        self,
        instance: Instance,
        choice: Open,
        seed: int,
        workers: int,
        halt: Halt,
        largest: int,
    ) -> None:
        self.halt = halt
        self.largest = largest
        self.instance = instance
        self.choice = choice
        self.seed = seed
        self.workers = workers
        self.placement: Placement | None = None
        self.cost: int | None = None
        self.bound: int | None = None

    def run(self, work: float, hint: Placement | None) -> Answer:
        """Search in stages until the cost meets the bound or the work is done."""
        if hint is not None and _is_allowed(self.instance, self.choice, hint):
            self._take(hint)
        is_walked = self._walk(work)
        is_over = self._is_proven() or self.halt.is_due()
        if is_over or size_of(self.instance, self.choice) > self.largest:
            return self._answer()
        joint = JointModel(self.instance, self.choice)
        start = self.placement or hint
        if start is not None:
            joint.hint(start)
        fault = joint.model.validate()
        if fault:
            raise InternalError(f"the joint model is invalid: {fault}")
        if not self._search(joint, 0.5 * work, by_bound=False):
            return Answer("none", None, None, None)
        if self.placement is None:
            return Answer("out-of-work", None, None, self.bound)
        if self.halt.is_due():
            return self._answer()
        if not is_walked and not self._is_proven():
            self._walk(work)
        if not self._is_proven() and work > WORTH_A_SECOND_RUN:
            # A second search raises the bound; the first one's solution is its hint.
            joint.hint(self.placement)
            self._search(joint, 0.5 * work, by_bound=True)
        return self._answer()

    def _walk(self, work: float) -> bool:
        """Try every place of the wires, if there are not too many."""
        if self.cost is None or not can_prove(self.instance):
            return False
        if self.choice != everything(self.instance):
            # In a window most wires are fixed: the solver is faster than the arrays.
            return False
        found = prove(
            self.instance,
            self.choice,
            beat=self.cost,
            work=work,
            seed=self.seed,
            halt=self.halt,
        )
        if found.placement is not None:
            self._take(found.placement)
        self._raise(found.bound)
        return True

    def _search(self, joint: JointModel, work: float, *, by_bound: bool) -> bool:
        """Let the solver search the whole model; return whether it may have a plan."""
        run = Run(
            joint.model,
            joint.constant,
            seed=self.seed,
            workers=self.workers,
            halt=self.halt,
        )
        status = run.solve(work, by_bound=by_bound)
        if status == cp_model.INFEASIBLE:
            if self.placement is not None:
                raise InternalError("the joint model denies a placement that exists")
            return False
        self._raise(run.bound())
        if status == cp_model.UNKNOWN:
            return True
        placement = tighten(self.instance, joint.read(run.solver))
        cost = evaluate(self.instance, placement).cost
        if status == cp_model.OPTIMAL:
            if cost > run.objective():
                raise InternalError(
                    f"re-costing gives {cost}, the solver said {run.objective()}"
                )
            self._raise(cost)
        self._take(placement)
        return True

    def _take(self, placement: Placement) -> None:
        """Keep a placement if it is the cheapest so far."""
        placement = tighten(self.instance, placement)
        cost = evaluate(self.instance, placement).cost
        if self.cost is None or cost < self.cost:
            self.placement, self.cost = placement, cost

    def _raise(self, bound: int) -> None:
        """Keep a bound if it is the highest so far."""
        self.bound = bound if self.bound is None else max(self.bound, bound)

    def _is_proven(self) -> bool:
        return (
            self.cost is not None and self.bound is not None and self.bound >= self.cost
        )

    def _answer(self) -> Answer:
        if self.cost is None:
            return Answer("out-of-work", None, None, self.bound)
        if self.bound is not None and self.bound > self.cost:
            raise InternalError(
                f"the bound {self.bound} passes the cost {self.cost} of a placement"
            )
        status: Status = "best" if self._is_proven() else "feasible"
        return Answer(status, self.placement, self.cost, self.bound)


def _is_allowed(instance: Instance, choice: Open, placement: Placement) -> bool:
    """Whether a placement is inside the open choices and within the limits."""
    for wire, site, domain in zip(
        instance.wires, placement.sites, choice.sites, strict=True
    ):
        if site not in domain and (wire.uses or not wire.is_known_zero):
            return False
    for step in range(instance.steps):
        if placement.recipes[step] not in choice.recipes[step]:
            return False
        if not set(placement.slot_sites[step]) <= set(choice.slot_sites[step]):
            return False
    return keeps_limits(instance, placement)


def tighten(instance: Instance, placement: Placement) -> Placement:
    """Return the placement with every start as early as its order allows."""
    order = sorted(range(instance.steps), key=lambda i: (placement.starts[i], i))
    starts = schedule(
        instance, order, placement.sites, placement.recipes, placement.slot_sites
    )
    moved = Placement(placement.sites, placement.recipes, placement.slot_sites, starts)
    try:
        better = evaluate(instance, moved).cost
    except Misfit:
        return placement
    try:
        old = evaluate(instance, placement).cost
    except Misfit:
        return moved
    return moved if better <= old else placement
