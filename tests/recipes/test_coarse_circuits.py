"""Toffoli-level circuits do what their kind says, on every input or on telling ones."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from recipe_cases import ANGLE, allowed, calls, expected, labels
from recipe_simulators import (
    all_bits,
    follow,
    mismatch,
    replay_bits,
    telling_bits,
)

from placer.recipes.catalog import build
from placer.recipes.circuit import Built

BITWISE = {"x", "cx", "ccx", "mcx"}


def is_bitwise(built: Built) -> bool:
    """Whether the coarse circuit only moves basis states."""
    return all(op.name in BITWISE and op.condition is None for op in built.coarse.ops)


def bitwise_calls(sizes: range) -> list[tuple[str, str, int, bool]]:
    """Return the calls of kinds mcx and and whose circuits do not measure."""
    return [
        case
        for case in calls(sizes)
        if case[1] in ("mcx", "and")
        and is_bitwise(build(case[0], case[1], case[2], inverse=case[3]))
    ]


@pytest.mark.parametrize(
    ("name", "kind", "controls", "inverse"), bitwise_calls(range(2, 8))
)
def test_every_input_of_small_calls(
    name: str, kind: str, controls: int, inverse: bool
) -> None:
    built = build(name, kind, controls, ANGLE, inverse)
    assert built.coarse.width <= 16
    rows = allowed(built, all_bits(built.coarse.width), inverse=inverse)
    after, _ = expected(built, rows, ANGLE, inverse=inverse)
    assert (replay_bits(built.coarse.ops, rows) == after).all()


@pytest.mark.parametrize("controls", [8, 9, 11, 12, 16, 17, 23, 31, 32, 40])
def test_telling_inputs_of_large_calls(controls: int) -> None:
    cases = bitwise_calls(range(controls, controls + 1))
    assert len(cases) >= 20
    for name, kind, _, inverse in cases:
        built = build(name, kind, controls, inverse=inverse)
        rows = telling_bits(built.coarse.width, controls, controls, 2000)
        for at, slot in enumerate(built.slots):
            if slot == "clean":
                rows[built.coarse.operands + at] = False
        if kind == "and":
            product = rows[:controls].all(axis=0)
            rows[controls] = product if inverse else False
        after, _ = expected(built, rows, 0.0, inverse=inverse)
        assert (replay_bits(built.coarse.ops, rows) == after).all(), (name, kind)


@pytest.mark.parametrize(("name", "kind", "controls", "inverse"), calls(range(2, 6)))
def test_superposed_inputs_and_both_outcomes(
    name: str, kind: str, controls: int, inverse: bool
) -> None:
    built = build(name, kind, controls, ANGLE, inverse)
    circuit = built.coarse
    rows = allowed(built, all_bits(circuit.width), inverse=inverse)
    rng = np.random.default_rng(controls)
    amps = rng.normal(size=rows.shape[1]) + 1j * rng.normal(size=rows.shape[1])
    amps /= np.linalg.norm(amps)
    after, phases = expected(built, rows, ANGLE, inverse=inverse)
    wanted = (labels(after), amps * np.exp(1j * phases))
    measured = sum(op.name == "measure" for op in circuit.ops)
    for outcomes in itertools.product((0, 1), repeat=measured):
        reached = follow(circuit, (labels(rows), amps), outcomes)
        assert mismatch(reached, wanted) < 1e-9, outcomes
