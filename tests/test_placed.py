"""The placed circuit against hand-made expectations."""

from __future__ import annotations

import random
import time

import pytest
from placed_samples import (
    grid,
    make_built,
    make_problem,
    make_register,
    plain_device,
)

from placer.errors import InternalError
from placer.placed import (
    BARRIER,
    LEVEL2,
    MEASURE,
    ONE,
    RESET,
    TEE,
    TWO,
    place,
)
from placer.recipes.circuit import Op

DEVICE = plain_device(9, grid(3, 3))

SOME = make_built(
    [
        Op("h", (0,)),
        Op("t", (1,)),
        Op("cx", (0, 1)),
        Op("measure", (1,), bit=0),
        Op("z", (0,), condition=0),
    ],
    1,
    slots=("clean",),
)
JUMP = make_built(
    [
        Op("level2", (0, 1), enters=(0,)),
        Op("level2", (0, 1), leaves=(0,)),
        Op("barrier", (0, 1)),
        Op("reset", (1,)),
    ],
    2,
    level2_wires=(0,),
)


def sample():
    """Two wires that start unknown, a zero one, a workspace one; steps out of order."""
    problem = make_problem(
        DEVICE,
        [
            make_register("q", 2, 0),
            make_register("z", 1, 2, start="zero"),
            make_register("s", 1, 3, start="zero", workspace=True),
        ],
        [((0,), SOME), ((0, 3), JUMP), ((2,), SOME)],
    )
    recipes = [c[0] for c in problem.choices]
    return place(
        problem, [4, 8, 0, 2], recipes, [(5,), (), (5,)], [2, 0, 1], [(None,), (), (1,)]
    )


def test_operations_come_in_placed_order() -> None:
    placed = sample()
    some = [ONE, TEE, TWO, MEASURE, ONE]
    assert placed.flow.code.tolist() == [*some, *some, LEVEL2, LEVEL2, BARRIER, RESET]
    assert placed.step.tolist() == [2] * 5 + [0] * 5 + [1] * 4
    assert placed.gates.tolist() == [2, 7, 10, 11]
    assert placed.flow.gate.tolist() == [
        *(-1, -1, 0, -1, -1),
        *(-1, -1, 1, -1, -1),
        *(2, 3, -1, -1),
    ]


def test_local_wires_become_sites_and_holders() -> None:
    placed = sample()
    assert placed.flow.token.tolist() == [
        *(0, 5, 0, 5, 5, 0),
        *(4, 5, 4, 5, 5, 4),
        *(4, 2, 4, 2, 4, 2, 2),
    ]
    # The slot of step 2 acts for its lender, wire 1; that of step 0 is holder 4.
    assert placed.leases == ((0, 0),)
    assert placed.holder.tolist() == [
        *(2, 1, 2, 1, 1, 2),
        *(0, 4, 0, 4, 4, 0),
        *(0, 3, 0, 3, 0, 3, 3),
    ]
    assert placed.home.tolist() == [4, 8, 0, 2, 5]
    assert placed.is_value.tolist() == [False, False, False, True, True]


def test_conditions_point_to_their_measurement() -> None:
    flow = sample().flow
    assert flow.cause.tolist() == [-1] * 4 + [3] + [-1] * 4 + [8] + [-1] * 4
    assert flow.heard.tolist() == [4, 9]
    # Each waits for the last operation on each of its tokens, and for its bit.
    assert flow.waits.tolist() == [0, 0, 2, 1, 2, 0, 1, 2, 1, 2, 1, 2, 2, 1]


def test_level_2_is_marked_per_wire() -> None:
    flow = sample().flow
    entry = int(flow.first[10])
    assert flow.enters[entry : entry + 4].tolist() == [True, False, False, False]
    assert flow.leaves[entry : entry + 4].tolist() == [False, False, True, False]
    assert flow.needs[entry : entry + 4].tolist() == [True, False, True, False]


def test_who_is_charged_and_who_is_prepared() -> None:
    placed = sample()
    assert sorted(placed.fresh.tolist()) == [0, 2, 5, 5]
    assert sorted(placed.held.tolist()) == [4, 8]
    assert [p for p in range(9) if placed.alive_before[p]] == [4, 8]
    alive = placed.alive_after
    last = int(placed.flow.first[13])
    assert not alive[last]  # a workspace wire after its reset
    assert alive[int(placed.flow.first[4])]  # the zero wire after its last gate
    # The lease ends with its measurement; the wire on site 4 goes on to step 1.
    assert not alive[int(placed.flow.first[8])]
    assert alive[int(placed.flow.first[9])]


def test_reset_wires_rest_and_reset_slots_do_not() -> None:
    ops = [
        Op("h", (1,)),
        Op("reset", (1,)),
        Op("h", (1,)),
        Op("reset", (0,)),
        Op("h", (0,)),
    ]
    built = make_built(ops, 1, slots=("clean",))
    problem = make_problem(DEVICE, [make_register("q", 1, 0)], [((0,), built)])
    placed = place(problem, [0], [built], [(1,)], [0], [(None,)])
    assert placed.alive_after.tolist() == [True, True, False, False, True]
    assert placed.valued_after.tolist() == [True, False, False, False, False]


@pytest.mark.parametrize("none", [None, -1])
def test_no_lender_may_be_written_in_two_ways(none: int | None) -> None:
    problem = make_problem(DEVICE, [make_register("q", 1, 0)], [((0,), SOME)])
    placed = place(problem, [0], [SOME], [(1,)], [0], [(none,)])
    assert placed.leases == ((0, 0),)


def test_nonsense_is_refused() -> None:
    problem = make_problem(DEVICE, [make_register("q", 2, 0)], [((0, 1), JUMP)])
    with pytest.raises(InternalError, match="on one site"):
        place(problem, [3, 3], [JUMP], [()], [0], [()])
    with pytest.raises(InternalError, match="does not have"):
        place(problem, [3, 9], [JUMP], [()], [0], [()])
    early = make_built([Op("z", (0,), condition=0), Op("measure", (0,), bit=0)], 2)
    with pytest.raises(InternalError, match="before its measurement"):
        place(problem, [3, 4], [early], [()], [0], [()])
    coarse = make_built([Op("ccx", (0, 1))], 2)
    with pytest.raises(InternalError, match="no fine operation"):
        place(problem, [3, 4], [coarse], [()], [0], [()])


def test_an_empty_circuit() -> None:
    problem = make_problem(DEVICE, [make_register("q", 2, 0)], [])
    placed = place(problem, [3, 4], [], [], [], [])
    assert placed.operations == 0
    assert placed.held.tolist() == [3, 4]


@pytest.mark.bench
def test_a_long_circuit_is_placed_quickly() -> None:
    rng = random.Random(1)
    cx = make_built([Op("h", (0,)), Op("cx", (0, 1))] * 50, 2)
    steps = [(tuple(rng.sample(range(9), 2)), cx) for _ in range(1000)]
    problem = make_problem(DEVICE, [make_register("q", 9, 0)], steps)
    begin = time.perf_counter()
    placed = place(
        problem, range(9), [cx] * 1000, [()] * 1000, range(1000), [()] * 1000
    )
    assert placed.operations == 100_000
    assert time.perf_counter() - begin < 0.5
