"""The cleanup game as a CP-SAT model, one change a step, against the search.

An independent formulation: booleans 'value v is there after step k', one change per
step, more steps until the model has a solution that no longer one betters.
"""

from __future__ import annotations

import random

import pytest
from ortools.sat.python import cp_model  # noqa: TID251 - an independent solver

from placer.planner.cleanup.curve import fewest, solve
from placer.planner.cleanup.game import Game
from tests.planner.cleanup.reference import chain, tree


def by_cpsat(game: Game, limit: int, steps: int) -> int | None:
    """Return the least cost of a game with one target or none in so many steps."""
    model = cp_model.CpModel()
    count = len(game.values)
    there = [
        [model.new_bool_var(f"there[{v},{k}]") for k in range(steps + 1)]
        for v in range(count)
    ]
    costs = []
    for v, value in enumerate(game.values):
        model.add(there[v][0] == 0)
        model.add(there[v][steps] == int(v in game.kept))
        for k in range(steps):
            comes = model.new_bool_var(f"comes[{v},{k}]")
            goes = model.new_bool_var(f"goes[{v},{k}]")
            model.add(there[v][k + 1] - there[v][k] == comes - goes)
            model.add(comes + goes <= 1)
            for i in value.inputs:
                model.add_implication(comes, there[i][k])
                model.add_implication(goes, there[i][k])
            costs.append((k, comes, value.compute))
            costs.append((k, goes, value.uncompute))
    for k in range(steps):
        model.add(sum(change for at, change, _ in costs if at == k) <= 1)
        held = (game.values[v].size * there[v][k + 1] for v in range(count))
        model.add(sum(held) <= limit)
    for target in game.targets:
        passed = [model.new_bool_var(f"pass[{k}]") for k in range(steps + 1)]
        model.add_exactly_one(passed)
        for k, literal in enumerate(passed):
            for v in target.needs:
                model.add_implication(literal, there[v][k])
    model.minimize(sum(price * change for _, change, price in costs))
    assert model.validate() == ""
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = 1
    solver.parameters.max_deterministic_time = 60
    status = solver.solve(model)
    if status == cp_model.INFEASIBLE:
        return None
    assert status == cp_model.OPTIMAL
    return round(solver.objective_value)


@pytest.mark.parametrize(("length", "wires"), [(4, 3), (5, 4), (6, 4), (7, 5), (5, 3)])
def test_chains(length: int, wires: int) -> None:
    wanted = solve(chain(length), wires).cost
    steps = 2 * length + 6 if wanted is None else wanted + 2
    assert by_cpsat(chain(length), wires, steps) == wanted


@pytest.mark.parametrize("seed", range(6))
def test_trees(seed: int) -> None:
    game = tree(2, random.Random(f"cpsat:{seed}"))
    limit = fewest(game) + seed % 3
    answer = solve(game, limit)
    if answer.moves is None:
        assert answer.proven
        assert by_cpsat(game, limit, 26) is None
        return
    changes = sum(1 for move in answer.moves if move.action != "use")
    assert by_cpsat(game, limit, changes + 4) == answer.cost
