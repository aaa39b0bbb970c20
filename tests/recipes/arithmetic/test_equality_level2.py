"""Comparisons for equality on level 2: the fine circuit replayed on trits."""

from __future__ import annotations

import numpy as np
import pytest
from arithmetic_cases import bits_of, every_operand, expected

from placer.program.signature import Signature
from placer.recipes.arithmetic import build, recipe_names
from placer.recipes.circuit import Op

CALLS = [
    Signature("equal", (2, 2)),
    Signature("equal", (3, 3), controls=1),
    Signature("equal", (4, 4)),
    Signature("equal", (4,), constant=6),
    Signature("equal", (5,), controls=3, constant=9),
]


def replay_trits(ops: tuple[Op, ...], rows: np.ndarray) -> tuple[np.ndarray, set[int]]:
    """Return wires x inputs after x, cx and level-2 gates, and who was in |2>."""
    rows, seen = rows.astype(np.int8), set[int]()
    for op in ops:
        if op.name == "level2":
            control, target = op.wires
            low = {"x01": 0, "x12": 1}[op.action or ""]
            on = rows[control] == op.level
            on &= (rows[target] == low) | (rows[target] == low + 1)
            rows[target] = np.where(on, 2 * low + 1 - rows[target], rows[target])
        else:
            assert op.name in ("x", "cx")
            assert (rows[list(op.wires)] < 2).all()
            on = np.ones(rows.shape[1], dtype=np.int8)
            if op.name == "cx":
                on = rows[op.wires[0]]
            rows[op.wires[-1]] ^= on
        seen |= {int(wire) for wire in np.flatnonzero((rows == 2).any(axis=1))}
    return rows, seen


@pytest.mark.parametrize("signature", CALLS)
def test_every_input(signature: Signature) -> None:
    names = [name for name in recipe_names(signature) if "level2" in name]
    assert names
    before = every_operand(signature)
    after = bits_of(expected(signature, before), signature.operands)
    for name in names:
        built = build(name, signature)
        assert built.slots == ()
        rows = bits_of(before, signature.operands)
        reached, seen = replay_trits(built.fine.ops, rows)
        assert (reached == after).all(), name
        assert seen == set(built.level2_wires)
