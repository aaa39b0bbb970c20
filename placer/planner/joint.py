"""Solve the joint model: first for solutions, then for its bound.

In: an instance and the choices that are left open.  Out: the best placement found, a
proven lower bound of the placement cost, and the solver's status.  The result is
re-costed by `placement.evaluate`, never believed.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any, Literal

from ortools.sat.python import cp_model

from placer.errors import InternalError
from placer.planner.model import JointModel, Open, everything
from placer.planner.placement import (
    Instance,
    Misfit,
    Placement,
    evaluate,
    schedule,
)

__all__ = ["Answer", "Open", "everything", "solve", "tighten"]

Status = Literal["best", "feasible", "none", "out-of-work"]


@dataclass(frozen=True, slots=True)
class Answer:
    """What the solver said; `bound` is `None` where it proved nothing."""

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
) -> Answer:
    """Solve the joint model within a deterministic amount of work.

    `work` is CP-SAT's deterministic time.  A hint must be a valid placement.

    Raises
    ------
    InternalError
        If the model is invalid, or a solution does not survive its re-costing.
    """
    joint = JointModel(instance, choice)
    if hint is not None:
        joint.hint(hint)
    model = joint.model
    fault = model.validate()
    if fault:
        raise InternalError(f"the joint model is invalid: {fault}")
    first = _Run(model, joint.constant, seed=seed, workers=workers)
    status = first.solve(0.5 * work, by_bound=False)
    if status == cp_model.INFEASIBLE:
        return Answer("none", None, None, None)
    bound = first.bound()
    if status == cp_model.UNKNOWN:
        return Answer("out-of-work", None, None, bound)
    placement = tighten(instance, joint.read(first.solver))
    cost = evaluate(instance, placement).cost
    if status != cp_model.OPTIMAL and work > WORTH_A_SECOND_RUN:
        # A second search raises the bound; the first one's solution is its hint.
        joint.hint(placement)
        second = _Run(model, joint.constant, seed=seed, workers=workers)
        status = second.solve(0.5 * work, by_bound=True)
        if status == cp_model.INFEASIBLE:
            raise InternalError("the joint model denies its own solution")
        bound = max(bound, second.bound())
        if status in (cp_model.OPTIMAL, cp_model.FEASIBLE):
            other = tighten(instance, joint.read(second.solver))
            other_cost = evaluate(instance, other).cost
            if other_cost < cost:
                placement, cost = other, other_cost
        first = second if status == cp_model.OPTIMAL else first
    if status == cp_model.OPTIMAL or bound == cost:
        stated = bound if bound == cost else first.objective()
        if cost > stated:
            raise InternalError(f"re-costing gives {cost}, the solver said {stated}")
        return Answer("best", placement, cost, cost)
    return Answer("feasible", placement, cost, min(bound, cost))


WORTH_A_SECOND_RUN = 1.0
"""Deterministic work from which a second search, made for bounds, pays."""


class _Run:
    """One search of CP-SAT; values and bounds are read only after its status."""

    def __init__(
        self, model: cp_model.CpModel, constant: int, *, seed: int, workers: int
    ) -> None:
        self.model = model
        self.constant = constant
        self.solver = cp_model.CpSolver()
        parameters = self.solver.parameters
        parameters.random_seed = seed
        parameters.num_workers = workers
        parameters.interleave_search = workers > 1
        # Measured: full linear relaxations prove most, see DEVELOPERS.md.
        parameters.linearization_level = 2

    def solve(self, work: float, *, by_bound: bool) -> Any:
        """Search within a deterministic amount of work and return the status."""
        self.solver.parameters.max_deterministic_time = work
        self.solver.parameters.optimize_with_lb_tree_search = by_bound
        status = self.solver.solve(self.model)
        if status == cp_model.MODEL_INVALID:
            info = self.solver.solution_info()
            raise InternalError(f"the joint model is invalid: {info}")
        return status

    def bound(self) -> int:
        """Return the proven lower bound of the placement cost."""
        # The solver's bound is a double on an integer objective; half a unit of slack
        # keeps the ceiling from passing the true bound.
        least = math.ceil(self.solver.best_objective_bound - 0.5)
        return max(0, least) + self.constant

    def objective(self) -> int:
        """Return the cost that the solver states for its solution."""
        return round(self.solver.objective_value) + self.constant


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
