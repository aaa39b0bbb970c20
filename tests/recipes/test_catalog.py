"""The catalog: names, order, refusals, and the form of what it builds."""

from __future__ import annotations

import math

import pytest
from recipe_cases import ANGLE, KINDS, calls

from placer.program.model import PLAIN_GATES
from placer.recipes.catalog import build, describe, recipe_names
from placer.recipes.circuit import EXTRA_GATES

ONE_QUBIT = {name for name, (wires, _) in PLAIN_GATES.items() if wires == 1}


def test_names_of_small_calls() -> None:
    assert recipe_names("mcx", 3) == (
        "clean-ladder",
        "clean-measured",
        "clean-measured-held",
        "borrowed-v-chain",
        "none-gray",
        "none-quadratic",
        "none-linear",
        "level2-chain",
        "level2-tree",
    )
    assert recipe_names("and", 2) == ("and-mirror", "level2-chain")
    assert recipe_names("and", 2, True) == (
        "and-mirror",
        "and-measured",
        "level2-chain",
    )


@pytest.mark.parametrize("kind", KINDS)
def test_every_policy_has_a_recipe_where_one_is_known(kind: str) -> None:
    for controls in range(2, 40):
        found = {describe(name).workspace for name in recipe_names(kind, controls)}
        wanted = {"none", "level2"} | ({"clean", "borrowed"} if controls > 2 else set())
        if kind == "mcp" and controls < 5:
            wanted -= {"borrowed"}
        assert wanted <= found


def test_one_control_has_no_recipe() -> None:
    for kind in KINDS:
        assert recipe_names(kind, 1) == ()


def test_refusals_name_the_recipe() -> None:
    with pytest.raises(ValueError, match="no recipe 'clean-lader'"):
        describe("clean-lader")
    with pytest.raises(ValueError, match="clean-tree does not build mcx with 3"):
        build("clean-tree", "mcx", 3)
    with pytest.raises(ValueError, match="borrowed-v-chain does not build mcp"):
        build("borrowed-v-chain", "mcp", 5, 0.5)
    with pytest.raises(ValueError, match="toffoli does not build mcx with 3"):
        build("toffoli", "mcx", 3)
    with pytest.raises(ValueError, match="and-measured does not build and with 2"):
        build("and-measured", "and", 2)
    with pytest.raises(ValueError, match="does not build add"):
        build("toffoli", "add", 2)


def test_built_twice_is_the_same_object() -> None:
    assert build("clean-one", "mcx", 9) is build("clean-one", "mcx", 9)


@pytest.mark.parametrize(("name", "kind", "controls", "inverse"), calls(range(2, 13)))
def test_form(name: str, kind: str, controls: int, inverse: bool) -> None:
    built = build(name, kind, controls, ANGLE, inverse)
    recipe = describe(name)
    assert (built.recipe, built.kind, built.controls) == (name, kind, controls)
    assert built.workspace == recipe.workspace
    assert built.coarse.operands == built.fine.operands == controls + 1
    assert built.coarse.slots == built.fine.slots
    assert built.coarse.bits == built.fine.bits
    kinds = set(built.slots)
    promised = recipe.workspace
    assert kinds == ({promised} if promised in ("clean", "borrowed") else set())
    assert bool(built.level2_wires) == (promised == "level2")
    assert any(op.name == "measure" for op in built.fine.ops) is (
        recipe.needs_measurement
    )
    for op in built.fine.ops:
        two_body = op.name in ("cx", "cz", "level2") and len(set(op.wires)) == 2
        one_body = op.name in ONE_QUBIT | {"measure"} and len(op.wires) == 1
        assert one_body or two_body, op
        assert all(math.isfinite(value) and value for value in op.params), op
    for op in built.coarse.ops:
        assert op.name in EXTRA_GATES or op.name in PLAIN_GATES
        assert op.name != "level2"
        assert len(set(op.wires)) == len(op.wires)
    for circuit in (built.coarse, built.fine):
        touched = {wire for op in circuit.ops for wire in op.wires}
        assert touched == set(range(circuit.width)), "a wire is asked for in vain"
        written = [op.bit for op in circuit.ops if op.bit is not None]
        assert sorted(written) == list(range(circuit.bits))


@pytest.mark.parametrize("kind", ["mcx", "mcz"])
def test_inverse_of_a_mirror_symmetric_kind_is_itself(kind: str) -> None:
    for name in recipe_names(kind, 5):
        plain, turned = build(name, kind, 5), build(name, kind, 5, inverse=True)
        assert plain.fine == turned.fine


def test_calls_from_roots_and_on_level_2_stay_one_operation() -> None:
    for name in ("none-gray", "none-quadratic", "none-linear", "level2-chain"):
        for kind, word in (("mcx", "mcx"), ("mcz", "mcz"), ("and", "mcx")):
            (op,) = build(name, kind, 4).coarse.ops
            assert (op.name, op.wires) == (word, (0, 1, 2, 3, 4))
        (op,) = build(name, "mcp", 4, 0.3, True).coarse.ops
        assert (op.name, op.params) == ("mcp", (-0.3,))


def test_large_calls_can_be_built() -> None:
    for name in recipe_names("mcx", 300):
        assert build(name, "mcx", 300).controls == 300
    assert "none-linear" not in recipe_names("mcx", 65)
