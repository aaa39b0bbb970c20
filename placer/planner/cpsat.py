"""One search of CP-SAT: values and bounds are read only after its status."""

from __future__ import annotations

import math
from typing import Any

from ortools.sat.python import cp_model

from placer.errors import InternalError
from placer.halt import NEVER, Halt, watched


class Run:
    """A solver for one model whose objective lacks a constant."""

    def __init__(
        self,
        model: cp_model.CpModel,
        constant: int,
        *,
        seed: int,
        workers: int,
        halt: Halt = NEVER,
    ) -> None:
        self.halt = halt
        self.model = model
        self.constant = constant
        self.solver = cp_model.CpSolver()
        parameters = self.solver.parameters
        parameters.random_seed = seed
        parameters.num_workers = workers
        parameters.interleave_search = workers > 1
        # Measured: full linear relaxations prove most.
        parameters.linearization_level = 2
        # An interruption is ours to take: what was found must still be checked.
        parameters.catch_sigint_signal = False

    def solve(self, work: float, *, by_bound: bool) -> Any:
        """Search within a deterministic amount of work and return the status."""
        self.solver.parameters.max_deterministic_time = work
        self.solver.parameters.optimize_with_lb_tree_search = by_bound
        found: list[Any] = []
        watched(
            self.halt,
            lambda: found.append(self.solver.solve(self.model)),
            self.solver.stop_search,
        )
        status = found[0]
        if status == cp_model.MODEL_INVALID:
            info = self.solver.solution_info()
            raise InternalError(f"the joint model is invalid: {info}")
        return status

    def spent(self) -> float:
        """Return the deterministic work of the last search."""
        return float(self.solver.response_proto.deterministic_time)

    def bound(self) -> int:
        """Return the proven lower bound of the placement cost."""
        # The solver's bound is a double on an integer objective; half a unit of slack
        # keeps the ceiling from passing the true bound.
        least = math.ceil(self.solver.best_objective_bound - 0.5)
        return max(0, least) + self.constant

    def objective(self) -> int:
        """Return the cost that the solver states for its solution."""
        return round(self.solver.objective_value) + self.constant
