"""The joint model and the walk over sites against an exhaustive search.

The search in `brute` shares no code with either.
"""

from __future__ import annotations

import dataclasses
import itertools
from collections import Counter
from typing import Any

import pytest

from placer.device.model import Budget
from placer.planner import steptables
from placer.planner.joint import everything, solve
from placer.planner.loop import run
from placer.planner.placement import (
    Placement,
    evaluate,
    keeps_limits,
    make_instance,
    schedule,
)
from placer.planner.proof import can_prove, prove
from placer.problem import Problem
from placer.tables import device_tables
from tests.planner.brute import least_cost
from tests.planner.generate import tiny_problem

SEEN: Counter[str] = Counter()
GATE = range(300)
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
        assert walked(instance, 10**15) == (None, 10**15), seed
        SEEN["infeasible"] += 1
        return
    assert answer.status == "best", (seed, answer.status)
    assert answer.cost == least, (seed, answer.cost, least)
    # The walk finds nothing below the least cost, and that cost below anything else.
    assert walked(instance, least) == (None, least), seed
    assert walked(instance, least + 1) == (least, least), seed
    assert walked(instance, 3 * least + 2) == (least, least), seed
    record(instance, answer.placement)


def tighten(seed: int) -> None:
    """Take away one ns and one site that the optimum needs, and solve again."""
    problem = tiny_problem(seed)
    if problem is None:
        return
    free = dataclasses.replace(problem, budget=Budget())
    instance = make_instance(free, device_tables(free.device))
    answer = solve(instance, everything(instance), work=30.0, seed=0)
    if answer.placement is None or answer.cost is None:
        return
    ends = evaluate(instance, answer.placement).ends
    slots = (p for row in answer.placement.slot_sites for p in row)
    sites = len({*answer.placement.sites, *slots})
    for budget in (Budget(longest_ns=max(ends) - 1), Budget(most_sites=sites - 1)):
        limited = dataclasses.replace(free, budget=budget)
        _, other, (least, _) = solve_both(limited)
        if least is None:
            assert other.status == "none", (seed, budget)
            SEEN["out of reach"] += 1
            continue
        assert other.status == "best", (seed, budget)
        assert other.cost == least, (seed, budget)
        assert least >= answer.cost, (seed, budget)
        SEEN["budget binds"] += least > answer.cost


def walked(instance: Any, beat: int) -> tuple[int | None, int]:
    """Return the cost that the walk over all sites found, and what it proved."""
    choice = everything(instance)
    assert can_prove(instance)
    found = prove(instance, choice, beat=beat, work=30.0, seed=0)
    if found.placement is None:
        assert found.cost == beat
        return None, found.bound
    assert evaluate(instance, found.placement).cost == found.cost
    assert keeps_limits(instance, found.placement)
    return found.cost, found.bound


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
    is_parallel = any(b[0] < a[1] for a, b in itertools.pairwise(spans))
    SEEN["parallel"] += is_parallel
    SEEN["serial"] += len(spans) > 1 and not is_parallel
    order = sorted(range(instance.steps), key=lambda i: (placement.starts[i], i))
    choices = (placement.sites, placement.recipes, placement.slot_sites)
    SEEN["late start"] += schedule(instance, order, *choices) != placement.starts
    SEEN["shared site"] += len(set(placement.sites)) < wires
    SEEN["shared slot"] += shares_slots(placement)
    SEEN["limited sites"] += instance.problem.budget.most_sites is not None
    SEEN["limited time"] += instance.problem.budget.longest_ns is not None
    device = instance.problem.device
    is_uneven = len({link.error for link in device.links}) > 1
    SEEN["level2, uneven"] += is_uneven and any(b.level2_wires for b in chosen)
    SEEN["measured, uneven"] += is_uneven and any(b.needs_measurement for b in chosen)
    SEEN["uneven"] += len({link.error for link in device.links}) > 1
    SEEN["broken site"] += len(instance.usable) < len(device.sites)
    SEEN["priced T"] += device.t_gate is not None
    kinds = {op.kind for op in instance.problem.program.operations}
    for kind in ("barrier", "reset", "measure"):
        SEEN[kind] += kind in kinds


def shares_slots(placement: Placement) -> bool:
    """Whether two steps use one site as workspace, one after the other."""
    taken = [p for row in placement.slot_sites for p in row]
    return len(set(taken)) < len(taken)


@pytest.mark.parametrize("block", range(len(GATE) // BLOCK))
def test_joint_equals_brute_force(block: int) -> None:
    for seed in range(block * BLOCK, (block + 1) * BLOCK):
        compare(seed)


@pytest.mark.parametrize("block", range(3))
def test_limits_that_bind_equal_brute_force(block: int) -> None:
    for seed in range(block * BLOCK, (block + 1) * BLOCK):
        tighten(seed)


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
        "serial",
        "late start",
        "shared site",
        "shared slot",
        "limited sites",
        "limited time",
        "budget binds",
        "out of reach",
        "level2, uneven",
        "measured, uneven",
        "uneven",
        "broken site",
        "priced T",
        "barrier",
        "reset",
        "measure",
    ):
        assert SEEN[kind] >= 3, (kind, SEEN)


@pytest.mark.slow
@pytest.mark.parametrize("block", range(25))
def test_joint_equals_brute_force_on_more(block: int) -> None:
    for seed in range(1000 + block * BLOCK, 1000 + (block + 1) * BLOCK):
        compare(seed)
        tighten(seed)


@pytest.mark.slow
def test_every_kind_of_problem_was_drawn_in_the_500() -> None:
    if SEEN["cases"] + SEEN["no recipe"] < 25 * BLOCK:
        pytest.skip("only meaningful after all blocks of slow cases")
    assert SEEN["cases"] >= 400
    for kind in (
        "level2",
        "measured",
        "uneven",
        "budget binds",
        "lender",
        "late start",
    ):
        assert SEEN[kind] >= 10, (kind, SEEN)


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


@pytest.mark.parametrize("seed", range(300, 330))
def test_steps_too_wide_for_tables(seed: int, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(steptables, "LARGEST", 0)
    compare(seed)
