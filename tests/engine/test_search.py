"""The staged search: every stage gives valid placements and never a dearer one."""

from __future__ import annotations

import random

import numpy as np
import pytest

from placer.device.model import Budget
from placer.device.read import find_device
from placer.halt import Halt
from placer.planner import bounds
from placer.planner.anneal import anneal, flow_of, move, neighbours_of
from placer.planner.decode import Taste, alternatives, decode
from placer.planner.explain import reasons
from placer.planner.judge import Judge
from placer.planner.loop import WORK, outcome, run
from placer.planner.placement import Instance, evaluate, make_instance
from placer.planner.policies import allowed, everything_allowed
from placer.planner.pool import Pool
from placer.planner.region import narrowed
from placer.planner.search import Amount, search
from placer.planner.windows import improve
from placer.problem import every_recipe, make_problem
from placer.program.read import read_program
from placer.tables import device_tables


def instance_of(
    seed: int, device: str, wires: int, gates: int, budget: Budget | None = None
) -> Instance:
    draw = random.Random(seed)
    lines = ["OPENQASM 2.0;", 'include "qelib1.inc";', f"qreg q[{wires}];"]
    for _ in range(gates):
        chosen = draw.sample(range(wires), 3)
        a, b, c = (f"q[{w}]" for w in chosen)
        lines.append(draw.choice([f"ccx {a},{b},{c};", f"cx {a},{b};", f"h {a};"]))
    text = "\n".join(lines)
    four = "ctrl(4) @ x q[0], q[1], q[2], q[3], q[4];"
    text3 = text.replace("OPENQASM 2.0", "OPENQASM 3.0").replace("qelib1", "stdgates")
    text3 = text3.replace(f"qreg q[{wires}]", f"qubit[{wires}] q") + "\n" + four
    program = read_program(text3, "random.qasm")
    problem = make_problem(find_device(device), program, budget=budget)
    return make_instance(problem, device_tables(problem.device))


CASES = [
    (seed, device, wires, gates)
    for seed, (device, wires, gates) in enumerate(
        [
            ("slate-16", 6, 12),
            ("tuff-10", 9, 20),
            ("quartzite-20", 8, 15),
            ("breccia-27", 12, 30),
            ("chert-27", 20, 40),
            ("marl-32", 10, 20),
        ]
    )
]


@pytest.mark.parametrize(("seed", "device", "wires", "gates"), CASES)
def test_decoding_gives_valid_placements_and_respects_bounds(
    seed: int, device: str, wires: int, gates: int
) -> None:
    instance = instance_of(seed, device, wires, gates)
    recipes = everything_allowed(instance)
    draw = random.Random(seed)
    for _ in range(3):
        sites = draw.sample(instance.usable, wires)
        placement = decode(instance, sites, Taste(recipes))
        cost = evaluate(instance, placement).cost
        assert placement.sites == tuple(sites)
        assert bounds.least_estimate(instance, recipes) <= cost


@pytest.mark.parametrize(("seed", "device", "wires", "gates"), CASES)
def test_annealing_permutes_usable_sites_and_lowers_the_cost(
    seed: int, device: str, wires: int, gates: int
) -> None:
    instance = instance_of(seed, device, wires, gates)
    sites = list(instance.usable[:wires])
    placement = decode(instance, sites, Taste(everything_allowed(instance)))
    to = anneal(
        flow_of(instance, placement, 1.0),
        instance.usable,
        neighbours_of(instance),
        moves=40_000,
        seed=seed,
    )
    assert sorted(to) == list(range(len(to)))
    out = [p for p in range(len(to)) if p not in set(instance.usable)]
    assert all(to[p] == p for p in out)
    moved = move(instance, placement, [int(p) for p in to])
    before = evaluate(instance, placement).cost
    assert evaluate(instance, moved).cost <= before
    again = anneal(
        flow_of(instance, placement, 1.0),
        instance.usable,
        neighbours_of(instance),
        moves=40_000,
        seed=seed,
    )
    assert np.array_equal(to, again)


