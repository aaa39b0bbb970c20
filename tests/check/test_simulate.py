"""Recipes are simulated exactly: the catalog passes, a single wrong gate does not."""

from __future__ import annotations

import dataclasses
import random

import pytest

from placer.check.circuits import WIDE, recipe_fault
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
    names = catalog.recipe_names(kind, controls, inverse)
    for name in names:
        built = catalog.build(name, kind, controls, 0.7, inverse)
        assert recipe_fault(built, 0.7, inverse) == "", name


def test_what_branches_too_much_is_said() -> None:
    built = catalog.build("none-linear", "mcx", 40)
    assert recipe_fault(built, 0.0, False) == WIDE


def without(built: Built, index: int) -> Built:
    ops = built.fine.ops[:index] + built.fine.ops[index + 1 :]
    return dataclasses.replace(built, fine=dataclasses.replace(built.fine, ops=ops))


def turned(built: Built, index: int) -> Built:
    op = built.fine.ops[index]
    other = {"t": "tdg", "tdg": "t", "s": "sdg", "sdg": "s", "h": "x", "x": "h"}
    swapped = dataclasses.replace(op, name=other.get(op.name, "z"))
    ops = (*built.fine.ops[:index], swapped, *built.fine.ops[index + 1 :])
    return dataclasses.replace(built, fine=dataclasses.replace(built.fine, ops=ops))


@pytest.mark.parametrize("controls", [4, 7])
@pytest.mark.parametrize("kind", ["mcx", "mcz", "mcp", "and"])
def test_one_wrong_gate_is_noticed(kind: str, controls: int) -> None:
    missed = []
    for name in catalog.recipe_names(kind, controls):
        built = catalog.build(name, kind, controls, 0.7)
        draw = random.Random(f"{name} {kind} {controls}")
        for index in draw.sample(range(len(built.fine.ops)), 3):
            one = built.fine.ops[index]
            spoiled = [without(built, index)]
            if len(one.wires) == 1 and one.name != "measure":
                spoiled.append(turned(built, index))
            faults = [recipe_fault(wrong, 0.7, False) for wrong in spoiled]
            missed += [(name, one) for fault in faults if fault in ("", WIDE)]
    assert missed == []
