"""Rows on whole plans: routes, scale, against first-fit and against single policies."""

from __future__ import annotations

import functools
import math
import resource
import time

import placer
from placer.api import find_program
from placer.device.read import find_device
from placer.halt import Halt
from placer.plan import to_json
from placer.planner.decode import Taste, decode
from placer.planner.judge import HELD_OUT, Judge, Judged
from placer.planner.loop import Outcome, run
from placer.planner.placement import (
    Instance,
    Misfit,
    Placement,
    evaluate,
    make_instance,
    schedule,
)
from placer.planner.policies import everything_allowed
from placer.problem import Problem, make_problem
from placer.report.sorts import demo_programs
from placer.tables import device_tables
from placer.trial.router import route
from tests.bench.cases import calls, device
from tests.bench.table import Result

MEMORY_GIB = 2.0


def trial_route() -> Result:
    """Return how long a route of 100,000 two-qubit gates takes on 433 sites."""
    program = calls(200, 2000, 0, sizes=(3, 4, 5, 6), reach=6)
    problem = make_problem(find_device("basalt-433"), program)
    instance = make_instance(problem, device_tables(problem.device))
    placement = decode(
        instance, list(instance.usable[:200]), Taste(everything_allowed(instance))
    )
    judge = Judge(instance, seed=0)
    placed = judge.placed(placement)
    setting, seed = HELD_OUT[0]
    small = make_instance(
        make_problem(problem.device, calls(20, 4, 0)), instance.tables
    )
    few = decode(small, list(small.usable[:20]), Taste(everything_allowed(small)))
    Judge(small, seed=0).route(few)  # compile first
    begin = time.perf_counter()
    found = route(placed, instance.tables, setting=setting, seed=seed)
    seconds = time.perf_counter() - begin
    gates = len(placed.gates)
    assert found is not None
    scaled = seconds * 100_000 / gates
    return Result(
        "trial route",
        "100,000 two-qubit gates on 433 sites in 5 s",
        f"{gates} gates and {found.count} swaps in {seconds:.2f} s: "
        f"{scaled:.2f} s for 100,000",
        scaled <= 5.0,
        1,
    )


def scale() -> Result:
    """Return time and memory on 433 sites with 200 wires, and how they grow."""
    chosen = find_device("basalt-433")
    times, points = {}, []
    for count in (250, 500, 1000, 2000):
        program = calls(200, count, 0, sizes=(3, 4, 4, 5, 6), reach=6)
        begin = time.perf_counter()
        plan = placer.plan(program, chosen, effort="normal")
        times[count] = time.perf_counter() - begin
        points.append(("433 sites, 200 wires", float(count), times[count]))
        assert placer.check(to_json(plan)).ok
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024**2
    ratio = times[2000] / times[1000]
    return Result(
        "scale",
        "1000 calls in 120 s and 2 GiB; twice the calls at most 2.3 times the time",
        f"1000 calls in {times[1000]:.0f} s, 2000 in {times[2000]:.0f} s "
        f"(factor {ratio:.2f}), {peak:.2f} GiB at most in the whole run",
        times[1000] <= 120 and ratio <= 2.3 and peak <= MEMORY_GIB,
        4,
        points=points,
    )


def first_fit(instance: Instance, recipes: tuple[int, ...]) -> Placement | None:
    """Return the naive placement: wires in order, slots on the lowest free site.

    A clean slot takes the lowest site that no wire ever uses; a borrowed one the
    lowest that its call does not use.
    """
    sites = instance.usable[: len(instance.wires)]
    held = set(sites)
    slots = []
    for step in range(instance.steps):
        taken = {sites[w] for w in instance.operands[step]}
        row = []
        for kind in instance.profiles[step][recipes[step]].built.slots:
            free = [p for p in instance.usable if p not in taken and p not in held]
            lent = [p for p in instance.usable if p not in taken]
            offers = free if kind == "clean" else free or lent
            if not offers:
                return None
            row.append(offers[0])
            taken.add(offers[0])
        slots.append(tuple(row))
    order = range(instance.steps)
    try:
        starts = schedule(instance, order, sites, recipes, slots)
        placement = Placement(tuple(sites), recipes, tuple(slots), starts)
        evaluate(instance, placement)
    except (Misfit, KeyError):
        return None
    return placement