def test_annealing_finds_the_line_on_a_ring() -> None:
    # A chain of cx along ten wires embeds in a ring of ten sites: no move is needed,
    # so the least cost is that of the gates and of waiting alone.
    text = 'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[10] q;\n' + "".join(
        f"ctrl @ x q[{a}], q[{b}];\n"
        for a, b in [(0, 5), (5, 2), (2, 9), (9, 1), (1, 7), (7, 3), (3, 8), (8, 4)]
    )
    problem = make_problem(find_device("tuff-10"), read_program(text, "chain.qasm"))
    instance = make_instance(problem, device_tables(problem.device))
    found = search(
        instance,
        everything_allowed(instance),
        amount=Amount(4, 60_000, (1.0,)),
        seed=0,
    )
    judged = Judge(instance, seed=0).route(found[0].placement)
    assert judged is not None
    assert judged.figures.swaps == 0


@pytest.mark.parametrize("seed", [0, 1, 2])
def test_windows_never_make_a_placement_dearer(seed: int) -> None:
    instance = instance_of(seed, "slate-16", 8, 14)
    recipes = everything_allowed(instance)
    placement = decode(instance, list(instance.usable[:8]), Taste(recipes))
    better = improve(instance, placement, recipes, windows=4, seed=seed)
    assert better.sites == placement.sites
    assert evaluate(instance, better).cost <= evaluate(instance, placement).cost


def test_a_limit_on_sites_is_kept_by_the_plan() -> None:
    instance = instance_of(1, "slate-16", 6, 8, Budget(most_sites=7))
    region = narrowed(instance)
    assert len(region.usable) == 7
    outcome = run(instance.problem, effort="quick", seed=0)
    assert outcome.judged.figures.sites <= 7


@pytest.mark.parametrize(("seed", "device", "wires", "gates"), CASES[:4])
def test_the_engine_is_never_worse_than_a_policy(
    seed: int, device: str, wires: int, gates: int
) -> None:
    instance = instance_of(seed, device, wires, gates)
    outcome = run(instance.problem, effort="quick", seed=seed)
    own = outcome.judged.figures.costs.total
    possible = [p.judged for p in outcome.policies if p.judged is not None]
    assert possible
    assert all(own <= judged.figures.costs.total for judged in possible)
    assert outcome.floor <= own
    assert outcome.least <= outcome.judged.estimate


def test_every_other_recipe_has_a_reason() -> None:
    instance = instance_of(0, "slate-16", 6, 4)
    placement = decode(
        instance, list(instance.usable[:6]), Taste(everything_allowed(instance))
    )
    table = reasons(instance, placement)
    for op in instance.problem.program.calls:
        chosen = instance.profiles[op.index][placement.recipes[op.index]]
        named = {name for name, _ in table[op.index]} | {chosen.built.recipe}
        assert named == {built.recipe for built in every_recipe(op)}
        assert all(reason for _, reason in table[op.index])


def test_policies_allow_only_their_workspace() -> None:
    instance = instance_of(0, "quartzite-20", 6, 4)
    for policy in ("clean", "borrowed", "level2", "none"):
        choice, reason = allowed(instance, policy)
        assert not reason
        for step, row in enumerate(choice):
            for c in row:
                built = instance.profiles[step][c].built
                plain = built.workspace == "none" and built.controls <= 2
                assert plain or built.workspace == policy


def test_a_bound_under_limits_says_nothing_about_a_plan_that_breaks_them() -> None:
    instance = instance_of(1, "slate-16", 6, 4, Budget(longest_ns=1))
    recipes = everything_allowed(instance)
    placement = decode(instance, list(instance.usable[:6]), Taste(recipes))
    pool = Pool(instance, WORK["quick"], 0, Halt(), lambda _: None)
    pool.joint_bound = pool.judge.estimate(placement) + 1
    judged = pool.judge.route(placement)
    assert judged is not None
    found = outcome(pool, judged, ())
    assert found.least_by == bounds.ESTIMATE_RULE
    assert found.least <= judged.estimate


def test_reasons_are_priced_where_the_plan_stands_in_planned_order() -> None:
    # Workspace wires of two scopes may share a site; the later one in time may stand
    # first in the program.  Every recipe must still find its own price.
    instance = instance_of(2, "tuff-10", 6, 10)
    recipes = everything_allowed(instance)
    placement = decode(instance, list(instance.usable[:6]), Taste(recipes))
    table = alternatives(instance, placement, Taste(recipes))
    for step, row in enumerate(instance.profiles):
        if len(row) > 1:
            assert table[step][placement.recipes[step]] is not None
