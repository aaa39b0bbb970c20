"""The exact simulation accepts the catalog and notices a single wrong gate."""

from __future__ import annotations

import dataclasses
import random

import pytest

from placer.check.simulate import TooWide, differences
from placer.recipes import catalog
from placer.recipes.circuit import Built

SIZES = [
    (kind, controls, inverse)
    for kind in ("mcx", "mcz", "mcp", "and")
    for controls in (2, 3, 4, 6, 9)
    for inverse in (False, True)
    if kind in ("and", "mcp") or not inverse
]


@pytest.mark.parametrize(("kind", "controls", "inverse"), SIZES)
def test_every_recipe_is_its_call(kind: str, controls: int, inverse: bool) -> None:
    followed = 0
    for name in catalog.recipe_names(kind, controls, inverse):
        built = catalog.build(name, kind, controls, 0.7, inverse)
        try:
            assert differences(built, 0.7, inverse=inverse, seed=1) == [], name
            followed += 1
        except TooWide:
            assert controls > 6, name
    assert followed > 0


def without(built: Built, index: int) -> Built:
    ops = built.fine.ops[:index] + built.fine.ops[index + 1 :]
    return dataclasses.replace(built, fine=dataclasses.replace(built.fine, ops=ops))


def turned(built: Built, index: int) -> Built:
    op = built.fine.ops[index]
    other = {"t": "tdg", "tdg": "t", "s": "sdg", "sdg": "s", "h": "x", "x": "h"}
    swapped = dataclasses.replace(op, name=other.get(op.name, "z"))
    ops = (*built.fine.ops[:index], swapped, *built.fine.ops[index + 1 :])
    return dataclasses.replace(built, fine=dataclasses.replace(built.fine, ops=ops))


@pytest.mark.parametrize(
    "name",
    ["clean-ladder", "borrowed-v-chain", "none-linear", "clean-one", "level2-tree"],
)
def test_one_wrong_gate_is_noticed(name: str) -> None:
    built = catalog.build(name, "mcx", 4)
    draw = random.Random(name)
    missed = []
    for index in draw.sample(range(len(built.fine.ops)), min(12, len(built.fine.ops))):
        for spoiled in (without(built, index), turned(built, index)):
            one = built.fine.ops[index]
            if (
                spoiled is not None
                and len(one.wires) > 1
                and spoiled.fine.ops != (without(built, index).fine.ops)
            ):
                continue  # a two-body gate has no namesake to be mistaken for
            if not differences(spoiled, 0.0, inverse=False, seed=3):
                missed.append((index, one.name))
    assert missed == []
