"""Goals on request: each makes its own figure least, and the error second."""

from __future__ import annotations

import pytest
from click.testing import CliRunner

import placer
from placer.cli import main
from placer.device.read import find_device
from placer.planner.judge import Judge
from placer.planner.placement import make_instance
from placer.planner.policies import everything_allowed
from placer.planner.rank import in_the_spirit
from placer.problem import make_problem
from placer.program.read import read_program
from placer.tables import device_tables
from tests.bench.large import first_fit

SOURCE = (
    'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[6] q;\n'
    "ctrl(4) @ x q[0], q[1], q[2], q[3], q[4];\n"
    "ctrl(3) @ x q[5], q[3], q[1], q[0];\n"
)


@pytest.fixture(scope="module")
def plans() -> dict[str, placer.Plan]:
    program = read_program(SOURCE, "goals.qasm")
    return {
        goal: placer.plan(program, "slate-16", goal=goal, effort="quick")
        for goal in ("error", "time", "sites", "t-gates")
    }


def test_each_goal_is_best_at_its_own_figure(plans: dict[str, placer.Plan]) -> None:
    figures = {goal: plan.figures for goal, plan in plans.items()}
    for goal, plan in plans.items():
        assert plan.goal == goal
        assert plan.verdict.fits
    assert figures["error"].costs.total == min(f.costs.total for f in figures.values())
    assert figures["time"].time_ns == min(f.time_ns for f in figures.values())
    assert figures["sites"].sites == min(f.sites for f in figures.values())
    assert figures["t-gates"].t_gates == min(f.t_gates for f in figures.values())


def test_six_wires_can_do_with_six_sites(plans: dict[str, placer.Plan]) -> None:
    # Every call has a recipe without workspace, and six wires need six sites.
    assert plans["sites"].figures.sites == 6


def test_the_fewest_t_gates_are_the_least_of_every_call(
    plans: dict[str, placer.Plan],
) -> None:
    problem = make_problem(
        find_device("slate-16"),
        read_program(SOURCE, "goals.qasm"),
        goal="t-gates",
    )
    instance = make_instance(problem, device_tables(problem.device))
    choice = in_the_spirit(instance, everything_allowed(instance))
    least = sum(sum(instance.profiles[i][row[0]].tees) for i, row in enumerate(choice))
    assert plans["t-gates"].figures.t_gates == least


def test_a_plan_is_no_worse_than_first_fit(plans: dict[str, placer.Plan]) -> None:
    problem = make_problem(find_device("slate-16"), read_program(SOURCE, "goals.qasm"))
    instance = make_instance(problem, device_tables(problem.device))
    recipes = tuple(
        next(
            c
            for c, profile in enumerate(instance.profiles[step.index])
            if profile.built.recipe == step.recipe
        )
        for step in plans["error"].steps
    )
    naive = first_fit(instance, recipes)
    assert naive is not None
    judged = Judge(instance, seed=0).route(naive)
    assert judged is not None
    assert plans["error"].figures.costs.total <= judged.figures.costs.total


def test_a_longest_run_time_is_a_limit_of_the_budget() -> None:
    words = ["plan", "tide-gate", "-d", "slate-16", "--effort", "quick", "-q"]
    done = CliRunner().invoke(main, [*words, "--longest", "0.5"])
    assert done.exit_code == 1
    assert "0.5 us allowed" in done.output
