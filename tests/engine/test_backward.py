"""The way back: it ends where the circuit should start, and starts are permutations."""

from __future__ import annotations

import numpy as np
import pytest

from placer.planner.anneal import move
from placer.planner.decode import Taste, decode
from placer.planner.judge import Judge
from placer.planner.placement import Instance, evaluate, make_instance
from placer.planner.policies import everything_allowed
from placer.problem import make_problem
from placer.program.read import read_program
from placer.tables import device_tables
from placer.trial.backward import followed
from placer.trial.router import RouteResult
from tests.placed_samples import plain_device

LINE = plain_device(6, [(k, k + 1) for k in range(5)])


def instance_of(gates: str) -> Instance:
    text = f'OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[6] q;\n{gates}'
    problem = make_problem(LINE, read_program(text, "back.qasm"))
    return make_instance(problem, device_tables(LINE))


def test_tokens_are_followed_through_swaps() -> None:
    # 0 and 1 change places, then what is on 1 (token 0) and 2 do.
    swaps = np.array([[0, 1], [1, 2]], dtype=np.int64)
    none = np.zeros(0, dtype=np.int64)
    route = RouteResult(none, swaps[:, 0], swaps[:, 1], none)
    assert followed(4, route).tolist() == [2, 0, 1, 3]


def test_a_program_that_starts_badly_starts_well_after_one_turn() -> None:
    # q0 and q5 meet at the ends of the line, again and again: four swaps bring them
    # together.  From where they end no swap is needed at all.
    instance = instance_of("cx q[0], q[5];\n" * 3)
    placement = decode(instance, range(6), Taste(everything_allowed(instance)))
    judge = Judge(instance, seed=0)
    first = judge.route(placement)
    assert first is not None
    assert first.figures.swaps == 4
    to = judge.turned(first, 0)
    assert to is not None
    assert sorted(to) == list(range(6))
    again = judge.route(move(instance, placement, to))
    assert again is not None
    assert again.figures.swaps == 0


@pytest.mark.parametrize("seed", range(4))
def test_turned_placements_are_valid(seed: int) -> None:
    draw = np.random.default_rng(seed)
    gates = "".join(
        "ccx q[{}], q[{}], q[{}];\n".format(*draw.permutation(6)[:3]) for _ in range(5)
    )
    instance = instance_of(gates)
    placement = decode(instance, range(6), Taste(everything_allowed(instance)))
    judge = Judge(instance, seed=seed)
    judged = judge.route(placement)
    assert judged is not None
    for number in range(3):
        to = judge.turned(judged, number)
        assert to is not None
        moved = move(instance, judged.placement, to)
        assert evaluate(instance, moved).cost > 0
        judged = judge.route(moved, number)
        assert judged is not None