def whole_cases() -> list[tuple[str, Problem]]:
    """Return the problems of the rows against first-fit and against policies."""
    rows = []
    for number, (lattice, wires, count) in enumerate(
        [
            ("{kind: grid, rows: 4, columns: 4}", 8, 10),
            ("{kind: grid, rows: 5, columns: 5}", 14, 14),
            ("{kind: grid, rows: 7, columns: 7}", 24, 16),
            ("{kind: heavy-hex, rows: 3, row_length: 7}", 10, 8),
            ("{kind: heavy-hex, rows: 5, row_length: 11}", 30, 20),
            ("{kind: hexagonal, rows: 6, columns: 8}", 24, 16),
        ]
    ):
        program = calls(
            wires, count, 40 + number, sizes=(3, 4, 5, 6), reach=3, scrambled=True
        )
        chosen = device(lattice, uneven=8, seed=number)
        rows.append((f"generated {number}", make_problem(chosen, program)))
    return rows


@functools.cache
def planned(number: int) -> Outcome:
    """Return the outcome of a case; both rows look at the same plans."""
    return run(whole_cases()[number][1], effort="normal", seed=0)


def against_first_fit() -> Result:
    """Return held-out swaps of plans over those of first-fit."""
    logs, points = [], []
    for number, (name, _) in enumerate(whole_cases()):
        outcome = planned(number)
        instance, best = outcome.instance, outcome.judged
        naive = first_fit(instance, best.placement.recipes)
        if naive is None:
            continue
        judge = Judge(instance, seed=0)
        routed = judge.route(naive)
        assert routed is not None
        other = judge.with_expected_swaps(routed, Halt()).route.expected_swaps
        own = best.route.expected_swaps
        assert best.figures.costs.total <= routed.figures.costs.total, name
        logs.append(math.log(max(own, 0.5) / max(other, 0.5)))
        points.append(("ratio", float(len(logs)), math.exp(logs[-1])))
    mean = math.exp(sum(logs) / len(logs))
    return Result(
        "against a first-fit assignment",
        "held-out expected swaps at most half (geometric mean)",
        f"{mean:.2f} of first-fit's swaps",
        mean <= 0.5,
        len(logs),
        points=points,
    )


DEMOS = {
    "tide-gate": "slate-16",
    "full-berths": "tuff-10",
    "deep-channel": "quartzite-20",
    "quay-limit": "quartzite-20",
}


def against_policies() -> Result:
    """Return the expected error of plans over that of the best single policy."""
    logs, points, worse = [], [], 0
    outcomes = [planned(number) for number in range(len(whole_cases()))]
    demos = demo_programs()
    for name, where in DEMOS.items():
        if name in demos:
            program = find_program(name)
            problem = make_problem(find_device(where), program)
            outcomes.append(run(problem, effort="normal", seed=0))
    for outcome in outcomes:
        rows = [p.judged for p in outcome.policies if p.judged is not None]
        if not rows:
            continue
        own = outcome.judged.figures.costs.total
        other = min(_error(j) for j in rows)
        worse += own > other
        logs.append(math.log(own / other))
        points.append(("ratio", float(len(logs)), math.exp(logs[-1])))
    mean = math.exp(sum(logs) / len(logs))
    return Result(
        "against the best single policy",
        "never worse, at least 20 % less (geometric mean)",
        f"{1 - mean:.0%} less on average, worse in {worse}",
        mean <= 0.8 and worse == 0,
        len(logs),
        points=points,
    )


def _error(judged: Judged) -> int:
    return judged.figures.costs.total
