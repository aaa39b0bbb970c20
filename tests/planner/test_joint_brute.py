"""The joint model against an exhaustive search that shares no code with it."""

from __future__ import annotations

import dataclasses
import itertools
from collections import Counter
from typing import Any

import pytest

from placer.planner.joint import everything, solve
from placer.planner.loop import run
from placer.planner.placement import evaluate, make_instance
from placer.problem import Problem
from placer.tables import device_tables
from tests.planner.brute import least_cost
from tests.planner.generate import tiny_problem

SEEN: Counter[str] = Counter()
GATE = range(220)
BLOCK = 20


def solve_both(problem: Problem) -> tuple[Any, Any, Any]:
    instance = make_instance(problem, device_tables(problem.device))
    answer = solve(instance, everything(instance), work=30.0, seed=0)
    least, plan = least_cost(problem)
    return instance, answer, (least, plan)


def compare(seed: int) -> None:
    problem = tiny_problem(seed)
    if problem is None:
        SEEN["no recipe"] += 1
        return
    instance, answer, (least, _) = solve_both(problem)
    SEEN["cases"] += 1
    if least is None:
        assert answer.status == "none", seed
        SEEN["infeasible"] += 1
        return
    assert answer.status == "best", (seed, answer.status)
    assert answer.cost == least, (seed, answer.cost, least)
    record(instance, answer.placement)


def record(instance: Any, placement: Any) -> None:
    """Count what the optimum uses, so that no kind of problem is never drawn."""
    found = evaluate(instance, placement)
    wires = len(instance.wires)
    SEEN["crowded"] += wires >= len(instance.usable)
    SEEN["lender"] += any(w >= 0 for row in found.lenders for w in row)
    chosen = [instance.profiles[i][c].built for i, c in enumerate(placement.recipes)]
    SEEN["level2"] += any(b.workspace == "level2" for b in chosen)
    SEEN["measured"] += any(b.needs_measurement for b in chosen)
    SEEN["clean"] += any("clean" in b.slots for b in chosen)
    spans = sorted(zip(placement.starts, found.ends, strict=True))
    SEEN["parallel"] += any(b[0] < a[1] for a, b in itertools.pairwise(spans))
    SEEN["shared site"] += len(set(placement.sites)) < wires
    SEEN["limited"] += instance.problem.budget.most_sites is not None


@pytest.mark.parametrize("block", range(len(GATE) // BLOCK))
def test_joint_equals_brute_force(block: int) -> None:
    for seed in range(block * BLOCK, (block + 1) * BLOCK):
        compare(seed)


def test_every_kind_of_problem_was_drawn() -> None:
    if SEEN["cases"] + SEEN["no recipe"] < len(GATE):
        pytest.skip("only meaningful after all blocks")
    assert SEEN["cases"] >= 200
    for kind in (
        "infeasible",
        "crowded",
        "lender",
        "level2",
        "measured",
        "clean",
        "parallel",
        "shared site",
        "limited",
    ):
        assert SEEN[kind] >= 3, (kind, SEEN)


@pytest.mark.slow
@pytest.mark.parametrize("block", range(15))
def test_joint_equals_brute_force_on_more(block: int) -> None:
    for seed in range(1000 + block * BLOCK, 1000 + (block + 1) * BLOCK):
        compare(seed)


@pytest.mark.parametrize("seed", range(40, 60))
def test_the_whole_engine_ends_at_the_optimum(seed: int) -> None:
    problem = tiny_problem(seed)
    if problem is None:
        return
    least, _ = least_cost(problem)
    if least is None:
        return
    outcome = run(
        dataclasses.replace(problem, goal="estimate"), effort="normal", seed=0
    )
    assert outcome.judged.estimate == least
    assert outcome.is_proven
