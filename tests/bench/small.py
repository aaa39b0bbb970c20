"""Rows on small problems: proofs, plans against optima, gaps."""

from __future__ import annotations

import statistics
import time

from placer.planner.joint import Answer, everything, solve
from placer.planner.loop import run
from placer.planner.placement import make_instance
from placer.planner.policies import everything_allowed
from placer.planner.search import Amount, search
from placer.problem import Problem, make_problem
from placer.tables import device_tables
from tests.bench.cases import calls, device, joint_case
from tests.bench.table import Result

SMALL = ["{kind: line, sites: 6}", "{kind: line, sites: 8}"]
SMALL += ["{kind: grid, rows: 3, columns: 3}"]
LARGE = ["{kind: line, sites: 9}", "{kind: grid, rows: 3, columns: 4}"]
LARGE += ["{kind: grid, rows: 4, columns: 4}", "{kind: grid, rows: 5, columns: 5}"]


def proof(problem: Problem, work: float) -> tuple[Answer, float]:
    """Return what the joint model proves, and its seconds; the search is the hint."""
    instance = make_instance(problem, device_tables(problem.device))
    begin = time.perf_counter()
    found = search(
        instance,
        everything_allowed(instance),
        amount=Amount(4, 60_000, (1.0, 0.4)),
        seed=0,
    )
    answer = solve(
        instance, everything(instance), work=work, seed=0, hint=found[0].placement
    )
    return answer, time.perf_counter() - begin


def proven(
    name: str,
    shapes: list[str],
    sizes: tuple[int, int],
    count: int,
    share: float,
    limit: float,
) -> Result:
    """Return how many joint optima are proven within a limit."""
    proof(joint_case(SMALL, (4, 4), 0, "estimate"), 1.0)  # compile first
    times = []
    for seed in range(count):
        answer, seconds = proof(joint_case(shapes, sizes, seed, "estimate"), 20.0)
        times.append(seconds if answer.status == "best" else float("inf"))
    done = [t for t in times if t <= limit]
    target = f"{share:.0%} in {limit:g} s"
    measured = f"{len(done)} of {count} in {limit:g} s"
    if done:
        measured += f", slowest of them {max(done):.1f} s"
    points = [(name, float(k + 1), t) for k, t in enumerate(sorted(done))]
    return Result(
        f"joint optimum proven, {name}",
        target,
        measured,
        len(done) >= share * count,
        count,
        points=points,
    )


def proven_small() -> Result:
    return proven("W<=5 C<=5 P<=9", SMALL, (4, 5), 24, 1.0, 10.0)


def proven_large() -> Result:
    return proven("W<=8 C<=8 P<=25", LARGE, (6, 8), 60, 0.95, 60.0)


def against_optimum() -> Result:
    """Return the gaps between plans and proven optima."""
    gaps, slow = [], 0
    for seed in range(20):
        problem = joint_case(LARGE, (5, 7), 500 + seed, "estimate")
        answer, _ = proof(problem, 20.0)
        if answer.status != "best" or answer.cost is None:
            continue
        begin = time.perf_counter()
        outcome = run(problem, effort="normal", seed=0)
        slow += time.perf_counter() - begin > 30.0
        gaps.append((outcome.judged.estimate - answer.cost) / answer.cost)
    median, worst = statistics.median(gaps), max(gaps)
    return Result(
        "plan against proven optimum",
        "median gap 0, worst 5 %, 30 s each",
        f"median {median:.1%}, worst {worst:.1%}, {slow} took more than 30 s",
        median == 0 and worst <= 0.05 and slow == 0,
        len(gaps),
        points=[("gap", float(k), g) for k, g in enumerate(sorted(gaps))],
    )


SIXTEEN = [
    ("{kind: grid, rows: 3, columns: 4}", 6),
    ("{kind: grid, rows: 4, columns: 4}", 8),
    ("{kind: grid, rows: 5, columns: 5}", 10),
    ("{kind: grid, rows: 4, columns: 5}", 8),
]


def sixteen_calls() -> Result:
    """Return the gaps between plan and bound with sixteen calls."""
    gaps, points = [], []
    slow = 0
    for seed in range(8):
        lattice, wires = SIXTEEN[seed % len(SIXTEEN)]
        problem = make_problem(
            device(lattice), calls(wires, 16, 700 + seed), goal="estimate"
        )
        answer, seconds = proof(problem, 20.0)
        slow += seconds > 60.0
        if answer.cost is None or answer.bound is None:
            gaps.append(1.0)
            continue
        gaps.append((answer.cost - answer.bound) / answer.cost)
        points.append((lattice, float(wires), gaps[-1]))
    good = sum(1 for g in gaps if g <= 0.10)
    text = ", ".join(f"{g:.0%}" for g in sorted(gaps))
    return Result(
        "C=16, P 12-25: gap between plan and bound",
        "30 % on all, 10 % on half, 60 s each",
        f"gaps {text}; {slow} took more than 60 s",
        max(gaps) <= 0.30 and 2 * good >= len(gaps) and slow == 0,
        len(gaps),
        points=points,
    )


def recipe_and_schedule() -> Result:
    """Return the gaps where distance plays no part: every two sites are linked."""
    parts, points = [], []
    is_reached = True
    for count, limit, most in ((50, 5.0, 0.0), (200, 60.0, 0.01), (1000, 60.0, 0.10)):
        wires = 12 if count == 50 else 24
        lattice = f"{{kind: all-to-all, sites: {wires + 12}}}"
        program = calls(wires, count, 900 + count, sizes=(3, 4, 5, 6))
        problem = make_problem(device(lattice), program, goal="estimate")
        begin = time.perf_counter()
        outcome = run(problem, effort="quick" if count == 50 else "normal", seed=0)
        seconds = time.perf_counter() - begin
        gap = (outcome.judged.estimate - outcome.least) / outcome.judged.estimate
        parts.append(f"{count} calls: gap {gap:.1%} in {seconds:.0f} s")
        points.append(("gap", float(count), gap))
        is_reached = is_reached and gap <= most and seconds <= limit
    return Result(
        "recipe and schedule",
        "50 calls proven in 5 s, 200 calls 1 % in 60 s, 1000 calls 10 % in 60 s",
        "; ".join(parts),
        is_reached,
        3,
        points=points,
    )
