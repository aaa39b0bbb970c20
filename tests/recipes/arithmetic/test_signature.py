"""Signatures: wires, meaning, refusals; names and slots of every recipe."""

from __future__ import annotations

import doctest
import itertools

import pytest
from arithmetic_cases import cases, signatures, split

from placer.program import signature
from placer.program.signature import (
    ARITHMETIC_KINDS,
    Signature,
    apply,
    layout,
    problems,
    promised,
)
from placer.recipes import arithmetic, catalog
from placer.recipes.arithmetic import build, describe, recipe_names
from placer.recipes.circuit import Built
from placer.recipes.ways import WAYS


def test_examples_of_the_docstrings() -> None:
    for module in (signature, arithmetic):
        assert doctest.testmod(module).failed == 0


def test_layout() -> None:
    """Controls, registers, result, first slot: counted by hand."""
    place = layout(Signature("add", (3, 3), controls=2, carry=True))
    assert place.controls == (0, 1)
    assert place.registers == ((2, 3, 4), (5, 6, 7))
    assert (place.result, place.first_slot) == (8, 9)
    assert place.target == (5, 6, 7, 8)


# ------------------------------------------------------------------ meaning
MEANINGS = [
    # worked out by hand
    (Signature("add", (3, 3)), (5, 6), (5, 3)),
    (Signature("add", (3, 3), carry=True), (5, 6, 1), (5, 3, 0)),
    (Signature("add", (3, 3), controls=1), (0, 5, 6), (0, 5, 6)),
    (Signature("subtract", (3, 3)), (5, 3), (5, 6)),
    (Signature("subtract", (3, 3), carry=True), (5, 3, 0), (5, 6, 1)),
    (Signature("subtract", (3, 3), carry=True), (3, 5, 0), (3, 2, 0)),
    (Signature("add", (3, 3), inverse=True), (5, 3), (5, 6)),
    (Signature("sum", (2, 2, 2), carry=True), (3, 2, 0, 0), (3, 2, 1, 1)),
    (Signature("sum", (2, 2, 2), inverse=True), (3, 2, 1), (3, 2, 0)),
    (Signature("add_constant", (3,), constant=5), (6,), (3,)),
    (Signature("add_constant", (3,), constant=5, carry=True), (6, 0), (3, 1)),
    (
        Signature("add_constant", (3,), constant=5, carry=True, inverse=True),
        (3, 0),
        (6, 1),
    ),
    (Signature("less_than", (2, 2)), (1, 2, 0), (1, 2, 1)),
    (Signature("less_than", (2, 2)), (2, 2, 1), (2, 2, 1)),
    (Signature("less_than", (2,), constant=4), (3, 1), (3, 0)),
    (Signature("equal", (2, 2)), (2, 2, 0), (2, 2, 1)),
    (Signature("equal", (2,), 1, 2), (1, 2, 0), (1, 2, 1)),
    (Signature("increment", (2,), carry=True), (3, 0), (0, 1)),
    (Signature("decrement", (2,), carry=True), (0, 0), (3, 1)),
    (Signature("lookup", (2, 3), table=(1, 5, 7)), (1, 4), (1, 1)),
    (Signature("multiply_add", (2, 2, 3)), (3, 3, 1), (3, 3, 2)),
    (Signature("multiply_add", (2, 2, 3), inverse=True), (3, 3, 2), (3, 3, 1)),
]


@pytest.mark.parametrize(("asked", "before", "after"), MEANINGS)
def test_meaning(
    asked: Signature, before: tuple[int, ...], after: tuple[int, ...]
) -> None:
    assert promised(asked, before)
    assert apply(asked, before) == after


def test_every_kind_has_a_hand_made_row() -> None:
    assert {row[0].kind for row in MEANINGS} == set(ARITHMETIC_KINDS)


@pytest.mark.parametrize("controls", [0, 1])
def test_inverse_takes_the_call_back(controls: int) -> None:
    """On every input that keeps the promise, the inverse returns to it."""
    for asked in signatures(2, controls):
        back = Signature(
            asked.kind,
            asked.widths,
            controls,
            asked.constant,
            asked.table,
            asked.carry,
            not asked.inverse,
        )
        for label in range(1 << asked.operands):
            values = split(asked, label)
            if promised(asked, values):
                after = apply(asked, values)
                assert promised(back, after)
                assert apply(back, after) == values


# ------------------------------------------------------------------ refusals
REFUSED = [
    (Signature("divide", (3, 3)), "there is no arithmetic kind 'divide'"),
    (Signature("add", (3, 2)), "two registers of one width, not (3, 2)"),
    (Signature("sum", (3, 3)), "three registers of one width"),
    (Signature("add", (0, 0)), "must not be negative or empty"),
    (Signature("add", (3, 3), controls=-1), "must not be negative or empty"),
    (Signature("increment", (3, 3)), "increment needs one register"),
    (Signature("add", (3, 3), constant=2), "add takes no constant"),
    (Signature("add_constant", (3,)), "add_constant needs a constant"),
    (Signature("add_constant", (3,), constant=8), "constant 8 is not in 0..7"),
    (Signature("less_than", (3,), constant=9), "constant 9 is not in 0..8"),
    (Signature("equal", (3,), constant=-1), "constant -1 is not in 0..7"),
    (Signature("equal", (3, 3), carry=True), "equal has no carry"),
    (Signature("add", (3, 3), table=(1,)), "add takes no table"),
    (Signature("lookup", (1, 2), table=(1, 2, 3)), "table of 3 entries does not fit"),
    (Signature("lookup", (1, 2)), "table of 0 entries does not fit"),
    (Signature("lookup", (1, 2), table=(1, 4)), "numbers that do not fit 2 wires"),
    (Signature("lookup", (1,), table=(1,)), "lookup needs 2 registers"),
    (Signature("multiply_add", (1, 1)), "multiply_add needs 3 registers"),
]


