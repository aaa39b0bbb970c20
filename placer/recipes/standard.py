"""Plain gates of a program, spelled out in one-qubit gates, cx and cz.

In: a name and its angles in radians (OpenQASM 3 convention).  Out: a circuit without
slots that equals the gate up to a global phase.
"""

from __future__ import annotations

import math
from functools import lru_cache

from placer.program.model import PLAIN_GATES
from placer.recipes.circuit import Circuit, Op
from placer.recipes.draft import gates
from placer.recipes.toffoli import controlled_phase


@lru_cache(maxsize=4096)
def lower(name: str, params: tuple[float, ...] = ()) -> Circuit:
    """Return the fine circuit of a plain gate.

    Raises
    ------
    ValueError
        If the gate is unknown, has another number of angles, or an angle is not finite.

    Examples
    --------
    >>> [op.name for op in lower("swap").ops]
    ['cx', 'cx', 'cx']
    """
    if name not in PLAIN_GATES:
        raise ValueError(f"there is no plain gate {name!r}")
    wires, angles = PLAIN_GATES[name]
    if len(params) != angles or not all(math.isfinite(value) for value in params):
        raise ValueError(f"{name} takes {angles} finite angles, not {params}")
    if wires == 1 or name in ("cx", "cz"):
        return Circuit(wires, (), (Op(name, tuple(range(wires)), params),))
    return Circuit(wires, (), _spelled(name, params))


def _spelled(name: str, params: tuple[float, ...]) -> tuple[Op, ...]:
    """Return the gates of a two-qubit gate other than cx and cz, on wires 0 and 1."""
    if name == "swap":
        return gates(("cx", 0, 1), ("cx", 1, 0), ("cx", 0, 1))
    if name == "cy":
        return gates(("sdg", 1), ("cx", 0, 1), ("s", 1))
    if name == "ch":
        return (
            *gates(("s", 1), ("h", 1), ("t", 1), ("cx", 0, 1)),
            *gates(("tdg", 1), ("h", 1), ("sdg", 1)),
        )
    angle = params[0]
    if name == "cp":
        return controlled_phase(angle, 0, 1)
    if name in ("rzz", "rxx"):
        ops = (*gates(("cx", 0, 1)), Op("rz", (1,), (angle,)), *gates(("cx", 0, 1)))
        frame = gates(("h", 0), ("h", 1)) if name == "rxx" else ()
        return (*frame, *ops, *frame)
    axis = "ry" if name == "cry" else "rz"
    ops = (
        Op(axis, (1,), (angle / 2,)),
        *gates(("cx", 0, 1)),
        Op(axis, (1,), (-angle / 2,)),
        *gates(("cx", 0, 1)),
    )
    frame = gates(("h", 1)) if name == "crx" else ()
    return (*frame, *ops, *frame)
