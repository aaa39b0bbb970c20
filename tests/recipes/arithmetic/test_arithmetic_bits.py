"""Toffoli-level circuits of arithmetic do what their kind says, bit by bit."""

from __future__ import annotations

import numpy as np
import pytest
from arithmetic_cases import (
    Case,
    all_inputs,
    bits_of,
    cases,
    lookup_signatures,
    merge,
    product_signatures,
    signatures,
    some_operands,
    table_of,
)
from arithmetic_simulators import (
    BITWISE,
    SIGNED,
    columns,
    replay,
    replay_signed,
    slices,
)

from placer.program.signature import Signature, apply
from placer.recipes.arithmetic import build, recipe_names
from placer.recipes.circuit import Built


def is_bitwise(built: Built) -> bool:
    """Whether the coarse circuit only moves basis states."""
    return all(op.name in BITWISE and op.condition is None for op in built.coarse.ops)


def check_all(name: str, signature: Signature) -> bool:
    """Check every input with every borrowed value; return whether that was possible."""
    built = build(name, signature)
    if not is_bitwise(built):
        return False
    before, after = all_inputs(built, signature)
    width = built.coarse.width
    reached = replay(built.coarse.ops, slices(bits_of(before, width)))
    found = columns(reached, len(before))
    assert (found == bits_of(after, width)).all(), (name, signature)
    return True


def check_many(wanted: list[Case]) -> int:
    """Return how many of these calls were checked on every input."""
    return sum(check_all(name, signature) for name, signature in wanted)


@pytest.mark.parametrize("size", [1, 2, 3, 4, 5])
def test_every_input(size: int) -> None:
    assert check_many(cases(signatures(size, 0))) > 50


@pytest.mark.parametrize("size", [1, 2, 3])
def test_every_input_under_a_control(size: int) -> None:
    assert check_many(cases(signatures(size, 1))) > 50


@pytest.mark.parametrize("size", [1, 2])
def test_every_input_under_more_controls(size: int) -> None:
    assert check_many(cases(signatures(size, 2))) > 50
    assert check_many(cases(signatures(size, 3))) > 50


@pytest.mark.slow
@pytest.mark.parametrize(("size", "controls"), [(4, 1), (5, 1), (3, 2)])
def test_every_input_of_larger_calls(size: int, controls: int) -> None:
    assert check_many(cases(signatures(size, controls))) > 50


@pytest.mark.parametrize("controls", [0, 1, 2])
def test_every_input_of_look_ups(controls: int) -> None:
    assert check_many(cases(lookup_signatures(3, 2, controls))) > 20


@pytest.mark.parametrize("controls", [0, 1, 2])
def test_every_input_of_products(controls: int) -> None:
    assert check_many(cases(product_signatures(2, controls))) > 50


@pytest.mark.slow
def test_every_input_of_larger_products_and_look_ups() -> None:
    assert check_many(cases(product_signatures(3, 0))) > 100
    assert check_many(cases(lookup_signatures(4, 1, 0))) > 100


# ------------------------------------------------------------------ random inputs
Rows = tuple[np.ndarray, np.ndarray]
"""Operand wires before and after, wires x inputs."""


def random_rows(signature: Signature, count: int) -> Rows:
    """Return random inputs that keep the promises, and what must come out."""
    values = some_operands(signature, count, signature.operands)
    before = [merge(signature, each) for each in values]
    after = [merge(signature, apply(signature, each)) for each in values]
    width = signature.operands
    return bits_of(before, width), bits_of(after, width)


def check_random(name: str, signature: Signature, rows: Rows) -> bool:
    """Check inputs with random borrowed values and random outcomes."""
    built = build(name, signature)
    if not all(op.name in SIGNED for op in built.coarse.ops):
        return False
    count = rows[0].shape[1]
    rng = np.random.default_rng(built.coarse.width)
    slots = np.zeros((len(built.slots), count), dtype=bool)
    for at, slot in enumerate(built.slots):
        if slot == "borrowed":
            slots[at] = rng.random(count) < 0.5
    before, after = (np.vstack([part, slots]) for part in rows)
    drawn = [bool(bit) for bit in rng.integers(0, 2, size=built.coarse.bits)]
    # The opposite outcomes as well, so that every fix is needed once.
    for outcomes in (drawn, [not bit for bit in drawn])[: 2 if drawn else 1]:
        words, sign = replay_signed(built.coarse.ops, slices(before), outcomes)
        assert (columns(words, count) == after).all(), (name, signature)
        # One sign for all inputs is a global phase.
        signs = columns(sign[None, :], count)
        assert signs.all() or not signs.any(), (name, signature)
    return True


def check_recipes(signature: Signature, count: int) -> int:
    """Return how many recipes of a call were checked on so many random inputs."""
    rows = random_rows(signature, count)
    names = recipe_names(signature)
    checked = [name for name in names if check_random(name, signature, rows)]
    # Only the Fourier basis cannot be followed bit by bit.
    assert checked == [name for name in names if "fourier" not in name]
    return len(checked)


def large(size: int) -> list[Signature]:
    """Return one call of every kind and option with registers of this width.

    Comparisons for equality only up to 16: multi-controlled X has tests of its own.
    """
    two, third = (size, size), 0x9249249249249249 % (1 << size)
    constants = (third, 3 << (size // 2), 1, (1 << size) - 1)[: 4 if size <= 16 else 2]
    found = []
    for controls in (0, 1):
        for carry in (False, True):
            found += [
                Signature(kind, two, controls, carry=carry)
                for kind in ("add", "subtract")
            ]
            found += [
                Signature(kind, (size,), controls, carry=carry)
                for kind in ("increment", "decrement")
            ]
            found += [
                Signature("add_constant", (size,), controls, constant, (), carry, back)
                for constant in constants
                for back in (False, True)
            ]
            for back in (False, True):
                three = (size, size, size)
                found.append(Signature("sum", three, controls, None, (), carry, back))
        for kind in ("less_than", "equal") if size <= 16 else ("less_than",):
            found.append(Signature(kind, two, controls))
            found += [
                Signature(kind, (size,), controls, constant) for constant in constants
            ]
    found.append(Signature("add", two, 3))
    return found


@pytest.mark.parametrize("size", [8, 16, 32, 64])
def test_random_inputs(size: int) -> None:
    """A thousand inputs here; ten thousand in the long run."""
    assert sum(check_recipes(signature, 1000) for signature in large(size)) > 100


@pytest.mark.slow
@pytest.mark.parametrize("size", [8, 16, 32, 64])
def test_ten_thousand_random_inputs(size: int) -> None:
    assert sum(check_recipes(signature, 10_000) for signature in large(size)) > 100


@pytest.mark.parametrize(("address", "entries", "output"), [(6, 64, 8), (7, 83, 5)])
def test_random_inputs_of_look_ups(address: int, entries: int, output: int) -> None:
    table = table_of(entries, output)
    for controls in (0, 1):
        signature = Signature("lookup", (address, output), controls, table=table)
        assert len(recipe_names(signature)) > 12
        assert check_recipes(signature, 2000) >= 5


def test_random_inputs_of_products() -> None:
    for widths in ((8, 8, 16), (5, 9, 12), (12, 4, 7)):
        for inverse in (False, True):
            signature = Signature("multiply_add", widths, inverse=inverse)
            assert check_recipes(signature, 2000) == 3
