"""Spelled-out circuits equal their calls: full unitaries, then sparse paths."""

from __future__ import annotations

import itertools
from dataclasses import replace

import numpy as np
import pytest
from recipe_cases import ANGLE, allowed, calls, expected, labels
from recipe_simulators import all_bits, follow, mismatch, telling_bits, unitary

from placer.recipes.catalog import build
from placer.recipes.circuit import Built


def qubit_calls(sizes: range, *, measured: bool) -> list[tuple[str, str, int, bool]]:
    """Return the calls that stay below level 2, with or without measurement."""
    return [
        case
        for case in calls(sizes)
        if not case[0].startswith("level2")
        and build(case[0], case[1], case[2], ANGLE, case[3]).needs_measurement
        is measured
    ]


@pytest.mark.parametrize(
    ("name", "kind", "controls", "inverse"), qubit_calls(range(2, 6), measured=False)
)
def test_full_unitary(name: str, kind: str, controls: int, inverse: bool) -> None:
    built = build(name, kind, controls, ANGLE, inverse)
    check_unitary(built, inverse=inverse)


@pytest.mark.slow
@pytest.mark.parametrize(
    ("name", "kind", "controls", "inverse"), qubit_calls(range(6, 8), measured=False)
)
def test_full_unitary_of_larger_calls(
    name: str, kind: str, controls: int, inverse: bool
) -> None:
    built = build(name, kind, controls, ANGLE, inverse)
    if built.fine.width > 11:
        pytest.skip("too wide for a matrix; sparse paths cover it")
    check_unitary(built, inverse=inverse)


def check_unitary(built: Built, *, inverse: bool) -> None:
    """Compare the matrix with the definition of the kind, one global phase apart."""
    columns = allowed(built, all_bits(built.fine.width), inverse=inverse)
    after, phases = expected(built, columns, ANGLE, inverse=inverse)
    weights = 2 ** np.arange(built.fine.width)
    reached = unitary(built.fine)[:, weights @ columns]
    wanted = np.zeros_like(reached)
    wanted[weights @ after, np.arange(columns.shape[1])] = np.exp(1j * phases)
    shared = np.vdot(wanted[:, 0], reached[:, 0])
    assert abs(abs(shared) - 1) < 1e-9
    assert np.abs(reached - shared * wanted).max() < 1e-9


@pytest.mark.parametrize(
    ("name", "kind", "controls", "inverse"), qubit_calls(range(2, 6), measured=True)
)
def test_measured_cleanup_in_every_outcome(
    name: str, kind: str, controls: int, inverse: bool
) -> None:
    built = build(name, kind, controls, ANGLE, inverse)
    measured = sum(op.name == "measure" for op in built.fine.ops)
    assert measured > 0
    rows = allowed(built, all_bits(built.fine.width), inverse=inverse)
    for outcomes in itertools.product((0, 1), repeat=measured):
        check_sparse(built, rows, outcomes, inverse=inverse)


def check_sparse(
    built: Built, rows: np.ndarray, outcomes: tuple[int, ...], *, inverse: bool
) -> None:
    """Run random superpositions with a spectator that tells all inputs apart, and with

    a spectator of one bit, so that inputs interfere.
    """
    rng = np.random.default_rng(rows.shape[1])
    amps = rng.normal(size=rows.shape[1]) + 1j * rng.normal(size=rows.shape[1])
    amps /= np.linalg.norm(amps)
    after, phases = expected(built, rows, ANGLE, inverse=inverse)
    turned = amps * np.exp(1j * phases)
    low = (1 << built.fine.width + 1) - 1
    for mask in (-1, low):
        start = merged(labels(rows) & mask, amps)
        wanted = merged(labels(after) & mask, turned)
        reached = follow(built.fine, start, outcomes)
        assert abs(np.linalg.norm(reached[1]) - np.linalg.norm(start[1])) < 1e-9
        assert mismatch(reached, wanted) < 1e-9, (built.recipe, outcomes)


def merged(keys: np.ndarray, amps: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Return a sparse state with equal labels added up."""
    found, place = np.unique(keys, return_inverse=True)
    total = np.zeros(len(found), dtype=complex)
    np.add.at(total, place, amps)
    return found, total


def run_large(controls: int, count: int) -> int:
    """Check every recipe of a size on random inputs; return how many there were."""
    done = 0
    cases = qubit_calls(range(controls, controls + 1), measured=False)
    cases += qubit_calls(range(controls, controls + 1), measured=True)
    for name, kind, _, inverse in cases:
        built = build(name, kind, controls, ANGLE, inverse)
        rows = telling_bits(built.fine.width, controls, done, count)
        for at, slot in enumerate(built.slots):
            if slot == "clean":
                rows[built.fine.operands + at] = False
        if kind == "and":
            rows[controls] = rows[:controls].all(axis=0) if inverse else False
        measured = sum(op.name == "measure" for op in built.fine.ops)
        rng = np.random.default_rng(done)
        outcomes = tuple(int(bit) for bit in rng.integers(0, 2, size=measured))
        check_sparse(built, rows, outcomes, inverse=inverse)
        done += 1
    return done


@pytest.mark.parametrize("controls", [6, 7, 9])
def test_random_inputs_of_larger_calls(controls: int) -> None:
    assert run_large(controls, 16) > 40


@pytest.mark.parametrize(
    ("name", "kind", "controls"),
    [
        ("toffoli", "mcx", 2),
        ("and-mirror", "and", 2),
        ("clean-measured", "mcz", 3),
        ("borrowed-one-halves", "mcx", 5),
        ("borrowed-one-log", "mcz", 8),
        ("clean-two-log", "mcp", 7),
        ("none-quadratic", "mcp", 4),
    ],
)
def test_a_missing_gate_is_noticed(name: str, kind: str, controls: int) -> None:
    """Drop gates one at a time: a check that passes still would prove nothing."""
    built = build(name, kind, controls, ANGLE)
    rows = telling_bits(built.fine.width, controls, 1, 64)
    for at, slot in enumerate(built.slots):
        if slot == "clean":
            rows[built.fine.operands + at] = False
    if kind == "and":
        rows[controls] = False
    measured = sum(op.name == "measure" for op in built.fine.ops)
    for at, op in enumerate(built.fine.ops):
        if op.name == "measure":
            continue
        ops = (*built.fine.ops[:at], *built.fine.ops[at + 1 :])
        spoiled = replace(built, fine=replace(built.fine, ops=ops))
        with pytest.raises(AssertionError):
            check_sparse(spoiled, rows, (1,) * measured, inverse=False)


@pytest.mark.slow
@pytest.mark.parametrize("controls", [8, 10, 11, 12, 13, 14])
def test_random_inputs_of_large_calls(controls: int) -> None:
    assert run_large(controls, 16) > 40
