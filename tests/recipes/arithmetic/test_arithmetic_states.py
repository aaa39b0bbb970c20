"""Superposed inputs, phases and measurement outcomes at both gate levels.

A circuit is right if it maps a random superposition of all allowed inputs to the same
superposition of what must come out, a global phase apart, whatever is measured.
"""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from arithmetic_cases import (
    all_inputs,
    cases,
    expected,
    free_wires,
    lookup_signatures,
    merge,
    product_signatures,
    signatures,
    some_operands,
    superposed,
    table_of,
)
from arithmetic_simulators import follow, mismatch

from placer.program.signature import Signature
from placer.recipes.arithmetic import build, recipe_names
from placer.recipes.circuit import Built, Circuit

MOST_OUTCOMES = 4
"""Beyond so many measurements, outcomes are drawn at random."""


def outcomes_of(circuit: Circuit, seed: int) -> list[tuple[int, ...]]:
    """Return every list of outcomes, or all 0, all 1 and some random ones."""
    count = sum(op.name == "measure" for op in circuit.ops)
    assert count <= circuit.bits
    if 2**count <= MOST_OUTCOMES:
        return list(itertools.product((0, 1), repeat=count))
    rng = np.random.default_rng(seed)
    drawn = [tuple(int(x) for x in rng.integers(0, 2, size=count)) for _ in range(2)]
    return [(0,) * count, (1,) * count, *drawn]


def check_states(
    built: Built, before: list[int], after: list[int], levels: tuple[str, ...]
) -> None:
    """Check circuits on a superposition of labels."""
    order = sorted(range(len(before)), key=before.__getitem__)
    start = superposed([before[at] for at in order], len(before))
    wanted = (np.array([after[at] for at in order], dtype=np.int64), start[1])
    for level in levels:
        circuit: Circuit = getattr(built, level)
        for outcomes in outcomes_of(circuit, len(before)):
            reached = follow(circuit, start, outcomes)
            error = mismatch(reached, wanted)
            assert error < 1e-9, (built.recipe, level, outcomes, error)


def check_all(name: str, signature: Signature) -> bool:
    """Check both levels on all inputs with all borrowed values."""
    built = build(name, signature)
    if built.level2_wires:
        return False
    before, after = all_inputs(built, signature)
    check_states(built, before, after, ("coarse", "fine"))
    return True


def check_small(wanted: list[Signature]) -> int:
    """Return how many recipes of these signatures were checked."""
    return sum(check_all(name, signature) for name, signature in cases(wanted))


@pytest.mark.parametrize(
    ("size", "controls"), [(1, 0), (1, 1), (1, 2), (2, 0), (2, 1), (3, 0)]
)
def test_all_superposed(size: int, controls: int) -> None:
    assert check_small(list(signatures(size, controls))) > 50


@pytest.mark.slow
@pytest.mark.parametrize(("size", "controls"), [(2, 2), (3, 1), (4, 0)])
def test_all_superposed_of_larger_calls(size: int, controls: int) -> None:
    assert check_small(list(signatures(size, controls))) > 50


def test_all_superposed_look_ups_and_products() -> None:
    for controls in (0, 1):
        assert check_small(list(lookup_signatures(2, 1, controls))) > 10
        assert check_small(list(product_signatures(1, controls))) > 10


@pytest.mark.slow
def test_all_superposed_of_larger_look_ups_and_products() -> None:
    assert check_small(list(lookup_signatures(3, 1, 0))) > 30
    assert check_small(list(lookup_signatures(3, 1, 2))) > 30
    assert check_small(list(product_signatures(2, 0))) > 30


# ------------------------------------------------------------------ larger calls
def medium(size: int, controls: int) -> list[Signature]:
    """Return one call of every kind and option with registers of this width."""
    two, three, one = (size, size), (size, size, size), (size,)
    found: list[Signature] = []
    for carry, inverse in itertools.product((False, True), repeat=2):
        found += [
            Signature("add", two, controls, carry=carry, inverse=inverse),
            Signature("sum", three, controls, carry=carry, inverse=inverse),
            Signature("increment", one, controls, carry=carry, inverse=inverse),
            Signature("add_constant", one, controls, 0b01101, (), carry, inverse),
        ]
    found += [
        Signature("less_than", two, controls),
        Signature("equal", two, controls),
        Signature("less_than", one, controls, 0b01101),
        Signature("equal", one, controls, 0b01101),
    ]
    return found


def check_some(name: str, signature: Signature, count: int) -> None:
    """Check both levels on a superposition of a few inputs."""
    built = build(name, signature)
    if built.level2_wires:
        return
    rng = np.random.default_rng(built.fine.width)
    pairs: dict[int, int] = {}
    for values in some_operands(signature, count, built.fine.width):
        label = merge(signature, values)
        (after,) = expected(signature, [label])
        lent = sum(
            int(rng.integers(0, 2)) << wire
            for wire in free_wires(built)
            if wire >= signature.operands
        )
        pairs[label | lent] = after | lent
    check_states(built, list(pairs), list(pairs.values()), ("coarse", "fine"))


@pytest.mark.parametrize("controls", [0, 1])
def test_few_superposed_inputs(controls: int) -> None:
    """Five bits, at both levels: gates that need more than three wires show here."""
    for signature in medium(5, controls):
        for name in recipe_names(signature):
            if not name.startswith("equal-none"):
                check_some(name, signature, 6)


@pytest.mark.parametrize("controls", [0, 1])
def test_few_superposed_inputs_of_look_ups(controls: int) -> None:
    """Sixteen and eleven entries, every block size, both directions."""
    for entries, inverse in itertools.product((16, 11), (False, True)):
        signature = Signature(
            "lookup", (4, 2), controls, table=table_of(entries, 2), inverse=inverse
        )
        names = recipe_names(signature)
        assert any("-4" in name for name in names)
        for name in names:
            check_some(name, signature, 24)


@pytest.mark.slow
@pytest.mark.parametrize("size", [6, 7, 8])
def test_few_superposed_inputs_of_larger_calls(size: int) -> None:
    for controls in (0, 1):
        for signature in medium(size, controls):
            for name in recipe_names(signature):
                small = not name.startswith("equal-none") and "fourier" not in name
                if small and build(name, signature).fine.width < 62:
                    check_some(name, signature, 6)
