"""Recipes are simulated exactly: the catalog passes, a single wrong gate does not."""

from __future__ import annotations

import dataclasses
import random
from collections.abc import Iterator

import pytest

from placer.check.circuits import WIDE, recipe_fault
from placer.recipes import catalog
from placer.recipes.circuit import Built, Op

SIZES = [
    (kind, controls, inverse)
    for kind in ("mcx", "mcz", "mcp", "and")
    for controls in (2, 3, 4, 6, 9)
    for inverse in (False, True)
    if kind in ("and", "mcp") or not inverse
]


@pytest.mark.parametrize(("kind", "controls", "inverse"), SIZES)
def test_every_recipe_is_its_call(kind: str, controls: int, inverse: bool) -> None:
    names = catalog.recipe_names(kind, controls, inverse)
    for name in names:
        built = catalog.build(name, kind, controls, 0.7, inverse)
        assert recipe_fault(built, 0.7, inverse) == "", name


def test_what_branches_too_much_is_said() -> None:
    built = catalog.build("none-linear", "mcx", 40)
    assert recipe_fault(built, 0.0, False) == WIDE


def with_ops(built: Built, level: str, ops: tuple[Op, ...]) -> Built:
    made = dataclasses.replace(getattr(built, level), ops=ops)
    return dataclasses.replace(built, **{level: made})


def spoiled(built: Built) -> Iterator[tuple[tuple[str, int], Built]]:
    """Drop every gate of both circuits once, and turn every gate that has a mirror."""
    mirrors = {"t": "tdg", "tdg": "t", "s": "sdg", "sdg": "s", "h": "x", "x": "h"}
    for level in ("fine", "coarse"):
        ops = getattr(built, level).ops
        for at, op in enumerate(ops):
            before, after = ops[:at], ops[at + 1 :]
            yield (level, at), with_ops(built, level, before + after)
            if op.name in mirrors:
                turned = dataclasses.replace(op, name=mirrors[op.name])
                yield (level, at), with_ops(built, level, (*before, turned, *after))


# Gates that do nothing, since the target of an `and` starts (or ends) in |0>: a cx onto
# |+>.  Dense matrices of the circuits with and without them agree on that subspace.
IDLE = {
    ("none-quadratic", False): ("fine", 2),
    ("none-linear", False): ("fine", 80),
    ("none-gray", True): ("fine", 32),
    ("none-quadratic", True): ("fine", 85),
    ("none-linear", True): ("fine", 80),
}


@pytest.mark.parametrize(
    ("kind", "controls", "inverse"),
    [
        ("mcx", 2, False),
        ("mcx", 3, False),
        ("mcz", 3, False),
        ("mcp", 3, False),
        ("mcp", 3, True),
        ("and", 2, False),
        ("and", 2, True),
        ("and", 4, False),
        ("and", 4, True),
        pytest.param("mcx", 5, False, marks=pytest.mark.slow),
        pytest.param("mcp", 5, True, marks=pytest.mark.slow),
    ],
)
def test_every_single_wrong_gate_is_noticed(
    kind: str, controls: int, inverse: bool
) -> None:
    for name in catalog.recipe_names(kind, controls, inverse):
        built = catalog.build(name, kind, controls, 0.7, inverse)
        missed = [
            where
            for where, wrong in spoiled(built)
            if recipe_fault.__wrapped__(wrong, 0.7, inverse) in ("", WIDE)
        ]
        idle = IDLE.get((name, inverse)) if (kind, controls) == ("and", 4) else None
        assert missed == ([] if idle is None else [idle]), name


@pytest.mark.parametrize("controls", [4, 7])
@pytest.mark.parametrize("kind", ["mcx", "mcz", "mcp"])
def test_a_wrong_gate_of_a_large_recipe_is_noticed(kind: str, controls: int) -> None:
    for name in catalog.recipe_names(kind, controls):
        built = catalog.build(name, kind, controls, 0.7)
        draw = random.Random(f"{name} {kind} {controls}")
        wrong = draw.sample(list(spoiled(built)), 4)
        faults = [recipe_fault(one, 0.7, False) for _, one in wrong]
        assert "" not in faults, name
        assert WIDE not in faults, name
