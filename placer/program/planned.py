"""The program that a plan's steps are the steps of: as read, or with other cleanup."""

from __future__ import annotations

from typing import TYPE_CHECKING, cast

from placer.program.rewrite import Action, Move, rewritten
from placer.program.values import values_of

if TYPE_CHECKING:
    from collections.abc import Sequence

    from placer.device.model import Device
    from placer.program.model import Program


def planned_program(
    program: Program, moves: Sequence[Sequence[str | int]], device: Device
) -> Program:
    """Return the program as the moves of a plan have it; unchanged without moves.

    Raises
    ------
    InternalError
        If the moves cannot be written down.
    """
    if not moves:
        return program
    return rewritten(
        program,
        values_of(program),
        moves_of(moves),
        has_reset=device.capabilities.reset,
    )


def moves_of(rows: Sequence[Sequence[str | int]]) -> tuple[Move, ...]:
    """Return the moves of a plan file, whose schema has been checked."""
    return tuple(Move(cast("Action", str(row[0])), int(row[1])) for row in rows)
