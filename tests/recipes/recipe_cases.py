"""What a call must do, written from the definition of its kind alone."""

from __future__ import annotations

import numpy as np

from placer.recipes.catalog import recipe_names
from placer.recipes.circuit import Built

KINDS = ("mcx", "mcz", "mcp", "and")
ANGLE = 1.1


def calls(sizes: range, *, both_ways: bool = True) -> list[tuple[str, str, int, bool]]:
    """Return (recipe, kind, controls, inverse) for every recipe of these sizes."""
    return [
        (name, kind, controls, inverse)
        for kind in KINDS
        for controls in sizes
        for inverse in ((False, True) if kind in ("and", "mcp") else (False,))
        if both_ways or not inverse
        for name in recipe_names(kind, controls, inverse)
    ]


def allowed(built: Built, rows: np.ndarray, *, inverse: bool) -> np.ndarray:
    """Return the columns whose clean wires are 0 and whose target is as promised."""
    keep = np.ones(rows.shape[1], dtype=bool)
    for at, slot in enumerate(built.slots):
        if slot == "clean":
            keep &= ~rows[built.fine.operands + at]
    if built.kind == "and":
        product = rows[: built.controls].all(axis=0)
        promised = product if inverse else np.zeros_like(product)
        keep &= rows[built.controls] == promised
    return rows[:, keep]


def expected(
    built: Built, rows: np.ndarray, angle: float, *, inverse: bool
) -> tuple[np.ndarray, np.ndarray]:
    """Return what the wires must hold afterwards, and the phase in radians."""
    product = rows[: built.controls].all(axis=0)
    after = rows.copy()
    phases = np.zeros(rows.shape[1])
    if built.kind in ("mcx", "and"):
        after[built.controls] ^= product
    else:
        whole = np.pi if built.kind == "mcz" else (-angle if inverse else angle)
        phases[product & rows[built.controls]] = whole
    return after, phases


def labels(rows: np.ndarray) -> np.ndarray:
    """Return each column as a number, wire 0 the lowest bit, column on top of all."""
    weights = np.left_shift(1, np.arange(len(rows), dtype=np.int64))
    columns = np.arange(rows.shape[1], dtype=np.int64)
    return rows.T.astype(np.int64) @ weights + (columns << len(rows))
