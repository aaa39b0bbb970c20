"""Least costs of cleanup, against published values and brute force."""

from __future__ import annotations

import random
from collections import Counter
from functools import cache

import pytest

from placer.planner.cleanup.curve import curve, fewest, least, solve
from placer.planner.cleanup.exact import search
from placer.planner.cleanup.game import Game, Target, Value, replay
from placer.planner.cleanup.greedy import at_end, at_once, descend
from placer.planner.cleanup.windows import improve
from placer.program.rewrite import Move
from tests.planner.cleanup.generated import FAMILIES, SEEDS, SHARES, large
from tests.planner.cleanup.reference import chain, graph, least_cost, tree

# Fewest moves F(n, s) for chains of n values within s wires, the last one kept.
# Knill 1995 (arXiv math/9508218) has the recurrence, Bennett 1989 (SIAM J. Comput.
# 18, 766) the game; rows n = 1..10 for s = 1..6, `None` where there is no way.
TABLE: dict[int, tuple[int | None, ...]] = {
    1: (1, 1, 1, 1, 1, 1),
    2: (None, 3, 3, 3, 3, 3),
    3: (None, None, 5, 5, 5, 5),
    4: (None, None, 9, 7, 7, 7),
    5: (None, None, None, 11, 9, 9),
    6: (None, None, None, 15, 13, 11),
    7: (None, None, None, 19, 17, 15),
    8: (None, None, None, 25, 21, 19),
    9: (None, None, None, None, 25, 23),
    10: (None, None, None, None, 29, 27),
    11: (None, None, None, None, 33, 31),
    12: (None, None, None, None, 39, 35),
    13: (None, None, None, None, 45, 39),
    14: (None, None, None, None, 53, 43),
    15: (None, None, None, None, 61, 47),
    16: (None, None, None, None, 71, 51),
    17: (None, None, None, None, None, 57),
    18: (None, None, None, None, None, 63),
    19: (None, None, None, None, None, 69),
    20: (None, None, None, None, None, 77),
}


@cache
def knill(length: int, wires: int) -> int | None:
    """Return F(n, s) by the recurrence."""
    if length == 0:
        return 0
    if wires < 1:
        return None
    if length == 1:
        return 1
    found = []
    for middle in range(1, length):
        parts = (
            knill(middle, wires),
            knill(middle, wires - 1),
            knill(length - middle, wires - 1),
        )
        if None not in parts:
            found.append(sum(part for part in parts if part is not None))
    return min(found, default=None)


@pytest.mark.parametrize("length", sorted(TABLE))
def test_chains_need_as_many_moves_as_published(length: int) -> None:
    for wires, wanted in enumerate(TABLE[length], start=1):
        assert knill(length, wires) == wanted
        answer = solve(chain(length), wires)
        assert answer.cost == wanted
        assert answer.proven
        if answer.moves is not None:
            assert replay(chain(length), answer.moves) == (wanted, answer.peak)
            assert answer.peak <= wires


@pytest.mark.parametrize("length", [8, 12, 20])
def test_with_room_for_all_a_chain_takes_2n_minus_1_moves(length: int) -> None:
    assert solve(chain(length), length).cost == 2 * length - 1


@pytest.mark.parametrize("length", range(1, 7))
def test_measured_chains_equal_brute_force(length: int) -> None:
    game = chain(length, measured=True)
    costs = []
    for wires in range(1, length + 1):
        answer = solve(game, wires)
        assert answer.proven
        assert answer.cost == least_cost(game, wires)
        costs.append(answer.cost)
    assert costs[-1] is not None


def test_measuring_reaches_where_uncomputing_cannot() -> None:
    # Three wires reach 2^(3-1) = 4 values of a chain (Knill 1995), not 6.
    plain, spooky = chain(6), chain(6, measured=True)
    assert solve(plain, 3).cost is None
    assert solve(plain, 3).proven
    assert solve(spooky, 3).cost is not None


def test_generated_graphs_equal_brute_force() -> None:
    draw = random.Random(20)
    seen: Counter[str] = Counter()
    for _ in range(150):
        game = graph(draw, 8, seen)
        low, high = fewest(game), sum(v.size for v in game.values)
        limit = draw.randint(max(1, low - 1), high)
        wanted = least_cost(game, limit)
        answer = solve(game, limit)
        assert answer.proven
        assert answer.cost == wanted
        seen["no way"] += wanted is None
        if answer.moves is not None and wanted is not None:
            assert replay(game, answer.moves)[0] == wanted
            assert answer.bound == wanted
            assert wanted >= least(game)
            seen["tight"] += wanted > (least_cost(game, high) or 0)
    for name in (
        "kept",
        "measured",
        "windowed",
        "several targets",
        "waiting costs",
        "no way",
        "tight",
    ):
        assert seen[name] >= 10, (name, seen)