@pytest.mark.parametrize(("asked", "words"), REFUSED)
def test_refused(asked: Signature, words: str) -> None:
    assert words in "; ".join(problems(asked))
    with pytest.raises(ValueError, match=r"kind|needs|must|takes|is not|has no|fit"):
        recipe_names(asked)
    with pytest.raises(ValueError, match=r"kind|needs|must|takes|is not|has no|fit"):
        build("add-ripple-one", asked)


def test_recipes_that_do_not_exist() -> None:
    asked = Signature("add", (3, 3))
    for name in ("add-nothing", "equal-nothing", "equal-and-mirror"):
        with pytest.raises(ValueError, match="there is no recipe"):
            describe(name)
    for name in ("increment-clean", "add-ripple-one-short", "equal-toffoli"):
        with pytest.raises(ValueError, match="does not build"):
            build(name, asked)


# ------------------------------------------------------------------ every recipe
@pytest.mark.parametrize("controls", [0, 1, 2])
def test_form_of_every_recipe(controls: int) -> None:
    """Both levels stay within their language, their wires and their bits."""
    wanted = [*signatures(3, controls)]
    for name, asked in cases(wanted):
        built, recipe = build(name, asked), describe(name)
        assert built.recipe == recipe.name == name
        assert asked.kind in recipe.kinds
        assert built.controls == asked.controls
        assert built.coarse.operands == built.fine.operands == asked.operands
        assert built.coarse.slots == built.fine.slots
        assert built.coarse.bits == built.fine.bits
        for op in built.fine.ops:
            assert op.name in ("cx", "cz", "level2") or len(op.wires) == 1, op
        for op in (*built.coarse.ops, *built.fine.ops):
            assert len(set(op.wires)) == len(op.wires)
            assert all(0 <= wire < built.fine.width for wire in op.wires)
        check_bits(built)
        check_workspace(built)


def check_bits(built: Built) -> None:
    """Every bit is measured once, before it is used; no measurement, no bit."""
    for circuit in (built.coarse, built.fine):
        written: list[int] = []
        for op in circuit.ops:
            if op.bit is not None:
                written.append(op.bit)
            if op.condition is not None:
                assert op.condition in written
        assert sorted(written) == list(range(circuit.bits))
        assert built.needs_measurement or not written


def check_workspace(built: Built) -> None:
    """Slots are of the kind that the policy says, and every one is used."""
    kinds = set(built.slots)
    if built.workspace == "clean":
        assert kinds <= {"clean"}
    elif built.workspace in ("none", "level2"):
        assert not kinds
    used = {wire for op in built.fine.ops for wire in op.wires}
    used |= {wire for op in built.coarse.ops for wire in op.wires}
    for at in range(len(built.slots)):
        assert built.fine.operands + at in used


def test_every_recipe_states_its_source() -> None:
    names = [way.recipe.name for way in WAYS]
    assert len(set(names)) == len(names)
    for way in WAYS:
        recipe = way.recipe
        assert recipe.source
        assert recipe.smallest >= 1
        assert recipe.largest is None or recipe.largest >= recipe.smallest
        assert not recipe.needs_measurement or "measure" in recipe.name
        assert set(recipe.kinds) <= set(ARITHMETIC_KINDS)


def test_every_kind_has_recipes_with_and_without_controls() -> None:
    """All but the sum, which no published recipe controls."""
    for asked in itertools.chain(signatures(3, 0), signatures(3, 1)):
        names = recipe_names(asked)
        assert bool(names) == (asked.kind != "sum" or not asked.controls)
        assert len(set(names)) == len(names)


def test_equality_offers_every_multi_controlled_recipe() -> None:
    asked = Signature("equal", (4, 4), controls=2)
    wanted = tuple(f"equal-{name}" for name in catalog.recipe_names("mcx", 6))
    assert recipe_names(asked) == wanted


def test_block_sizes_of_look_ups() -> None:
    """Powers of two up to half the table, in clean and borrowed words."""
    table = tuple(range(16))
    names = recipe_names(Signature("lookup", (4, 4), table=table))
    for block in (2, 4, 8):
        for kind in ("clean", "borrowed"):
            assert f"lookup-swap-{kind}-{block}" in names
            assert f"lookup-swap-{kind}-{block}-measured" in names
    assert not any("-16" in name for name in names)
    taken = recipe_names(Signature("lookup", (4, 4), table=table, inverse=True))
    extra = [f"lookup-taken-{block}-measured" for block in (1, 2, 4, 8)]
    assert taken == (*names, *extra)
    assert describe("lookup-swap-borrowed-32").workspace == "borrowed"
