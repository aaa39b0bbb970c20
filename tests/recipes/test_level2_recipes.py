"""Level-2 circuits on trits: every input, marks of |2>, and nothing left behind."""

from __future__ import annotations

import numpy as np
import pytest
from recipe_cases import ANGLE, allowed, calls, expected
from recipe_simulators import all_bits, replay_trits, telling_bits

from placer.recipes.catalog import build, recipe_names
from placer.recipes.counts import count

SMALL = [case for case in calls(range(2, 11)) if case[0].startswith("level2")]


@pytest.mark.parametrize(("name", "kind", "controls", "inverse"), SMALL)
def test_every_input(name: str, kind: str, controls: int, inverse: bool) -> None:
    built = build(name, kind, controls, ANGLE, inverse)
    rows = allowed(built, all_bits(built.fine.width), inverse=inverse)
    reached, phases, seen = replay_trits(built.fine.ops, rows)
    after, wanted = expected(built, rows, ANGLE, inverse=inverse)
    assert (reached == after).all()
    assert np.allclose(phases, wanted, atol=1e-12)
    assert tuple(sorted(seen)) == built.level2_wires
    assert controls not in seen


@pytest.mark.parametrize("controls", range(11, 41))
def test_telling_inputs_of_large_calls(controls: int) -> None:
    for name in ("level2-chain", "level2-tree", "level2-mixed"):
        built = build(name, "mcx", controls)
        rows = telling_bits(built.fine.width, controls, controls, 1000)
        reached, _, seen = replay_trits(built.fine.ops, rows)
        after, _ = expected(built, rows, 0.0, inverse=False)
        assert (reached == after).all()
        assert seen <= set(built.level2_wires)


@pytest.mark.parametrize("controls", range(2, 64))
def test_no_slot_and_two_body_gates_only(controls: int) -> None:
    for name in recipe_names("mcx", controls):
        if name.startswith("level2"):
            built = build(name, "mcx", controls)
            assert built.slots == ()
            assert all(op.name == "level2" for op in built.fine.ops)
            assert all(len(set(op.wires)) == 2 for op in built.fine.ops)


def test_wrong_marks_are_seen() -> None:
    """A mark taken away must be noticed, or the replay proves nothing."""
    built = build("level2-tree", "mcx", 7)
    for spoiled, op in enumerate(built.fine.ops):
        if op.enters:
            bare = type(op)(op.name, op.wires, level=op.level, action=op.action)
            ops = list(built.fine.ops)
            ops[spoiled] = bare
            with pytest.raises(AssertionError):
                replay_trits(ops, all_bits(8))


def _shapes(nodes: int) -> list[object]:
    """Return every binary tree shape of a size as nested pairs, left and right."""
    if nodes == 0:
        return [None]
    return [
        (left, right)
        for split in range(nodes)
        for left in _shapes(split)
        for right in _shapes(nodes - 1 - split)
    ]


def _height_and_forks(shape: object) -> tuple[int, int]:
    """Return gates on the longest way up, and the number of two-child nodes."""
    assert isinstance(shape, tuple)
    left, right = shape
    if left is None and right is None:
        return 0, 0
    if left is None or right is None:
        height, forks = _height_and_forks(left or right)
        return height + 1, forks
    first, second = _height_and_forks(left), _height_and_forks(right)
    return max(first[0] + 4, second[0] + 3), first[1] + second[1] + 1


@pytest.mark.parametrize("controls", [8, 9, 10])
def test_mixed_tree_has_least_depth_of_all_trees(controls: int) -> None:
    """Brute force over all binary trees (1430 to 16796 shapes)."""
    best = min(_height_and_forks(shape) for shape in _shapes(controls))
    sizes = count(build("level2-mixed", "mcx", controls))
    assert sizes.level2_depth == 2 * best[0] + 1
    assert sizes.level2_gates == 2 * controls - 1 + 4 * best[1]