def test_a_kept_value_asks_nothing_of_its_inputs_bug() -> None:
    # Compute 0, 1, 2 (8 + 3 + 5), use; 1 and 2 stay, so 0 goes for good (3) and makes
    # room for 3 (3), which is used and cleaned up from 2 alone (7): 29.
    values = (
        Value(1, (), 8, 3),
        Value(1, (0,), 3, 1),
        Value(1, (0, 1), 5, 7),
        Value(1, (2,), 3, 7),
    )
    game = Game(values, (Target((2,)), Target((3,))), frozenset([1, 2]))
    answer = solve(game, 3)
    assert (answer.cost, answer.proven) == (29, True)


@pytest.mark.parametrize("seed", range(4))
def test_trees_equal_brute_force(seed: int) -> None:
    game = tree(2, random.Random(seed))
    for limit in range(fewest(game), sum(v.size for v in game.values) + 1):
        assert solve(game, limit).cost == least_cost(game, limit)


@pytest.mark.slow
@pytest.mark.parametrize("seed", range(100))
def test_graphs_of_up_to_14_values_equal_brute_force(seed: int) -> None:
    draw = random.Random(f"large:{seed}")
    game = graph(draw, 14, Counter())
    high = sum(v.size for v in game.values)
    for limit in {fewest(game), (fewest(game) + high) // 2, high}:
        answer = solve(game, limit)
        assert answer.proven
        assert answer.cost == least_cost(game, limit)


def test_a_search_that_is_stopped_says_a_bound_below_the_optimum() -> None:
    game = tree(3, random.Random(5))
    limit = fewest(game) + 2
    wanted = solve(game, limit).cost
    stopped = search(game, limit, 200)
    assert not stopped.proven
    assert stopped.moves is None
    assert stopped.bound is not None
    assert wanted is not None
    assert least(game) <= stopped.bound <= wanted


def test_greedy_orders_and_windows_keep_the_rules_and_reach_the_optimum_often() -> None:
    draw = random.Random(7)
    met = total = 0
    for _ in range(60):
        game = graph(draw, 7, Counter())
        limit = draw.randint(fewest(game), sum(v.size for v in game.values))
        wanted = least_cost(game, limit)
        found = descend(game, limit, 4)
        if found.cost is None or wanted is None:
            continue
        better = improve(game, found, length=12, values=7, most=4000, passes=4)
        assert better.moves is not None
        assert better.cost == replay(game, better.moves)[0]
        assert wanted <= better.cost <= found.cost
        total += 1
        met += better.cost == wanted
    assert total >= 30
    assert met >= 0.9 * total


def test_the_curve_falls_and_every_point_is_an_order() -> None:
    game = graph(random.Random(3), 8, Counter())
    points = curve(game)
    costs = [p.cost for p in points if p.cost is not None]
    assert costs == sorted(costs, reverse=True)
    assert [p.limit for p in points] == sorted({p.limit for p in points})
    for point in points:
        if point.moves is not None:
            assert replay(game, point.moves)[1] <= point.limit


def test_the_extremes_do_what_they_say() -> None:
    # Two values, the second from the first, each used twice in turn.
    game = Game((Value(), Value(1, (0,))), (Target((1,)), Target((0,)), Target((1,))))
    once, end = at_once(game), at_end(game)
    assert once.moves is not None
    assert end.moves is not None
    assert [m.number for m in end.moves if m.action == "compute"] == [0, 1]
    assert end.moves[-2:] == (Move("uncompute", 1), Move("uncompute", 0))
    # At once: computed for each use: 0 1, 0, 0 1.
    assert [m.number for m in once.moves if m.action == "compute"] == [0, 1, 0, 0, 1]
    assert (once.cost, end.cost) == (10, 4)
    assert (once.peak, end.peak) == (2, 2)


def test_the_end_keeps_a_window() -> None:
    # The first value's inputs change with target 0: it must be gone by then.
    game = Game((Value(window=(0, 0)), Value()), (Target((1,)), Target((1,))))
    game = Game(game.values, (Target((0,)), *game.targets))
    assert at_end(game).moves is None
    game = Game((Value(window=(0, 1)), Value()), game.targets)
    moves = at_end(game).moves
    assert moves is not None
    assert moves.index(Move("uncompute", 0)) < moves.index(Move("use", 1))


@pytest.mark.slow
def test_sixty_values_have_small_gaps_on_most_of_the_set() -> None:
    close = total = 0
    for family in FAMILIES:
        for seed in SEEDS:
            game = large(family, seed)
            peak = at_end(game).peak
            for share in SHARES:
                answer = solve(game, max(fewest(game), int(peak * share)))
                assert answer.moves is not None
                assert answer.cost == replay(game, answer.moves)[0]
                assert answer.bound is not None
                assert least(game) <= answer.bound <= answer.cost
                total += 1
                close += answer.cost - answer.bound <= answer.cost // 10
    assert total == 24
    # At the time of writing there were 18.
    assert close >= 15
