"""Drafts: mirror images, phases by name, cancelled neighbours."""

from __future__ import annotations

import math

import numpy as np
import pytest
from recipe_simulators import unitary

from placer.recipes.circuit import Circuit, Op
from placer.recipes.draft import gates, mirror, phase, tidy

NAMES = ["h", "x", "t", "tdg", "s", "sdg", "cx", "cz", "p"]


def random_ops(seed: int, length: int) -> tuple[Op, ...]:
    """Return a random circuit on three wires, rich in neighbours that cancel."""
    rng = np.random.default_rng(seed)
    ops: list[Op] = []
    for _ in range(length):
        name = NAMES[int(rng.integers(len(NAMES)))]
        wires = tuple(int(w) for w in rng.permutation(3)[: 1 + (name[0] == "c")])
        ops.append(Op(name, wires, (0.4,) if name == "p" else ()))
        if rng.random() < 0.5:
            ops.extend(mirror(ops[-1:]))
    return tuple(ops)


@pytest.mark.parametrize("seed", range(40))
def test_mirror_undoes_and_tidy_changes_nothing(seed: int) -> None:
    ops = random_ops(seed, 25)
    matrix = unitary(Circuit(3, (), ops))
    back = unitary(Circuit(3, (), mirror(ops)))
    assert np.abs(back @ matrix - np.eye(8)).max() < 1e-12
    shorter = tidy(ops)
    assert len(shorter) < len(ops)
    assert np.abs(unitary(Circuit(3, (), shorter)) - matrix).max() < 1e-12
    assert tidy(ops + mirror(ops)) == ()


def test_tidy_leaves_what_only_looks_alike() -> None:
    kept = (
        gates(("cx", 0, 1), ("cx", 1, 0)),
        gates(("cx", 0, 1), ("t", 1), ("cx", 0, 1)),
        (Op("x", (0,), condition=0), Op("x", (0,), condition=0)),
        (Op("measure", (0,), bit=0), Op("measure", (0,), bit=0)),
        gates(("x", 0), ("cx", 0, 1), ("x", 0)),
    )
    for ops in kept:
        assert tidy(ops) == ops


@pytest.mark.parametrize("eighths", [*range(-5, 6), 0.5, 1 / 3])
def test_phase_by_name(eighths: float) -> None:
    angle = eighths * math.pi / 4
    ops = phase(angle, 0)
    matrix = unitary(Circuit(1, (), ops))
    assert np.abs(matrix - np.diag([1, np.exp(1j * angle)])).max() < 1e-12
    if abs(eighths) <= 4 and eighths == int(eighths):
        assert all(op.name != "p" for op in ops)


def test_a_measurement_has_no_mirror_image() -> None:
    with pytest.raises(ValueError, match="measure has no mirror image"):
        mirror((Op("measure", (0,), bit=0),))
