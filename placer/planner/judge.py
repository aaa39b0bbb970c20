"""Judge placements by a real route and its timeline.

In: a placement.  Out: its route, figures and costs.  Routes are remembered, so that
asking twice costs nothing.
"""

from __future__ import annotations

import dataclasses
from typing import TYPE_CHECKING

import numpy as np

from placer.errors import InternalError
from placer.placed import place
from placer.planner.placement import evaluate
from placer.trial.backward import there_and_back
from placer.trial.router import RouteResult, Setting, from_route, route
from placer.trial.timeline import figures, timeline

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.halt import Halt
    from placer.placed import PlacedCircuit
    from placer.plan import Figures, Route
    from placer.planner.placement import Instance, Placement
    from placer.tables import Tables

# The first setting is the everyday one; the others look further, or less far.
SETTINGS = (
    Setting(),
    Setting(lookahead=40, weight=0.4),
    Setting(lookahead=10, weight=0.6, decay=0.01),
    Setting(care=0.0),
)
# Never used to choose a plan: what these routes need is quoted as expected swaps.
HELD_OUT = (
    (Setting(lookahead=25, weight=0.45, decay=0.002), 900_001),
    (Setting(lookahead=15, weight=0.55, decay=0.005), 900_002),
    (Setting(lookahead=30, weight=0.5, care=0.3), 900_003),
)


@dataclasses.dataclass(frozen=True, slots=True)
class Judged:
    """A placement with its placement cost, a route of it and the figures.

    `late` lists the steps whose slots outlive the budget's share on this route.
    """

    placement: Placement
    estimate: int
    route: Route
    figures: Figures
    late: tuple[int, ...] = ()


class Judge:
    """Route placements of one instance and keep what was found.

    `route_tables` may be those of the same device with fewer sites in service, where
    routes must stay inside a region.
    """

    def __init__(
        self, instance: Instance, *, seed: int, route_tables: Tables | None = None
    ) -> None:
        self.route_tables = route_tables or instance.tables
        self.instance = instance
        self.seed = seed
        self._placed: dict[Placement, PlacedCircuit] = {}
        self._judged: dict[tuple[Placement, int], Judged | None] = {}
        self._estimates: dict[Placement, int] = {}

    def estimate(self, placement: Placement) -> int:
        """Return the placement cost."""
        if placement not in self._estimates:
            self._estimates[placement] = evaluate(self.instance, placement).cost
        return self._estimates[placement]

    def route(self, placement: Placement, number: int = 0) -> Judged | None:
        """Return the placement judged on its `number`-th route, `None` without one."""
        key = (placement, number)
        if key not in self._judged:
            setting = SETTINGS[number % len(SETTINGS)]
            seed = self.seed * 1000 + number
            self._judged[key] = self._follow(placement, setting, seed)
        return self._judged[key]

    def follow(
        self,
        placement: Placement,
        gaps: Sequence[int],
        swaps: Sequence[tuple[int, int]],
    ) -> Judged:
        """Return the placement judged on a given route.

        `gaps[g]` is the number of swaps before two-body gate g.

        Raises
        ------
        InternalError
            If the route breaks a rule of the device or of the circuit.
        """
        placed = self.placed(placement)
        if len(gaps) != len(placed.gates):
            raise InternalError("the route does not name every two-body gate once")
        pairs = np.array(swaps, dtype=np.int64).reshape(-1, 2)
        given = RouteResult(
            np.array(gaps, dtype=np.int64),
            pairs[:, 0].copy(),
            pairs[:, 1].copy(),
            np.zeros(placed.steps, dtype=np.int64),
        )
        return self._judge(placement, placed, given)

    def turned(self, judged: Judged, number: int) -> list[int] | None:
        """Return the sites from which the tokens of a judged placement should start.

        Found by routing the circuit back from where its route ends.
        """
        placed = self.placed(judged.placement)
        setting = SETTINGS[number % len(SETTINGS)]
        there = from_route(judged.route, placed)
        seed = self.seed * 1000 + 500 + number
        to = there_and_back(
            placed, self.route_tables, there, setting=setting, seed=seed
        )
        return None if to is None else to.tolist()

    def _follow(
        self, placement: Placement, setting: Setting, seed: int
    ) -> Judged | None:
        placed = self.placed(placement)
        found = route(placed, self.route_tables, setting=setting, seed=seed)
        return None if found is None else self._judge(placement, placed, found)

    def _judge(
        self, placement: Placement, placed: PlacedCircuit, found: RouteResult
    ) -> Judged:
        line = timeline(placed, self.instance.tables, found)
        share = self.instance.problem.budget.share
        wires = placed.wires
        late = {
            step
            for number, (step, _) in enumerate(placed.leases)
            if line.share[wires + number] > share
        }
        return Judged(
            placement,
            self.estimate(placement),
            found.as_route(),
            figures(line, self._names(placed)),
            tuple(sorted(late)),
        )

    def _names(self, placed: PlacedCircuit) -> list[str]:
        program = self.instance.problem.program
        names = list(program.wire_names)
        for step, slot in placed.leases:
            op = program.operations[step]
            at = f" at line {op.place.line}" if op.place.line else f" in step {step}"
            names.append(f"slot {slot} of '{op.name}'{at}")
        return names

    def gates(self, placement: Placement) -> int:
        """Return the number of two-body gates, the measure of a route's work."""
        return sum(
            pair.count
            for i, c in enumerate(placement.recipes)
            for pair in self.instance.profiles[i][c].pairs
        )

    def placed(self, placement: Placement) -> PlacedCircuit:
        """Return the placed circuit of a placement, the last one from memory."""
        if placement not in self._placed:
            lenders = evaluate(self.instance, placement).lenders
            order = sorted(
                range(self.instance.steps), key=lambda i: (placement.starts[i], i)
            )
            recipes = [
                self.instance.profiles[i][c].built
                for i, c in enumerate(placement.recipes)
            ]
            self._placed = {
                placement: place(
                    self.instance.problem,
                    placement.sites,
                    recipes,
                    placement.slot_sites,
                    order,
                    lenders,
                )
            }
        return self._placed[placement]

    def with_expected_swaps(self, judged: Judged, halt: Halt) -> Judged:
        """Add the mean number of swaps of routes that no choice ever looked at.

        Fewer routes are run when the work must end, none if it must end at once.
        """
        placed = self.placed(judged.placement)
        counts = []
        for setting, seed in HELD_OUT:
            if halt.is_due():
                break
            found = route(placed, self.route_tables, setting=setting, seed=seed)
            if found is not None:
                counts.append(found.count)
        if not counts:
            return judged
        mean = sum(counts) / len(counts)
        kept = dataclasses.replace(
            judged.route, held_out=len(counts), expected_swaps=mean
        )
        return dataclasses.replace(judged, route=kept)
